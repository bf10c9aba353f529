"""Forces, lengths and modes along metal-donor bonds."""

import numpy as np
import pytest

from ehmo import Options
from ehmo.calculate.energy import energy_model
from ehmo.errors import ConvergenceError, InputError
from ehmo.structure import perceive
from ehmo.studies.displacement import stretched
from ehmo.studies.stretching import (
    atom_masses,
    bond_curvature,
    bond_force,
    bond_force_constants,
    bond_forces,
    equilibrium_change,
    normal_modes,
    stretching_modes,
    wilson_G,
)
from ehmo.units import NEWTON_PER_M_PER_EV_A2, PER_CM_PER_ROOT_EV_A2_U
from tests.energy.fragments import energy, with_terms
from tests.geometries import SPECIES

# Invented terms, for these tests only.
TABLE = with_terms(("V", "O", 2500.0, 4.2, 1.4, 2.4), ("Mn", "O", 2500.0, 4.2, 1.4, 2.4))


def started(name):
    fragment = SPECIES[name].fragment()
    coordination = perceive(fragment)
    return fragment, coordination, [bond for bond in coordination.bonds if bond.may_be_multiple]


@pytest.mark.parametrize("name", ["VOCl3", "MnO4 -", "[VO(OH2)5]2+"])
def test_force_is_the_slope_along_the_bond(name):
    fragment, coordination, bonds = started(name)
    found = bond_forces(fragment, coordination, bonds, energy_model(TABLE))
    h = 1e-3
    for place in range(len(bonds)):
        change = np.zeros(len(bonds))
        change[place] = h
        ahead, behind = (
            energy(stretched(fragment, coordination, bonds, sign * change), table=TABLE).free_eV for sign in (1, -1)
        )
        assert found[place] == pytest.approx((behind - ahead) / (2 * h), abs=1e-3)  # law
    assert bond_force(fragment, coordination, bonds[0], energy_model(TABLE)) == pytest.approx(found[0])


def test_an_aqua_ligand_moves_with_its_hydrogens():
    fragment, coordination, _ = started("[VO(OH2)5]2+")
    aqua = next(bond for bond in coordination.bonds if bond.kind.value == "aqua")
    moved = stretched(fragment, coordination, [aqua], np.array([0.1]))
    hydrogens = [atom for atom in coordination.ligands[aqua.ligand].atoms if atom != aqua.donor]
    for atom in hydrogens:
        before, after = (np.linalg.norm(f.positions_A[atom] - f.positions_A[aqua.donor]) for f in (fragment, moved))
        assert after == pytest.approx(before, abs=1e-12)


@pytest.mark.parametrize("name", ["VOCl3", "MnO4 -"])
def test_energy_is_lowest_at_the_equilibrium(name):
    fragment, coordination, bonds = started(name)
    model = energy_model(TABLE)
    change = equilibrium_change(fragment, coordination, bonds, model)
    energies = [
        model.energy(stretched(fragment, coordination, bonds, np.full(len(bonds), change + d))).free_eV
        for d in (-0.01, 0.0, 0.01)
    ]
    assert energies[1] < min(energies[0], energies[2])
    settled = stretched(fragment, coordination, bonds, np.full(len(bonds), change))
    assert np.abs(bond_forces(settled, coordination, bonds, model)).max() < 1e-3


def test_a_bond_without_a_minimum_says_so():
    fragment, coordination, bonds = started("VOCl3")
    model = energy_model(with_terms(("V", "O", 1e6, 2.0, 1.4, 2.4)), Options(charge_model="fixed"))
    with pytest.raises(ConvergenceError, match="no minimum"):
        equilibrium_change(fragment, coordination, bonds, model)


def test_force_constants_of_equal_bonds_are_equal():
    fragment, coordination, bonds = started("MnO4 -")
    constants = bond_force_constants(fragment, coordination, bonds, energy_model(TABLE))
    np.testing.assert_allclose(np.diag(constants), constants[0, 0], rtol=1e-5)  # law: symmetry
    assert np.ptp(constants[~np.eye(4, dtype=bool)]) < 1e-3
    curvature = bond_curvature(fragment, coordination, bonds[0], energy_model(TABLE))
    assert curvature == pytest.approx(constants[0, 0], rel=1e-6)


def test_modes_of_a_tetraoxo_ion():
    """Law (Wilson, Decius, Cross 1955): a1 has the mass of oxygen alone; t2 has 1/m_O + 4/(3 m_M)."""
    fragment, coordination, bonds = started("MnO4 -")
    modes = stretching_modes(fragment, coordination, bonds, energy_model(TABLE), atom_masses(fragment))
    constants = modes.force_constants_eV_per_A2
    k, coupling = constants[0, 0], constants[0, 1]
    breathing = np.sqrt((k + 3 * coupling) / 15.999) * PER_CM_PER_ROOT_EV_A2_U
    threefold = np.sqrt((k - coupling) * (1 / 15.999 + 4 / (3 * 54.938043))) * PER_CM_PER_ROOT_EV_A2_U
    np.testing.assert_allclose(np.sort(modes.wavenumbers_per_cm), np.sort([breathing, *[threefold] * 3]), rtol=1e-4)
    a1 = int(np.abs(np.abs(modes.stretches) - 0.5).max(axis=1).argmin())
    assert modes.reduced_masses_u[a1] == pytest.approx(15.999, rel=1e-5)


def test_published_isotope_shift_of_a_diatomic():
    """Law: the wavenumber goes with the root of the inverse reduced mass, 0.9585 from V16O to V18O."""
    fragment, coordination, bonds = started("VOCl3")
    model = energy_model(TABLE)
    light, heavy = (
        stretching_modes(fragment, coordination, bonds, model, atom_masses(fragment, chosen)).wavenumbers_per_cm[0]
        for chosen in ({"O2": 16}, {"O2": 18})
    )
    mu = [1 / (1 / m + 1 / 50.9415) for m in (15.99491, 17.99916)]
    assert heavy / light == pytest.approx(np.sqrt(mu[0] / mu[1]), rel=1e-5)


def test_force_constant_and_wavenumber_in_the_units_of_the_trade():
    # Published: CO, k = 1902 N/m and omega_e = 2170 cm-1 (Huber & Herzberg 1979; memory).
    modes = normal_modes(np.array([[1902 / NEWTON_PER_M_PER_EV_A2]]), np.array([[1 / 12.0 + 1 / 15.99491]]))
    assert modes.wavenumbers_per_cm[0] == pytest.approx(2170, abs=3)


def test_bridged_and_shared_bodies_couple():
    fragment, coordination, bonds = started("CrO2Cl2")
    inverse = wilson_G(fragment, coordination, bonds, atom_masses(fragment))
    angle = np.arccos(
        np.dot(fragment.positions_A[1] - fragment.positions_A[0], fragment.positions_A[2] - fragment.positions_A[0])
        / bonds[0].length_A
        / bonds[1].length_A
    )
    np.testing.assert_allclose(inverse[0, 1], np.cos(angle) / 51.9961, rtol=1e-6)  # law


def test_isotopes_by_label_and_by_element():
    fragment = SPECIES["CrO2Cl2"].fragment()
    masses = atom_masses(fragment, {"O": 18, "O2": 16})
    assert masses[1] == pytest.approx(15.99491, abs=1e-5)  # published: atomic mass evaluation
    assert masses[2] == pytest.approx(17.99916, abs=1e-5)
    assert masses[0] == pytest.approx(51.9961)
    with pytest.raises(InputError, match="no atom X9"):
        atom_masses(fragment, {"X9": 18})
    with pytest.raises(InputError, match="no nuclide 'O' 19"):
        atom_masses(fragment, {"O": 19})
