"""Lattice sums of charges: Madelung constants, and invariance under the choice of cell."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.electronic.charges import charge_interaction
from ehmo.electronic.ewald import MOLECULAR_A, ewald_matrix, lattice_interaction
from ehmo.units import COULOMB_EV_A
from tests.crystal.structures import TILTED, V2O5

FACE_CENTRED = np.array([[0, 0.5, 0.5], [0.5, 0, 0.5], [0.5, 0.5, 0]])

# Madelung constants referred to the nearest distance: M. P. Tosi, Solid State Phys. 16, 1 (1964) (memory).
MADELUNG = {
    "NaCl": (FACE_CENTRED, (0.5, 0.0, 0.0), 1.747565, 5e-7),
    "CsCl": (np.eye(3), (0.5, 0.5, 0.5), 1.762675, 5e-7),
    "ZnS": (FACE_CENTRED, (0.25, 0.25, 0.25), 1.6381, 5e-5),
}
"""Primitive cell and place of the second ion, both in edges of the cube."""


@pytest.mark.parametrize("name", MADELUNG)
@pytest.mark.parametrize("edge_A", [3.0, 6.5])
def test_madelung_constants(name, edge_A):
    cell, place, expected, digits = MADELUNG[name]
    positions = edge_A * np.array([[0, 0, 0], place])
    potential = ewald_matrix(positions, edge_A * cell) @ np.array([1.0, -1.0])
    assert -potential[0] * np.linalg.norm(positions[1]) == pytest.approx(expected, abs=digits)
    assert potential[1] == pytest.approx(-potential[0], abs=1e-12)


def softness(crystal):
    return np.array([{"V": 2.3, "O": 1.2, "H": 1.1}[symbol] for symbol in crystal.symbols])


@pytest.mark.parametrize("counts", [(2, 1, 1), (1, 2, 3)])
@pytest.mark.parametrize("crystal", [TILTED, V2O5], ids=["tilted", "V2O5"])
def test_supercell_gives_the_same_potentials(crystal, counts):
    charges = np.random.default_rng(3).normal(size=len(crystal.symbols))
    charges -= charges.mean()
    larger = crystal.supercell(counts)
    small = lattice_interaction(crystal.positions_A, softness(crystal), crystal.cell_A, 1.0) @ charges
    large = lattice_interaction(larger.positions_A, softness(larger), larger.cell_A, 1.0)
    copies = np.prod(counts)
    assert np.tile(small, copies) == pytest.approx(large @ np.tile(charges, copies), abs=1e-9)


def test_atoms_may_be_given_in_any_cell():
    moved = TILTED.positions_A + np.array([[0, 0, 0], [1, 0, 0], [0, -2, 1], [3, 0, 0]]) @ TILTED.cell_A
    first = lattice_interaction(TILTED.positions_A, softness(TILTED), TILTED.cell_A, 1.0)
    assert lattice_interaction(moved, softness(TILTED), TILTED.cell_A, 1.0) == pytest.approx(first, abs=1e-9)


def test_another_choice_of_cell_vectors_changes_nothing():
    sheared = np.array([[1, 1, 0], [0, 1, 0], [0, -1, 1]]) @ TILTED.cell_A
    first = lattice_interaction(TILTED.positions_A, softness(TILTED), TILTED.cell_A, 1.0)
    assert lattice_interaction(TILTED.positions_A, softness(TILTED), sheared, 1.0) == pytest.approx(first, abs=1e-9)


def test_interaction_is_symmetric_and_positive_for_neutral_charges():
    matrix = lattice_interaction(V2O5.positions_A, softness(V2O5), V2O5.cell_A, 1.0)
    assert np.abs(matrix - matrix.T).max() < 1e-9
    neutral = np.eye(14) - 1 / 14
    assert np.linalg.eigvalsh(neutral @ matrix @ neutral)[1] > 0


def test_differences_within_a_huge_cell_are_those_of_the_molecule():
    positions = np.array([[0, 0, 0], [0, 0, 1.6], [1.9, 0, -0.5], [-2.0, 1.5, -0.5]])
    assert np.linalg.norm(positions[:, None] - positions, axis=2).max() < MOLECULAR_A[0] + 0.5
    soft = np.array([2.3, 1.2, 1.2, 1.2])
    charges = np.array([1.5, -0.5, -0.4, -0.6])
    molecule = charge_interaction(positions, COULOMB_EV_A / soft, 1.0) @ charges
    deviations = []
    for edge in (20.0, 40.0, 80.0):
        potential = lattice_interaction(positions, soft, edge * np.eye(3), 1.0) @ charges
        deviations.append(np.abs(potential - molecule).max())
    assert deviations[1] < deviations[0] / 4
    assert deviations[2] < deviations[1] / 4
    assert deviations[2] < 2e-3


def test_point_charges_have_no_softness_of_their_own():
    # Two points and nothing else: the plain Ewald sum.
    positions, cell = np.array([[0.0, 0, 0], [1.5, 1.5, 1.5]]), 3.0 * np.eye(3)
    bare = lattice_interaction(positions, np.zeros(2), cell, 0.5)
    assert bare == pytest.approx(0.5 * COULOMB_EV_A * ewald_matrix(positions, cell), abs=1e-12)


@pytest.mark.parametrize(("far", "largest"), [((24.0, 48.0), 0.03), ((36.0, 72.0), 0.03)])
def test_far_cutoff_shifts_little_but_the_zero_of_the_potential(monkeypatch, far, largest):
    # A sum of R^-3 over a lattice would change by about an electronvolt with every doubling.
    charges = np.array([{"V": 1.6, "O": -0.64}[symbol] for symbol in V2O5.symbols])
    near = lattice_interaction(V2O5.positions_A, softness(V2O5), V2O5.cell_A, 1.0) @ charges
    monkeypatch.setattr("ehmo.electronic.ewald.SOFTENING_A", far)
    change = lattice_interaction(V2O5.positions_A, softness(V2O5), V2O5.cell_A, 1.0) @ charges - near
    assert np.abs(change - change.mean()).max() < largest
