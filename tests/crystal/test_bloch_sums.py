"""Pairs with translations and their Bloch sums, against finite clusters and closed formulas."""

from __future__ import annotations

from itertools import product

import numpy as np
import pytest

import basis_params
from ehmo.electronic.bloch import bloch_problem, solve_point
from ehmo.orbitals.lattice import lattice_overlaps, lattice_pairs
from ehmo.orbitals.overlap import ChannelScale, overlap_matrix, scaled_overlap_matrices
from ehmo.orbitals.pairs import orbital_plan
from ehmo.records.bloch import k_mesh
from tests.crystal.structures import TILTED, V2O5, Crystal
from tests.numeric_boxes import shell, table

HYDROXIDE = Crystal(
    ("O", "H", "O"),
    np.array([[0.2, 0.1, 0.3], [0.9, 0.6, -0.2], [-2.0, 2.4, 7.0]]),
    np.array([[5.2, 0.0, 0.0], [1.1, 5.6, 0.0], [-0.7, 0.8, 6.1]]),
)
"""Made up; the last atom lies outside the home cell."""


@pytest.mark.parametrize("counts", [(1, 1, 1), (2, 3, 1), (4, 4, 4), (3, 2, 5)])
def test_mesh_stands_for_every_point_once(counts):
    mesh = k_mesh(counts)
    assert mesh.weights.sum() == pytest.approx(1, abs=1e-14)
    whole = set(product(*map(range, counts)))
    steps = np.round(mesh.points * counts).astype(int)
    covered = [tuple(step % counts) for step in np.concatenate([steps, -steps])]
    assert set(covered) == whole
    multiplicity = dict.fromkeys(whole, 0)
    for step, weight in zip(steps, mesh.weights, strict=True):
        multiplicity[tuple(step % counts)] += weight * len(whole) / 2
        multiplicity[tuple(-step % counts)] += weight * len(whole) / 2
    assert set(np.round(list(multiplicity.values()), 12)) == {1.0}


def finite_cluster_sum(crystal, standard, point, scale=None):
    """Bloch sum of the rows of the middle cell of a block of cells, by the molecular overlap matrix."""
    cells = sorted(product(range(-3, 4), repeat=3), key=lambda cell: (np.abs(cell).sum(), cell))
    positions = np.concatenate([crystal.positions_A + np.array(cell) @ crystal.cell_A for cell in cells])
    plan = orbital_plan(crystal.symbols * len(cells), standard)
    if scale is None:
        whole = overlap_matrix(plan, positions)
    else:
        radii = scale.radii_A * len(cells)
        whole = scaled_overlap_matrices(plan, positions, ChannelScale(scale.by_m, scale.decay_per_A, radii))[1]
    n = len(plan.basis) // len(cells)
    blocks = whole[:n].reshape(n, len(cells), n)
    return np.einsum("icj,c->ij", blocks, np.exp(2j * np.pi * (np.array(cells) @ point)))


@pytest.mark.parametrize("scaled", [False, True], ids=["overlap", "scaled channels"])
def test_sums_equal_those_of_a_finite_block_of_cells(standard, scaled):
    radii = tuple(basis_params.atom(symbol).covalent_radius_A for symbol in HYDROXIDE.symbols)
    scale = ChannelScale((1.6, 2.0, 1.75, 1.75), 0.3, radii) if scaled else None
    pairs = lattice_pairs(HYDROXIDE.symbols, HYDROXIDE.positions_A, HYDROXIDE.cell_A, standard)
    matrix = lattice_overlaps(pairs, scale)[1 if scaled else 0]
    point = np.array([0.13, -0.31, 0.42])
    (ours,) = matrix.sums(point[None])
    assert np.abs(ours - finite_cluster_sum(HYDROXIDE, standard, point, scale)).max() < 3e-9


@pytest.mark.parametrize("counts", [(1, 1, 1), (2, 1, 3), (4, 4, 4)])
@pytest.mark.parametrize("crystal", [TILTED, V2O5, HYDROXIDE], ids=["tilted", "V2O5", "atom outside"])
def test_folded_sums_equal_direct_ones(standard, crystal, counts):
    overlap, _ = lattice_overlaps(lattice_pairs(crystal.symbols, crystal.positions_A, crystal.cell_A, standard))
    mesh = k_mesh(counts)
    folded = overlap.on_mesh(mesh)
    assert len(folded.translations) <= (np.prod(counts) + 8) // 2
    for ours, direct in zip(folded.sums(mesh.points), overlap.sums(mesh.points), strict=True):
        assert ours.dtype == direct.dtype
        assert np.abs(ours - direct).max() < 1e-12
        assert np.abs(ours - ours.conj().T).max() < 1e-13


def test_sums_at_points_that_are_their_own_mirror_image_are_real(standard):
    overlap, _ = lattice_overlaps(lattice_pairs(TILTED.symbols, TILTED.positions_A, TILTED.cell_A, standard))
    kinds = [S.dtype.kind for S in overlap.sums(np.array([[0, 0, 0], [0.5, 0, -0.5], [0.25, 0, 0]]))]
    assert kinds == ["f", "f", "c"]


def test_blocks_of_a_pair_are_transposed_in_the_other_direction(standard):
    overlap, _ = lattice_overlaps(lattice_pairs(TILTED.symbols, TILTED.positions_A, TILTED.cell_A, standard))
    for first, second, cell in [(0, 1, (0, 0, 0)), (1, 2, (0, 0, 0)), (2, 0, (0, 1, 0)), (0, 0, (0, 0, 1))]:
        there, back = overlap.block(first, second, cell), overlap.block(second, first, [-c for c in cell])
        assert np.abs(there).max() > 1e-3
        assert np.array_equal(there, back.T)
    assert not overlap.block(1, 3, (40, 0, 0)).any()


def chain_bands(zeta, spacing_bohr, points, K=1.75, h=-13.6):
    """Levels of a chain of 1s functions from our sums, and closed-form overlaps of its neighbours.

    Overlap of two 1s functions: exp(-p) (1 + p + p^2/3), p = zeta R: R. S. Mulliken et al., J. Chem. Phys. 17, 1248
    (1949) (memory).
    """
    bohr = 0.529177210544
    cell = np.diag([spacing_bohr * bohr, 60.0, 60.0])
    parameters = table(H=(1, (shell(1, 0, zeta, h_ii_eV=h),)))
    pairs = lattice_pairs(("H",), np.zeros((1, 3)), cell, parameters)
    overlap, _ = lattice_overlaps(pairs)
    problem = bloch_problem(pairs.basis, overlap, K)
    levels = [
        solve_point(H, S, point, pairs.basis)[0][0]
        for (S, H), point in zip(problem.matrices(points, np.zeros(1)), points, strict=True)
    ]
    p = zeta * spacing_bohr * np.arange(1, 60)
    return np.array(levels), np.exp(-p) * (1 + p + p**2 / 3)


POINTS = np.stack([np.linspace(-0.5, 0.5, 11), np.zeros(11), np.zeros(11)], axis=1)


def test_chain_of_hydrogen_follows_the_closed_band_of_nearest_neighbours():
    # E(k) = (h + 2 b cos ka)/(1 + 2 s cos ka): textbook result of the tight-binding chain (common practice).
    levels, s = chain_bands(2.0, 5.0, POINTS)
    h, b = -13.6, 1.75 * -13.6 * s[0]
    cosine = np.cos(2 * np.pi * POINTS[:, 0])
    assert s[0] > 1e-3
    assert levels == pytest.approx((h + 2 * b * cosine) / (1 + 2 * s[0] * cosine), abs=60 * s[1])
    assert np.ptp(levels) > 1000 * 60 * s[1] / 10


@pytest.mark.parametrize("spacing", [1.9, 3.0, 5.0])
def test_chain_of_hydrogen_with_every_neighbour(spacing):
    levels, s = chain_bands(1.3, spacing, POINTS)
    cosines = np.cos(2 * np.pi * POINTS[:, :1] * np.arange(1, 60))
    summed = 2 * cosines @ s
    assert levels == pytest.approx(-13.6 * (1 + 1.75 * summed) / (1 + summed), abs=1e-7)
