"""Gradient of the total energy against the energy alone."""

from __future__ import annotations

import pytest
from threadpoolctl import threadpool_limits

from benchmarks.bench_calculation import TABLE
from benchmarks.pairs import timed_in_turn
from benchmarks.systems import vanadyl_in_water
from ehmo.calculate import effective_settings
from ehmo.calculate.energy import fragment_energy
from ehmo.records.options import Options

CHANNELS = Options(K_sigma=1.67, K_pi=2.0, K_decay_per_A=0.3)


@pytest.mark.parametrize(("n_functions", "charge_model"), [(43, "self-consistent"), (43, "fixed"), (295, "fixed")])
def bench_gradient(benchmark, record_ratio, n_functions, charge_model):
    """Energy with gradient, in energies alone."""
    fragment = vanadyl_in_water(n_functions)
    options = Options(charge_model=charge_model)
    settings = effective_settings(TABLE.settings, options)

    def alone() -> None:
        fragment_energy(fragment, TABLE, settings, options)

    def both() -> None:
        fragment_energy(fragment, TABLE, settings, options, gradient=True)

    with threadpool_limits(1):
        both()
        whole, single = timed_in_turn(both, alone, rounds=40)
        benchmark.pedantic(both, rounds=2)
    record_ratio(f"energy and gradient, {n_functions} functions, {charge_model} charges", whole / single, 2)


def bench_gradient_by_channel(benchmark, record_ratio):
    """The same with K by channel and distance."""
    fragment = vanadyl_in_water(43)
    settings = effective_settings(TABLE.settings, CHANNELS)

    def alone() -> None:
        fragment_energy(fragment, TABLE, settings, CHANNELS)

    def both() -> None:
        fragment_energy(fragment, TABLE, settings, CHANNELS, gradient=True)

    with threadpool_limits(1):
        both()
        whole, single = timed_in_turn(both, alone, rounds=40)
        benchmark.pedantic(both, rounds=2)
    record_ratio("energy and gradient, 43 functions, K by channel and distance", whole / single, 2)
