"""Bands: strengths against plain loops, and the fit to observed bands against fields made up for it."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.analysis.band_fit import FieldModel, fit_bands
from ehmo.analysis.bands import OrbitalLabels, charge_transfer_bands
from ehmo.analysis.multiplets import multiplet_terms
from ehmo.analysis.symmetry import point_group
from ehmo.errors import InputError
from ehmo.orbitals.dipole import dipole_integrals
from ehmo.records.multiplets import ElectronRepulsion
from ehmo.units import BOHR_A, HARTREE_EV, PER_CM_PER_EV
from tests.analysis.ladder_cases import OCTAHEDRON, field_of, ladder_case


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "MnO4 -", "FeO4 2-"])
def test_charge_transfer_strengths_by_plain_loops_mulliken_1939(name, standard):
    # f = (2/3) dE |D|^2 in atomic units, summed over the electrons that can move (Mulliken 1939; memory).
    case = ladder_case(name)
    state, plan = case.bonding.state, case.bonding.plan
    dipoles = dipole_integrals(plan, standard, case.fragment.positions_A, case.bonding.overlap.matrix)
    labels = OrbitalLabels(None, tuple(f"o{k}" for k in range(len(plan.basis))))  # nothing taken together
    ladder = [level.orbital for level in case.ladder.levels]
    shares = case.bonding.populations.orbital_shares[:, 0]
    bands = charge_transfer_bands(state, labels, ladder, dipoles, np.eye(3), shares)
    assert bands
    C, E, filled = state.coefficients, state.energies_eV, state.occupations
    for band in bands:
        i, _, _, k, _ = band.transition.split()
        i, k = int(i) - 1, int(k) - 1
        squared = sum((C[:, i] @ dipoles[axis] @ C[:, k] / BOHR_A) ** 2 for axis in range(3))
        electrons = sum(filled[spin, i] * (1 - filled[spin, k]) for spin in range(2))
        expected = 2 / 3 * (E[k] - E[i]) / HARTREE_EV * squared * electrons
        assert band.oscillator_strength == pytest.approx(expected, rel=1e-9, abs=1e-12)
        assert not (i in ladder and k in ladder)
        on_metal = plan.basis.atom_of == case.coordination.metals[0]
        gross = (C * (case.bonding.overlap.matrix @ C))[on_metal].sum(axis=0)
        assert band.to_metal == pytest.approx(gross[k] - gross[i], abs=1e-9)


def test_strengths_do_not_depend_on_the_origin(standard):
    case = ladder_case("[VO(OH2)5]2+")
    labels = OrbitalLabels(None, tuple(f"o{k}" for k in range(len(case.bonding.plan.basis))))
    found = []
    for shift in (0.0, 25.0):
        positions = case.fragment.positions_A + shift
        dipoles = dipole_integrals(case.bonding.plan, standard, positions, case.bonding.overlap.matrix)
        bands = charge_transfer_bands(
            case.bonding.state, labels, [], dipoles, np.eye(3), case.bonding.populations.orbital_shares[:, 0]
        )
        found.append({band.transition: band.oscillator_strength for band in bands if band.oscillator_strength > 1e-3})
    assert found[0] == pytest.approx(found[1], rel=1e-6)


def tetragonal(e: float, b1: float, a1: float) -> np.ndarray:
    """Field with b2 at zero [cm^-1 given, eV returned]."""
    return np.diag([0.0, e, a1, e, b1]) / PER_CM_PER_EV


def test_fit_moves_the_levels_to_the_observed_bands_and_names_what_they_leave_open():
    model = FieldModel(tetragonal(8800, 28800, 35700), 1, None, 0.0, point_group("C4v"), np.eye(3), 2)
    fit = fit_bands(model, [16000.0, 13000.0])
    assert [item.upper_term for item in fit.assignments] == ["2E", "2B1"]
    assert [item.fitted_per_cm for item in fit.assignments] == pytest.approx([13000, 16000], abs=10)
    by_name = {item.name: item for item in fit.parameters}
    assert by_name["e"].determined
    assert by_name["b1"].determined
    assert not by_name["a1"].determined
    assert by_name["a1"].fitted_per_cm == pytest.approx(35700, abs=1)
    assert fit.undetermined == ("a1",)


def test_fit_to_its_own_bands_moves_nothing():
    field = field_of(OCTAHEDRON, np.full(6, 0.6), np.full(6, 0.05))
    repulsion, group = ElectronRepulsion.from_racah(700, 2800), point_group("Oh")
    terms = multiplet_terms(field, 3, repulsion, group)
    bands = [term.energy_per_cm for term in terms.terms[1:] if term.multiplicity == 4]
    fit = fit_bands(FieldModel(field, 3, repulsion, 700, group, np.eye(3), 4), bands)
    for item in fit.parameters:
        assert item.fitted_per_cm == pytest.approx(item.computed_per_cm, abs=0.5)


def test_fit_of_field_and_repulsion_finds_what_made_the_bands():
    # Chromium(III)-like: 10 Dq 17,400, B 700 to 725; three bands determine both.
    group = point_group("Oh")
    made = multiplet_terms(
        field_of(OCTAHEDRON, np.full(6, 17400 / 3 / PER_CM_PER_EV), np.zeros(6)),
        3,
        ElectronRepulsion.from_racah(725, 2900),
        group,
    )
    bands = [term.energy_per_cm for term in made.terms[1:] if term.multiplicity == 4]
    start = field_of(OCTAHEDRON, np.full(6, 24000 / 3 / PER_CM_PER_EV), np.zeros(6))
    model = FieldModel(start, 3, ElectronRepulsion.from_racah(650, 2600), 650, group, np.eye(3), 4)
    fitted = {item.name: item for item in fit_bands(model, bands).parameters}
    assert fitted["eg"].fitted_per_cm == pytest.approx(17400, abs=60)
    assert fitted["B"].fitted_per_cm == pytest.approx(725, abs=15)
    assert fitted["eg"].determined


@pytest.mark.parametrize(
    "bands", [[], [-5.0], [float("nan")], [1e4, 2e4, 3e4, 4e4]], ids=["none", "negative", "nan", "too many"]
)
def test_bands_that_do_not_fit_are_refused(bands):
    model = FieldModel(tetragonal(8800, 28800, 35700), 1, None, 0.0, point_group("C4v"), np.eye(3), 2)
    with pytest.raises(InputError) as caught:
        fit_bands(model, bands)
    assert caught.value.mend


def test_named_terms_are_assigned_as_named_even_across_a_crossing():
    # Computed 2A1 below 2B1, observed the other way round: the label decides, and the levels cross in the fit.
    model = FieldModel(tetragonal(10900, 42500, 20800), 1, None, 0.0, point_group("C4v"), np.eye(3), 2)
    fit = fit_bands(model, [14000.0, 11700.0], ["2B1", "2E"])
    assert [(item.upper_term, item.observed_per_cm) for item in fit.assignments] == [("2E", 11700), ("2B1", 14000)]
    assert [item.fitted_per_cm for item in fit.assignments] == pytest.approx([11700, 14000], abs=30)
    levels = np.diag(fit.field_eV - fit.field_eV[0, 0] * np.eye(5)) * PER_CM_PER_EV
    assert levels[4] == pytest.approx(14000, abs=30)
    assert levels[2] == pytest.approx(20800, abs=30)


def test_a_term_that_is_not_there_is_refused_with_those_that_are():
    model = FieldModel(tetragonal(10900, 42500, 20800), 1, None, 0.0, point_group("C4v"), np.eye(3), 2)
    with pytest.raises(InputError, match="2T2g") as caught:
        fit_bands(model, [14000.0], ["2T2g"])
    assert "2B1" in caught.value.mend
