"""README's section on stores: its columns are those declared, its example runs."""

from __future__ import annotations

import copy
import json
import re
from pathlib import Path

import pytest

from ehmo.report.summary_document import summary_json
from ehmo.store import StoredRow, open_store, summarise
from ehmo.store.columns import BOND_COLUMNS, CONTEXT_COLUMNS, TABLES
from tests.store.rows import document, done, failed, key, provenance
from tests.test_readme import keys_within

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


def test_fields_of_the_summary_are_those_in_the_table(tmp_path):
    with open_store(tmp_path / "a.sqlite", create=True) as store:
        rows = [done(number, "VOCl3") for number in range(20)] + [failed(30)]
        rows.append(StoredRow(key(40), "done", "", off_the_line(), provenance()))
        store.write(rows)
        written = json.loads(summary_json(summarise(store)))
    assert written["outliers"]
    table = SECTION.split("### JSON of a summary")[1].split("An export has")[0]
    described = {
        name: set(re.findall(r"`(\w+)`", row.split("|")[2]))
        for row in table.splitlines()
        if row.startswith("| `")
        for name in re.findall(r"`(\w+)`", row.split("|")[1])
    }
    assert set(described) == set(written)
    for name in ("calculations", "reasons", "kinds", "outliers", "outlier_rule"):
        assert described[name] == keys_within(written[name]), name


def off_the_line() -> dict:
    whole = copy.deepcopy(document("VOCl3"))
    whole["bonds"][0]["mayer"] = 0.5
    return whole
