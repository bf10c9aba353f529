"""Two-body terms of a calibration: a term is found again, and values equal those of whole energies."""

from __future__ import annotations

from dataclasses import replace
from math import exp, sqrt

import numpy as np
import pytest

import basis_params
from basis_params import PairRepulsion
from basis_params.reader import parse_table
from ehmo.calculate.energy import energy_model
from ehmo.errors import EhmoError
from ehmo.studies.calibration import calibrate, read_spec
from ehmo.studies.calibration.modes import kind_and_phase, phase_wavenumber
from ehmo.studies.calibration.training import training_structures
from ehmo.studies.calibration.two_body import fit_pairs, mechanical_value, stretched_structures
from ehmo.studies.stretching import bond_forces, normal_modes
from ehmo.units import PER_CM_PER_ROOT_EV_A2_U
from tests.calibration_cases import HEAD, put_case

STANDARD = basis_params.load_set("standard")
DECAY = 4.2
SPEC = """
name = "terms"
observables = ["observables.csv"]
structures = ["structures.xyz"]

[sd]
length = 0.01
"stretching wavenumber" = 5.0

[[repulsion]]
pairs = ["V-O"]
decay_per_A = 4.0
decay_sd = 2.0
"""


def bonds_and_term():
    """Vanadate with the term that puts its minimum at the published length."""
    from ehmo.structure import perceive
    from tests.published.structures import STRUCTURES

    fragment = STRUCTURES["VO4 3-"].fragment()
    coordination = perceive(fragment)
    silent = replace(STANDARD, repulsion={"V-O": PairRepulsion("V", "O", 0.0, 1.0, 1.0, 2.0, "x", "x", "derived")})
    force = bond_forces(fragment, coordination, coordination.bonds, energy_model(silent))[0]
    amplitude = -force / DECAY * exp(DECAY * 1.705)
    return fragment, coordination, PairRepulsion("V", "O", amplitude, DECAY, 1.6, 1.8, "x", "x", "derived")


@pytest.fixture(scope="module")
def case(tmp_path_factory):
    """Specification, structures and the term; the wavenumbers are those that the term gives."""
    folder = tmp_path_factory.mktemp("pairs")
    path = put_case(folder, SPEC)
    _, _, term = bonds_and_term()
    blank = [f"VO4 3-,VO4 3-,stretching wavenumber,oxo {p} phase,800,,cm-1,made here,derived" for p in ("in", "out of")]
    length = "VO4 3-,VO4 3-,length,oxo,1.705,,A,made here,derived"
    (folder / "observables.csv").write_text("\n".join([HEAD, length, *blank]) + "\n")
    spec = read_spec(path)
    structures = training_structures(spec, STANDARD)
    stretched = stretched_structures(spec, structures, STANDARD)
    table = replace(STANDARD, repulsion={"V-O": term})
    values = [mechanical_value(o, stretched["VO4 3-"], table) for o in spec.observables]
    rows = [row.replace("800", f"{value:.9f}") for row, value in zip(blank, values[1:], strict=True)]
    (folder / "observables.csv").write_text("\n".join([HEAD, length, *rows]) + "\n")
    return read_spec(path), structures, stretched, term, values


def test_the_minimum_is_the_published_length(case):
    assert case[4][0] == pytest.approx(1.705, abs=1e-5)


def test_a_term_is_found_again(case):
    # Law: length and wavenumbers are those of the term; only the wide priors keep the fit from it.
    spec, _, stretched, term, _ = case
    found = fit_pairs(spec, stretched, spec.observables)["V-O"]
    assert found.decay_per_A == pytest.approx(DECAY, abs=0.02)
    assert found.energy_eV(1.705) == pytest.approx(term.energy_eV(1.705), rel=0.01)
    assert (found.lowest_A, found.highest_A) == (1.66, 1.76)


def test_values_with_a_term_are_those_of_whole_energies(case):
    # Independent route: force constants from energies that hold the term.
    spec, _, stretched, term, values = case
    one = stretched["VO4 3-"]
    pull = term.amplitude_eV * DECAY * np.exp(-DECAY * one.lengths_A)
    for observable, value in zip(spec.observables, values, strict=True):
        tolerance = 1e-5 if observable.quantity == "length" else 0.5
        assert one.value(observable, pull, np.full(4, DECAY)) == pytest.approx(value, abs=tolerance)


def test_symmetric_stretch_of_a_tetraoxo_ion():
    # Closed formula (Herzberg 1945, memory): nu1 = sqrt((f + 3 f') / m_O), whatever the metal weighs.
    f, coupling, m_oxygen, m_metal = 40.0, 1.5, 15.999, 50.94
    constants = np.full((4, 4), coupling) + (f - coupling) * np.eye(4)
    inverse = np.full((4, 4), -1 / 3 / m_metal) + (1 / m_oxygen + 1 / m_metal + 1 / 3 / m_metal) * np.eye(4)
    modes = normal_modes(constants, inverse)
    places = [0, 1, 2, 3]
    expected = sqrt((f + 3 * coupling) / m_oxygen) * PER_CM_PER_ROOT_EV_A2_U
    assert phase_wavenumber(modes, places, in_phase=True) == pytest.approx(expected)
    # nu3 without bending: sqrt((f - f')(1/m_O + 4/(3 m_M))).
    expected = sqrt((f - coupling) * (1 / m_oxygen + 4 / 3 / m_metal)) * PER_CM_PER_ROOT_EV_A2_U
    assert phase_wavenumber(modes, places, in_phase=False) == pytest.approx(expected)
    assert np.isnan(phase_wavenumber(modes, [2], in_phase=False))


def test_words_of_a_mode():
    assert kind_and_phase("oxo in phase") == ("oxo", True)
    assert kind_and_phase("hydroxo? out of phase") == ("hydroxo?", False)
    assert kind_and_phase("V1-O2") == ("V1-O2", None)


def test_the_written_table_holds_the_term(case):
    spec = case[0]
    found = calibrate(spec)
    table = parse_table(found.table_text, "written", "written", base=STANDARD)
    term = table.repulsion["V-O"]
    assert term.provenance == "derived"
    assert term.source_key == "terms-calibration"
    length = next(row for row in found.fitted if row.observable.quantity == "length")
    assert length.trained == pytest.approx(1.705, abs=0.005)
    # Without the only species that tells the pair there is nothing to predict with.
    assert length.left_out is None


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ('"V-O"', '"V"', ["repulsion 1, pairs", "no pair"]),
        ('"V-O"', '"V-Cl"', ["V-Cl", "no length"]),
        ('"V-O"', '"V-O", "V-O"', ["V-O is listed twice"]),
        ('"V-O"', '"O-V", "V-O"', ["listed twice"]),
        ('"V-O"', '"V-Xx"', ["Xx"]),
        ("decay_per_A = 4.0", "decay_per_A = 0", ["decay_per_A", "above 0"]),
        ("decay_sd = 2.0", "decay_sd = -1", ["decay_sd", "at least 0"]),
    ],
)
def test_bad_pairs_are_refused(case, tmp_path, old, new, said):
    put_case(tmp_path)
    (tmp_path / "observables.csv").write_text(HEAD + "\nVO4 3-,VO4 3-,length,oxo,1.705,,A,made here,derived\n")
    (tmp_path / "case.toml").write_text(SPEC.replace(old, new))
    with pytest.raises(EhmoError) as caught:
        spec = read_spec(tmp_path / "case.toml")
        stretched_structures(spec, training_structures(spec, STANDARD), STANDARD)
    for words in said:
        assert words in str(caught.value)
