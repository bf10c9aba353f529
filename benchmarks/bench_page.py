"""Orbitals on grids, and the page from cold, against their limits in seconds."""

from __future__ import annotations

from benchmarks.bench_calculation import TABLE
from benchmarks.pairs import timed_in_turn
from benchmarks.systems import VANADYL
from ehmo.calculate import bond_report
from ehmo.orbitals.grid import grid_around, grid_values
from tests.geometries import SPECIES


def bench_orbital_on_a_grid(benchmark, record_ratio):
    """One orbital of aqua vanadyl on 60 x 60 x 60 points."""
    fragment = SPECIES[VANADYL].fragment()
    report = bond_report(fragment, TABLE)
    grid = grid_around(fragment.positions_A, 3.5, 0.1, most_points=60**3)
    chosen = report.state.coefficients[:, [report.state.homo]]

    def values() -> None:
        grid_values(chosen, report.basis, fragment.positions_A, TABLE, grid)

    values()
    (seconds,) = timed_in_turn(values, rounds=7)
    benchmark.pedantic(values, rounds=3)
    record_ratio("an orbital of aqua vanadyl on 60 x 60 x 60 points, in seconds", seconds, 0.1)
