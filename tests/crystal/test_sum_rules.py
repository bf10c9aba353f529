"""What populations, curves and orders of a crystal must add up to, and how they turn with it."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from ehmo.analysis.energy_curves import density_of_states, overlap_population_curves
from ehmo.records.bloch import LatticeBond
from tests.crystal.runs import order_rows, run_crystal
from tests.crystal.structures import MOO3, REO3, TILTED, Crystal, metal_oxygen_bonds


def integral(curve) -> np.ndarray:
    return curve.values.sum(axis=1) * (curve.energies_eV[1] - curve.energies_eV[0])


@pytest.fixture(scope="module", params=["insulator", "open shell", "metal"])
def bonding(request, standard):
    crystal, mesh, reach, options = {
        "insulator": (MOO3, (3, 1, 3), 2.4, {}),
        "open shell": (TILTED, (2, 2, 3), 2.4, {"charge": 1, "unpaired_electrons": 1}),
        "metal": (REO3, (3, 3, 3), 2.0, {}),
    }[request.param]
    return run_crystal(crystal, metal_oxygen_bonds(crystal, reach), standard, mesh=mesh, **options)


def test_populations_hold_the_electrons(bonding):
    populations, electrons = bonding.populations, bonding.electrons
    assert populations.gross.sum() == pytest.approx(electrons.total, abs=1e-8)
    assert populations.shell_gross.sum() == pytest.approx(electrons.total, abs=1e-8)
    assert populations.charges.sum() == pytest.approx(bonding.basis.core_charges.sum() - electrons.total, abs=1e-8)
    assert populations.charges == pytest.approx(bonding.state.charges, abs=1e-8)
    assert populations.spin.sum() == pytest.approx(electrons.unpaired or 0, abs=1e-8)
    halves = (populations.atom_overlap.sum(axis=1) + populations.atom_overlap.diagonal()) / 2
    assert halves == pytest.approx(bonding.basis.core_charges - populations.charges, abs=1e-8)


def test_density_of_states_holds_every_band(bonding):
    curve = density_of_states(bonding.state)
    assert integral(curve).sum() == pytest.approx(2 * len(bonding.basis), rel=1e-6)
    assert curve.values.sum(axis=0).min() > -1e-9


def test_overlap_population_of_all_bands_up_to_the_gap_is_that_of_the_bond(bonding):
    if bonding.gap is None:
        pytest.skip("a gap is needed to integrate up to it")
    curve = overlap_population_curves(bonding.state, bonding.orders, width_eV=0.02)
    below = curve.energies_eV < (bonding.gap.valence_eV + bonding.gap.conduction_eV) / 2
    summed = curve.values[:, below].sum(axis=1) * (curve.energies_eV[1] - curve.energies_eV[0])
    held = [order.overlap_population for order in bonding.orders]
    if not bonding.electrons.unpaired:
        assert summed == pytest.approx(held, abs=2e-3)


def test_channels_add_up_to_the_wiberg_order(bonding):
    for order in bonding.orders:
        assert order.channel_weights.sum() == pytest.approx(order.wiberg, abs=1e-10)


def test_pairs_of_all_cells_add_up_to_the_overlap_population_with_all_images(standard):
    pairs = [LatticeBond(0, donor, cell) for donor in (1, 2, 3) for cell in product(range(-5, 6), repeat=3)]
    bonding = run_crystal(TILTED, pairs, standard, mesh=(2, 2, 2))
    for donor in (1, 2, 3):
        chosen = [
            order.overlap_population for order, bond in zip(bonding.orders, pairs, strict=True) if bond.donor == donor
        ]
        assert sum(chosen) == pytest.approx(bonding.populations.atom_overlap[0, donor], abs=1e-6)


def same_numbers(first, second, tolerance=1e-8):
    assert second.state.energy_eV == pytest.approx(first.state.energy_eV, abs=tolerance)
    assert second.populations.charges == pytest.approx(first.populations.charges, abs=tolerance)
    assert order_rows(second) == pytest.approx(order_rows(first), abs=tolerance)
    for one, other in zip(first.orders, second.orders, strict=True):
        assert other.channel_weights == pytest.approx(one.channel_weights, abs=tolerance)


@pytest.mark.parametrize("model", ["fixed", "self-consistent"])
def test_turning_and_shifting_the_crystal_changes_nothing(standard, model):
    bonds = metal_oxygen_bonds(TILTED, 2.4)
    options = {"mesh": (2, 3, 2), "charge_model": model}
    turn = Rotation.from_rotvec([0.3, -0.5, 0.8]).as_matrix()
    turned = Crystal(TILTED.symbols, TILTED.positions_A @ turn.T + np.array([0.4, -3.0, 1.0]), TILTED.cell_A @ turn.T)
    same_numbers(run_crystal(TILTED, bonds, standard, **options), run_crystal(turned, bonds, standard, **options))


def test_atoms_may_be_given_in_any_cell(standard):
    bonds = metal_oxygen_bonds(TILTED, 2.4)
    shifts = np.array([[0, 0, 0], [1, 0, -1], [0, 2, 0], [-1, 0, 0]])
    moved = Crystal(TILTED.symbols, TILTED.positions_A + shifts @ TILTED.cell_A, TILTED.cell_A)
    renamed = [
        LatticeBond(
            b.metal, b.donor, tuple(int(x) for x in np.array(b.translation) + shifts[b.metal] - shifts[b.donor])
        )
        for b in bonds
    ]
    options = {"mesh": (2, 3, 2), "charge_model": "self-consistent"}
    same_numbers(run_crystal(TILTED, bonds, standard, **options), run_crystal(moved, renamed, standard, **options))


def test_another_choice_of_cell_vectors_changes_nothing(standard):
    bonds = metal_oxygen_bonds(TILTED, 2.4)
    change = np.array([[1, 1, 0], [0, 1, 0], [0, -1, 1]])
    sheared = Crystal(TILTED.symbols, TILTED.positions_A, change @ TILTED.cell_A)
    back = np.round(np.linalg.inv(change)).astype(int)
    renamed = [LatticeBond(b.metal, b.donor, tuple(int(x) for x in np.array(b.translation) @ back)) for b in bonds]
    options = {"mesh": (3, 3, 3)}
    same_numbers(run_crystal(TILTED, bonds, standard, **options), run_crystal(sheared, renamed, standard, **options))
