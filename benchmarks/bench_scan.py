"""A scan against as many single reports."""

from __future__ import annotations

from threadpoolctl import threadpool_limits

from benchmarks.bench_calculation import TABLE
from benchmarks.pairs import timed_in_turn
from benchmarks.systems import VANADYL
from ehmo.calculate import bond_report
from ehmo.records.options import Options
from ehmo.structure import assign_electrons, perceive
from ehmo.studies.scan import bond_plan, run_scan
from tests.geometries import SPECIES

POINTS = 33


def bench_bond_scan(benchmark, record_ratio):
    """V=O of aqua vanadyl from 1.45 to 1.95 angstrom."""
    fragment = SPECIES[VANADYL].fragment()
    coordination = perceive(fragment)
    electrons = assign_electrons(fragment, coordination)
    plan = bond_plan(fragment, coordination, "V1-O2", 1.45, 1.95, POINTS)

    def scan() -> None:
        run_scan(fragment, coordination, electrons, plan, TABLE, Options())

    def report() -> None:
        bond_report(fragment, TABLE, Options())

    with threadpool_limits(1):
        scan()
        whole, single = timed_in_turn(scan, report, rounds=5)
        benchmark.pedantic(scan, rounds=2)
    record_ratio(f"a scan of {POINTS} points, in single reports", whole / single, 1.3 * POINTS)
