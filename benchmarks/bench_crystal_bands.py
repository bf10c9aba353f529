"""Bands, populations, orders and channels of a V2O5 cell on 4 x 4 x 4 against the bare eigenproblems of the mesh."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import eigh
from threadpoolctl import threadpool_limits

import basis_params
from benchmarks.pairs import timed_in_turn
from ehmo.analysis.crystal import crystal_orders, crystal_populations
from ehmo.electronic.bloch import bloch_problem, fixed_bands
from ehmo.orbitals.lattice import lattice_overlaps, lattice_pairs
from ehmo.records.bloch import k_mesh
from ehmo.records.crystal_electronic import CellElectrons
from tests.crystal.structures import V2O5, metal_oxygen_bonds

TABLE = basis_params.load_set("standard")
LIMITS = {"bands and populations": 2.5, "bands, populations, orders and channels": 4.0}
ROUNDS = 15


def bench_v2o5(record_ratio):
    """The pair list is timed apart; everything per k is within."""
    pairs = lattice_pairs(V2O5.symbols, V2O5.positions_A, V2O5.cell_A, TABLE)
    overlap, _ = lattice_overlaps(pairs)
    mesh, basis = k_mesh((4, 4, 4)), pairs.basis
    electrons = CellElectrons(int(basis.core_charges.sum()))
    bonds = metal_oxygen_bonds(V2O5, 2.3)
    vectors = np.array([V2O5.vector(bond) for bond in bonds])
    blocks = [overlap.block(bond.metal, bond.donor, bond.translation) for bond in bonds]

    def pair_list():
        return lattice_overlaps(lattice_pairs(V2O5.symbols, V2O5.positions_A, V2O5.cell_A, TABLE))

    def bands_and_populations():
        problem = bloch_problem(basis, overlap.on_mesh(mesh), TABLE.settings.K, weighting=TABLE.settings.weighting)
        state = fixed_bands(problem, mesh, electrons)
        return problem, state, crystal_populations(state, problem.overlap, basis)

    def everything():
        problem, state, _ = bands_and_populations()
        return crystal_orders(bonds, vectors, blocks, state, problem.overlap, basis)

    problem = bands_and_populations()[0]
    matrices = [
        (np.ascontiguousarray(H), np.ascontiguousarray(S)) for S, H in problem.matrices(mesh.points, np.zeros(14))
    ]

    def bare():
        for H, S in matrices:
            eigh(H, S)

    everything()
    with threadpool_limits(1):
        base, bands, whole, listed = timed_in_turn(bare, bands_and_populations, everything, pair_list, rounds=ROUNDS)
    for (what, limit), value in zip(LIMITS.items(), (bands, whole), strict=True):
        record_ratio(f"V2O5 on 4 x 4 x 4, {what}, in the bare eigh calls of the mesh", value / base, limit)
    record_ratio("V2O5, pair list and overlap blocks, in the same", listed / base)


@pytest.mark.parametrize("counts", [(6, 6, 6), (8, 8, 8)], ids=["112 points", "260 points"])
def bench_cost_per_point(counts, record_ratio):
    """Time per k-point stays the same as the mesh grows."""
    pairs = lattice_pairs(V2O5.symbols, V2O5.positions_A, V2O5.cell_A, TABLE)
    overlap, _ = lattice_overlaps(pairs)
    electrons = CellElectrons(int(pairs.basis.core_charges.sum()))

    def on(mesh):
        problem = bloch_problem(pairs.basis, overlap.on_mesh(mesh), TABLE.settings.K)
        return fixed_bands(problem, mesh, electrons)

    small, large = k_mesh((4, 4, 4)), k_mesh(counts)
    with threadpool_limits(1):
        few, many = timed_in_turn(lambda: on(small), lambda: on(large), rounds=5)
    record_ratio(f"time per k-point, {len(large)} points in {len(small)}", many / len(large) / (few / len(small)), 1.5)
