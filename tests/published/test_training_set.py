"""The training set of `oxo`: built from the structures of the tests, sourced, and from the training records only."""

from __future__ import annotations

import csv
import importlib.util
import json
import re
from pathlib import Path

import pytest

from ehmo.studies.calibration import read_spec
from ehmo.studies.calibration.training import training_structures
from tests.published.computed import read_table

ROOT = Path(__file__).parents[2]
SPECS = ROOT / "basis_params" / "specs"
RECORDS = ROOT.parent / "shared" / "reference" / "records.json"
SPEC = read_spec(SPECS / "oxo.toml")
LEFT_TO_JUDGE = ("TcO4 -", "RuO4", "FeO4 2-")
"""Ions whose bands and lengths are no training records: only computed orders and charges of theirs may be fitted to."""

IN_THE_RECORDS = {
    "[FeO(NH3)4(NCCH3)]2+": "[FeO(TMC)(NCMe)]2+ (anti)",
    "trans-[RuO2(NH3)4]2+": "[RuO2(TMC)]2+",
    "[RuO(NH3)5]2+": "[RuO(bpy)(tmtacn)]2+",
    "[MnO(NH2)4]-": "[MnO(TAML)]- Mn(V)",
}
"""Complexes whose macrocycles are cut down here."""

UNITS = {"A": "angstrom", "cm-1": "cm-1"}


@pytest.fixture(scope="module")
def script():
    path = ROOT / "benchmarks" / "parameters" / "training_structures.py"
    module = importlib.util.module_from_spec(found := importlib.util.spec_from_file_location("structures", path))
    found.loader.exec_module(module)
    return module


def test_structures_are_those_that_the_script_builds(script, monkeypatch):
    monkeypatch.chdir(ROOT)
    assert (SPECS / "oxo_structures.xyz").read_text() == script.text()


def test_every_structure_is_used_by_an_observable():
    frames = re.findall(r"^(.+) charge=", (SPECS / "oxo_structures.xyz").read_text(), re.MULTILINE)
    assert len(set(frames)) == len(frames)
    assert set(frames) == {o.structure for o in SPEC.observables}


def test_every_observable_is_there(standard):
    # training_structures refuses bonds, atoms and kinds of donors that a structure has not.
    assert len(training_structures(SPEC, standard)) > 50


def test_recorded_orders_are_those_of_the_published_table():
    rows = {(row["species"], row["bond"]): row["mayer"] for row in read_table("pyscf_minimal.csv")}
    found = [o for o in SPEC.observables if o.quantity == "Mayer order" and o.structure.endswith(", idealised")]
    assert len(found) > 30
    for o in found:
        assert o.value == float(rows[o.structure.removesuffix(", idealised"), o.of])


def test_no_row_is_listed_twice():
    with (SPECS / "oxo_observables.csv").open() as file:
        rows = [tuple(row[:4]) for row in csv.reader(line for line in file if not line.startswith("#"))]
    assert len(set(rows)) == len(rows)


def test_ions_left_to_judge_have_computed_rows_only():
    rows = [o for o in SPEC.observables if o.species in LEFT_TO_JUDGE]
    assert rows
    assert {o.quantity for o in rows} <= {"Mayer order", "charge"}


def plain(name: str) -> str:
    """Name of a species without what differs between the two tables."""
    return re.sub(r"\(MTO\)|[\s\[\]]", "", name)


def test_measured_observables_are_training_records():
    if not RECORDS.exists():
        pytest.skip("the reference data beside the checkout is missing")
    records = json.loads(RECORDS.read_text())
    known = {(plain(r["species"]), r["unit"], r["value"]) for r in records}
    for o in SPEC.observables:
        if o.provenance == "derived" or o.quantity in {"Mayer order", "charge"}:
            continue
        unit = UNITS["A" if o.quantity == "length" else "cm-1"]
        name = plain(IN_THE_RECORDS.get(o.species, o.species))
        values = {v for species, u, v in known if species == name and u == unit}
        assert o.value in values, o.name
