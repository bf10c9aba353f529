"""Which parameter set a calculation takes, and what its report says of the calibrated range."""

from __future__ import annotations

from dataclasses import replace

import pytest

import basis_params
import ehmo
from basis_params import PairRepulsion
from ehmo.calculate.remarks import calibrated_range
from ehmo.orbitals.parameters import AUTOMATIC, CALIBRATED_SETS, parameters_for, spin_parameters
from ehmo.structure import perceive
from tests.cli.conftest import VOCL3
from tests.published.structures import STRUCTURES

STANDARD = basis_params.load_set("standard")


@pytest.mark.usefixtures("calibrated")
@pytest.mark.parametrize(
    ("system", "name"),
    [
        ("VOCl3", "oxo"),
        ("MnO4 -", "oxo"),
        ("[VO(OH2)5]2+", "oxo"),
        ("[UO2Cl4]2-", "standard"),
        ("Ti(OCH3)4", "standard"),
    ],
)
def test_the_calibrated_set_where_it_has_every_element(system, name):
    assert ehmo.bond_report(STRUCTURES[system].fragment()).method.parameter_set == name


@pytest.mark.usefixtures("calibrated")
def test_a_named_set_is_taken_as_named():
    assert ehmo.bond_report(STRUCTURES["VOCl3"].fragment(), "standard").method.parameter_set == "standard"
    table = replace(STANDARD, name="own")
    assert parameters_for(table, ["V"]) is table
    assert parameters_for(AUTOMATIC, ["V", "O"]).name == "oxo"
    assert parameters_for(AUTOMATIC, ["V", "O", "Br"]).name == "standard"


@pytest.mark.parametrize(("system", "unpaired"), [("CrO(porphine)", 0), ("[FeO(NH3)4(NCCH3)]2+", 2), ("MnO4 3-", 2)])
def test_an_open_spin_is_settled_by_the_ladder_it_was_tuned_for(system, unpaired):
    # Published ground states, as in values.csv; the ladders of oxo itself are narrower and would unpair the first two.
    species = STRUCTURES[system]
    fragment = ehmo.Fragment(species.symbols, species.positions_A, charge=species.charge)
    report = ehmo.bond_report(fragment, "oxo", ehmo.Options(oxidation_state={"MnO4 3-": 5}.get(system)))
    assert report.method.parameter_set == "oxo"
    assert report.fragment.unpaired_electrons == unpaired
    reason = report.fragment.unpaired_electrons is not None and report.electrons.unpaired_reason
    assert reason.endswith("(ladder of the set standard)")
    assert spin_parameters(STANDARD) is STANDARD


def test_these_tests_mean_standard_where_they_name_none():
    assert parameters_for(AUTOMATIC, ["V", "O"]).name == "standard"


def test_every_calibrated_set_is_shipped():
    # Kept away from the fixture of the session: the names as imported.
    assert set(CALIBRATED_SETS) <= set(basis_params.available_sets())


def test_the_range_is_said_bond_by_bond():
    fragment = STRUCTURES["[VO(OH2)5]2+"].fragment()
    term = PairRepulsion("V", "O", 1000.0, 4.0, 1.5, 1.75, "x", "x", "derived")
    table = replace(STANDARD, repulsion={"V-O": term})
    (said,) = calibrated_range(fragment, perceive(fragment), table)
    assert said.startswith(
        "set standard: within its calibrated range of lengths V1-O2; outside it V1-O3 (V-O 1.5 to 1.75 Å)"
    )
    chloride = STRUCTURES["VOCl3"].fragment()
    (said,) = calibrated_range(chloride, perceive(chloride), table)
    assert said.endswith("no lengths of V-Cl")
    assert calibrated_range(fragment, perceive(fragment), STANDARD) == ()


@pytest.mark.usefixtures("calibrated")
def test_the_command_takes_it_too(capsys, tmp_path, monkeypatch):
    from ehmo.cli import main

    monkeypatch.chdir(tmp_path)
    (tmp_path / "a.xyz").write_text(VOCL3)
    for words, name in ((("bond", "a.xyz"), "set oxo"), (("bond", "a.xyz", "--params", "standard"), "set standard")):
        assert main(list(words)) == 0
        assert name in capsys.readouterr().out
    assert main(["bond", "a.xyz"]) == 0
    assert "within its calibrated range of lengths V1-O2" in " ".join(capsys.readouterr().out.split())
    assert main(["scan", "a.xyz", "--bond", "V1-O2", "--from", "1.52", "--to", "1.64", "--steps", "7", "--quiet"]) == 0
    assert "stretching" in capsys.readouterr().out
