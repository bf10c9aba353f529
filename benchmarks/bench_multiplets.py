"""Terms and spin-orbit levels of open shells against the bare eigenproblems they contain."""

from __future__ import annotations

import numpy as np
import pytest
from threadpoolctl import threadpool_limits

from benchmarks.pairs import timed_in_turn
from ehmo.analysis.multiplets import magnetic_properties, multiplet_terms
from ehmo.analysis.multiplets.spin_adapted import spin_spaces
from ehmo.analysis.symmetry.groups import point_group
from ehmo.records.multiplets import ElectronRepulsion

FIELD_EV = np.diag([0.0, 1.4, 3.2, 1.4, 2.0])
REPULSION = ElectronRepulsion.from_racah(750.0, 3000.0)
ROUNDS = 100


@pytest.mark.parametrize("n_electrons", [1, 2, 3])
def bench_terms(n_electrons, benchmark, record_ratio):
    """Labels, configurations and parents on top of the eigenproblems of each spin, in units of a 100 x 100 eigh."""
    group = point_group("C4v")
    matrices = [symmetric(space.size) for space in spin_spaces(2, n_electrons)]
    yardstick = symmetric(100)

    def run():
        return multiplet_terms(FIELD_EV, n_electrons, REPULSION, group)

    with threadpool_limits(1):
        run()
        ours, bare, unit = timed_in_turn(
            run,
            lambda: [np.linalg.eigh(matrix) for matrix in matrices],
            lambda: np.linalg.eigh(yardstick),
            rounds=ROUNDS,
        )
        benchmark.pedantic(run, rounds=ROUNDS)
    record_ratio(f"terms of d{n_electrons} beyond their eigenproblems, in a 100 x 100 eigh", (ours - bare) / unit, 1.5)


def bench_spin_orbit_levels_of_d5(benchmark, record_ratio):
    """Levels, moment, zero-field splitting and g tensor against one 252 x 252 complex eigh."""
    matrix = symmetric(252) + 1j * np.triu(symmetric(252), 1)
    hermitian = matrix + matrix.conj().T

    def run():
        return magnetic_properties(FIELD_EV, 5, REPULSION, 300.0)

    with threadpool_limits(1):
        run()
        ours, bare = timed_in_turn(run, lambda: np.linalg.eigh(hermitian), rounds=20)
        benchmark.pedantic(run, rounds=20)
    record_ratio("d5 with spin-orbit coupling, in a 252 x 252 complex eigh", ours / bare, 4.0)


def symmetric(size: int) -> np.ndarray:
    """Random symmetric matrix."""
    matrix = np.random.default_rng(size).normal(size=(size, size))
    return matrix + matrix.T
