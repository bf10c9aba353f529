"""Draws of the parameters against as many calculations, each as in `bench_calculation`."""

from __future__ import annotations

from dataclasses import replace

import pytest
from threadpoolctl import threadpool_limits

from benchmarks.bench_calculation import TABLE, calculation
from benchmarks.pairs import timed_in_turn
from benchmarks.systems import vanadyl_in_water
from ehmo.calculate import bond_report, effective_settings
from ehmo.records.options import Options
from ehmo.studies.ensemble import Ensemble, Outcome
from ehmo.studies.spread import DRAWS, SEED, parameter_spread
from ehmo.studies.uncertainty import parameter_model

ROUNDS = {43: 10, 295: 3}
REPEATS = 16
"""Calculations timed at once, to weigh as much as the draws against a restless machine."""

MODELS = {"self-consistent": (43,), "fixed": (43, 295)}


def _sure(element):
    return replace(element, shells=tuple(replace(shell, zeta_sd=0.0) for shell in element.shells))


SURE_EXPONENTS = replace(TABLE, elements={symbol: _sure(element) for symbol, element in TABLE.elements.items()})
"""The standard set without uncertainty of its exponents."""


def cases():
    return [(model, n_functions) for model, sizes in MODELS.items() for n_functions in sizes]


@pytest.mark.parametrize(("model", "n_functions"), cases())
def bench_draws_of_h_ii_and_constants(model, n_functions, benchmark, record_ratio):
    """Orders, populations, charges and ladder of 64 draws that leave the exponents alone."""
    options = Options(charge_model=model)
    with threadpool_limits(1):
        run, _ = calculation(n_functions, options)
        report = bond_report(vanadyl_in_water(n_functions), TABLE, options)
        settings = effective_settings(TABLE.settings, options)
        parameters = parameter_model(report.basis, SURE_EXPONENTS, settings, self_consistent=model == "self-consistent")
        steps = parameters.draws(DRAWS, SEED)

        def draws():
            return Ensemble(report, SURE_EXPONENTS, parameters).results(steps)

        assert (draws().outcome == Outcome.USED).all()
        ours, several = timed_in_turn(draws, lambda: [run() for _ in range(REPEATS)], rounds=ROUNDS[n_functions])
        benchmark.pedantic(draws, rounds=ROUNDS[n_functions])
    record_ratio(
        f"64 draws of h_ii and constants, {model} charges, {n_functions} functions, in 64 calculations",
        ours / several * REPEATS / DRAWS,
        0.8,
    )


@pytest.mark.parametrize(("model", "n_functions"), cases())
def bench_whole_spread(model, n_functions, benchmark, record_ratio):
    """64 draws of all parameters, and both steps of each one alone; with terms, bands and statistics."""
    options = Options(charge_model=model)
    with threadpool_limits(1):
        run, _ = calculation(n_functions, options)
        report = bond_report(vanadyl_in_water(n_functions), TABLE, options)

        def spread():
            return parameter_spread(report, TABLE, options)

        assert spread().used > DRAWS // 2
        ours, several = timed_in_turn(spread, lambda: [run() for _ in range(REPEATS)], rounds=ROUNDS[n_functions])
        benchmark.pedantic(spread, rounds=ROUNDS[n_functions])
    record_ratio(
        f"whole spread of 64 draws, {model} charges, {n_functions} functions, in 64 calculations",
        ours / several * REPEATS / DRAWS,
        2.0,
    )
