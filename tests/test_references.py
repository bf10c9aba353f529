"""References in docstrings and tables are keys of references.json, and every key is used."""

import ast
import json
import re
from importlib import resources
from pathlib import Path

import pytest

import basis_params
from basis_params.rows import side_table

PACKAGE = Path(str(resources.files("basis_params")))
ROOT = Path(__file__).parents[1]
REFERENCES = json.loads((PACKAGE / "references.json").read_text("utf-8"))
SECTION = re.compile(r"^References\n-+\n(.*?)(?=\n\n|\Z)", re.MULTILINE | re.DOTALL)
NUMBERED = re.compile(r"\.\. \[\d+\] ([^\s:]+):(.*)", re.DOTALL)
VOLUME = re.compile(r"\d+, \d+ \(\d{4}\)")


def docstrings():
    for path in sorted([*(ROOT / "ehmo").rglob("*.py"), *PACKAGE.rglob("*.py")]):
        for node in ast.walk(ast.parse(path.read_text("utf-8"))):
            if isinstance(node, ast.Module | ast.ClassDef | ast.FunctionDef | ast.AsyncFunctionDef):
                text = ast.get_docstring(node)
                if text:
                    yield f"{path.stem}.{getattr(node, 'name', '')}", text


def cited(text):
    """Keys of a docstring, each with the words after it."""
    for section in SECTION.findall(text):
        if section.lstrip().startswith(".. ["):
            for entry in re.split(r"\n(?=\.\. \[)", section):
                match = NUMBERED.fullmatch(entry)
                yield match.groups() if match else (entry, "")
        else:
            yield from ((key.strip(), "") for key in section.split(","))


CITATIONS = [(place, key, words) for place, text in docstrings() for key, words in cited(text)]
TABLES = sorted(path.stem for path in (PACKAGE / "tables").glob("*.csv"))


def table_keys():
    rows = [row for name in TABLES for row in side_table(name)]
    shells = [
        s for n in basis_params.available_sets() for e in basis_params.load_set(n).elements.values() for s in e.shells
    ]
    pairs = [pair for n in basis_params.available_sets() for pair in basis_params.load_set(n).repulsion.values()]
    return {row["source_key"] for row in rows} | {entry.source_key for entry in (*shells, *pairs)}


def test_docstrings_cite_something():
    assert len(CITATIONS) > 20
    assert {key for _, key, _ in CITATIONS} >= {"wolfsberg-1952", "mayer-1983", "lowdin-1950", "brown-1985"}


@pytest.mark.parametrize(("place", "key"), sorted({(place, key) for place, key, _ in CITATIONS}))
def test_key_of_a_docstring_is_known(place, key):
    assert key in REFERENCES


@pytest.mark.parametrize(
    ("key", "words"), sorted({(key, words) for _, key, words in CITATIONS if VOLUME.search(words)})
)
def test_docstring_and_bibliography_agree(key, words):
    entry = basis_params.references()[key]
    assert f"{entry.journal} {entry.volume}, {entry.page} ({entry.year})" in " ".join(words.split())


def test_every_entry_is_used_by_a_table_row_or_a_docstring():
    used = table_keys() | {key for _, key, _ in CITATIONS}
    assert sorted(set(REFERENCES) - used) == []


def test_key_is_the_first_author_and_the_year():
    for key, entry in REFERENCES.items():
        tail = re.search(r"-(\d{4})$", key)
        assert tail is None or int(tail[1]) == entry["year"], key
