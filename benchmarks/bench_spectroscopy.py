"""Labels, ladder, terms and bands against one calculation; group and shapes of one sphere."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from threadpoolctl import threadpool_limits

from benchmarks.bench_calculation import TABLE, calculation
from benchmarks.pairs import seconds, timed_in_turn
from benchmarks.systems import VANADYL, vanadyl_in_water
from ehmo.analysis.symmetry import shape_measures
from ehmo.calculate.orbital_labels import sphere_irreps
from ehmo.calculate.report import bond_report
from ehmo.calculate.sites import site_formal_orders, site_ladders, sphere_symmetries
from ehmo.calculate.spectroscopy import spectroscopy
from ehmo.records.options import Options
from ehmo.structure import assign_electrons, perceive
from tests.geometries import SPECIES

LIMITS = {43: 4.0, 295: 0.5}


@pytest.mark.parametrize("n_functions", LIMITS)
def bench_labels_ladder_terms_and_bands(n_functions, benchmark, record_ratio):
    """With the group known, in fixed calculations of the main job; magnetism left out."""
    fragment = vanadyl_in_water(n_functions)
    options = Options(charge_model="fixed")
    with threadpool_limits(1):
        run, bonding = calculation(n_functions, options)
        coordination = perceive(fragment)
        electrons = assign_electrons(fragment, coordination)
        sites = bond_report(fragment, TABLE, options).sites
        symmetries = tuple(site.symmetry for site in sites)

        def work() -> None:
            ladders, _ = site_ladders(coordination, electrons, bonding, symmetries)
            found = (replace(sites[0], ladder=ladders[0]),)
            irreps = sphere_irreps(found, bonding)
            site_formal_orders(fragment, coordination, found)
            spectroscopy(fragment, coordination, found, irreps, bonding, TABLE, options, magnetism=False)

        work()
        ours, whole = timed_in_turn(work, run, rounds=50)
        benchmark.pedantic(work, rounds=20)
    record_ratio(
        f"labels, ladder, terms, bands at {n_functions} functions, in one calculation",
        ours / whole,
        LIMITS[n_functions],
    )


def bench_sphere(benchmark, record_ratio):
    """Point group, symmetrised geometry and shape measures of one sphere, once per geometry."""
    species = SPECIES[VANADYL]
    fragment = species.fragment()
    coordination = perceive(fragment)
    donors = [bond.donor for bond in coordination.bonds]

    def work() -> None:
        sphere_symmetries(fragment, coordination)
        shape_measures(fragment.positions_A[0], fragment.positions_A[donors])

    work()
    milliseconds = 1e3 * float(np.median([seconds(work) for _ in range(30)]))
    benchmark.pedantic(work, rounds=20)
    record_ratio("group and shapes of one sphere [ms]", milliseconds, 40)
