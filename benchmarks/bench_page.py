"""Orbitals on grids, and the page from cold, against their limits in seconds."""

from __future__ import annotations

import os
import resource
import subprocess
import sys
from pathlib import Path
from statistics import median

from benchmarks.bench_calculation import TABLE
from benchmarks.pairs import timed_in_turn
from benchmarks.systems import VANADYL
from ehmo.calculate import bond_report
from ehmo.orbitals.grid import grid_around, grid_values
from ehmo.report.cube import xyz_text
from tests.geometries import SPECIES

ROOT = Path(__file__).parents[1]


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


def bench_page_from_cold(benchmark, record_ratio, tmp_path):
    """``ehmo bond --page`` of aqua vanadyl in a process of its own: its process time as the system counts it."""
    (tmp_path / "a.xyz").write_text(xyz_text(SPECIES[VANADYL].fragment()), encoding="utf-8")
    words = [sys.executable, "-m", "ehmo", "bond", "a.xyz", "--page", "a.html"]
    path = os.pathsep.join([str(ROOT), os.environ.get("PYTHONPATH", "")])
    env = {**os.environ, "OMP_NUM_THREADS": "1", "PYTHONPATH": path}

    def page() -> float:
        before = resource.getrusage(resource.RUSAGE_CHILDREN)
        subprocess.run(words, cwd=tmp_path, env=env, check=True, capture_output=True)
        after = resource.getrusage(resource.RUSAGE_CHILDREN)
        return after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime

    page()
    times = [page() for _ in range(3)]
    benchmark.pedantic(page, rounds=1)
    record_ratio("page of aqua vanadyl from cold, process time in seconds", median(times), 5.0)
    record_ratio("page of aqua vanadyl, in megabytes", (tmp_path / "a.html").stat().st_size / 1e6, 7.0)
