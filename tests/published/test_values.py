"""Published values against what ehmo computes on structures built from published lengths (values.csv).

Each row either agrees within its tolerance, or is listed as a miss of the parameter set, with the measured difference:
then it must still miss by as much, so that an improvement is noticed as well as a fault. Nothing is fitted to these
values. To hold another set to them, add it to SETS and a column miss_NAME to the table.
"""

from __future__ import annotations

import json
import re
from collections import Counter
from importlib import resources
from pathlib import Path

import numpy as np
import pytest

import basis_params
from tests.published.computed import QUANTITIES, Row, computed, difference, read_table, read_values
from tests.published.structures import SPHERES, STRUCTURES

SETS = ("standard", "oxo")
ROWS = read_values()
ELEMENTS = {name: set(basis_params.load_set(name).elements) for name in SETS}
SOURCES = {entry["key"]: entry["citation"] for entry in read_table("sources.csv")}
BIBLIOGRAPHY = json.loads(resources.files("basis_params").joinpath("references.json").read_text("utf-8"))
README = (Path(__file__).parents[2] / "README.md").read_text("utf-8")
GEOMETRY = ("length", "angle")
SAME_MISS = 0.10
"""A known miss may move by this part of itself before it has to be measured again."""


def concerns(name: str, row: Row) -> bool:
    """Whether a set has a say: geometry and bond valences are checked with `standard` only, the rest where covered."""
    if name == "standard":
        return True
    if row.quantity in (*GEOMETRY, "bond_valence_sum") or row.system in SPHERES:
        return False
    return set(STRUCTURES[row.system].symbols) <= ELEMENTS[name]


CASES = [pytest.param(name, row, id=f"{name}: {row.name}") for name in SETS for row in ROWS if concerns(name, row)]


@pytest.mark.parametrize(("parameter_set", "row"), CASES)
def test_published_value(parameter_set, row):
    missed = row.misses[parameter_set]
    if row.is_text:
        assert computed(row, parameter_set) == (missed or row.value)
    elif missed:
        known = float(missed)
        assert abs(known) > row.allowed
        assert difference(row, parameter_set) == pytest.approx(known, rel=SAME_MISS), "measure this miss again"
    else:
        assert abs(difference(row, parameter_set)) <= row.allowed


@pytest.mark.parametrize("quantity", QUANTITIES)
def test_tolerance_is_stated_once_per_quantity(quantity):
    stated = {(row.tolerance, row.unit) for row in ROWS if row.quantity == quantity}
    assert len(stated) == 1


def test_rows_are_complete_and_distinct():
    named = Counter((row.quantity, row.system, row.of, row.source_key) for row in ROWS)
    assert [name for name, count in named.items() if count > 1] == []
    for row in ROWS:
        assert row.quantity in QUANTITIES
        assert row.system in STRUCTURES or row.system in SPHERES, row.system
        assert row.read_or_memory in {"read", "memory"}
        assert set(row.misses) >= set(SETS)


def test_every_structure_and_every_source_is_used():
    assert {row.source_key for row in ROWS} == set(SOURCES)
    assert set(SPHERES) <= {row.system for row in ROWS}
    for structure in STRUCTURES.values():
        assert re.search(r"(read|memory)(; \w+ idealised)?$|idealised", structure.source), structure.name


def test_sources_are_in_one_bibliography_only():
    # What the package itself rests on stands in references.json; these are the sources of measured values.
    assert not set(SOURCES) & set(BIBLIOGRAPHY)
    assert all(re.fullmatch(r"[a-z0-9-]+", key) and text.strip() for key, text in SOURCES.items())


def test_structures_are_built_from_the_published_lengths():
    # No miss is tolerated here: these rows check the builds, not the method.
    rows = [row for row in ROWS if row.quantity in GEOMETRY]
    assert len(rows) > 60
    assert not [row.name for row in rows if any(row.misses.values())]


# The table of README.


def readme_rows() -> dict[str, list[str]]:
    """Cells of the table in the section on published values, by quantity."""
    section = README.split("## Published values")[1].split("\n## ")[0]
    lines = [line for line in section.splitlines() if line.startswith("| ")]
    cells = [[cell.strip() for cell in line.strip("|").split("|")] for line in lines]
    return {row[0]: row[1:] for row in cells[2:]}


PREDICTED = [quantity for quantity in QUANTITIES if quantity not in GEOMETRY]


def test_readme_lists_every_quantity():
    assert set(readme_rows()) == set(PREDICTED)


@pytest.mark.parametrize("quantity", PREDICTED)
def test_readme_gives_the_measured_figures(quantity):
    compared, missed, mean = readme_rows()[quantity][:3]
    rows = [row for row in ROWS if row.quantity == quantity]
    assert int(compared) == len(rows)
    assert int(missed) == sum(bool(row.misses["standard"]) for row in rows)
    if rows[0].is_text:
        assert mean == ""
        return
    measured = float(np.mean([abs(difference(row, "standard")) for row in rows]))
    written = mean.split(" ")[0].replace(",", "")
    unit = 10.0 ** -len(written.partition(".")[2]) if "." in written else 100.0 if len(written) > 3 else 1.0
    assert float(written) == pytest.approx(measured, abs=0.6 * unit)


def test_a_wrong_value_would_be_noticed():
    row = next(row for row in ROWS if row.quantity == "bond_valence_sum" and row.system == "VOCl3")
    wrong = Row(**{**{name: getattr(row, name) for name in row.__dataclass_fields__}, "value": "4"})
    with pytest.raises(AssertionError):
        test_published_value("standard", wrong)
