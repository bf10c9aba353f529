"""README's section on stores: its columns are those declared, its example runs."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from ehmo.store import open_store
from ehmo.store.columns import BOND_COLUMNS, CONTEXT_COLUMNS, TABLES
from tests.store.rows import document, done

README = (Path(__file__).parents[2] / "README.md").read_text(encoding="utf-8")
SECTION = README.split("## Stores\n")[1].split("\n## ")[0]


@pytest.mark.parametrize(("heading", "columns"), [("structures", TABLES["structures"]), ("bonds", BOND_COLUMNS)])
def test_columns_are_those_declared(heading, columns):
    lines = SECTION.split(f"| column of {heading} | kind | unit | meaning |\n| --- | --- | --- | --- |\n")[
        1
    ].splitlines()
    rows = lines[: lines.index("")]
    assert rows == [f"| `{column.name}` | {column.kind} | {column.unit} | {column.meaning} |" for column in columns]


def test_columns_before_those_of_bonds():
    (names,) = re.findall(r"those of the structure: (.*)\.", SECTION)
    assert re.findall(r"`(\w+)`", names) == [column.name for column in CONTEXT_COLUMNS]


def test_example_runs(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    with open_store("screen.sqlite", create=True) as store:
        store.write([done(1, "VOCl3"), done(2, "MnO4 -"), done(3, "VO4 3-")])
    (example,) = re.findall(r"```python\n(.*?)```", SECTION, re.DOTALL)
    found: dict = {}
    exec(example, found)
    assert found["medians"].index.tolist() == ["Mn", "V"]
    assert found["record"]["fragment"]["title"] == "structure 3"
    assert found["lowest"] == document("VO4 3-")["orbitals"][0]["energy_eV"]
