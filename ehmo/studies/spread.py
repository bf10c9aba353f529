"""Standard deviation of every number of a report over draws of its parameters."""

from __future__ import annotations

from dataclasses import replace
from typing import Final

import numpy as np
from numpy.typing import NDArray

from basis_params import ParameterTable
from ehmo.calculate import bond_report, effective_settings
from ehmo.errors import InputError
from ehmo.orbitals.parameters import AUTOMATIC, parameters_for
from ehmo.records.arrays import FloatArray
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options
from ehmo.records.report import BondReport
from ehmo.records.spread import BondSpread, LevelSpread, ParameterEffect, Spread
from ehmo.studies.drawn_bands import band_energies
from ehmo.studies.ensemble import DrawResults, Ensemble, Outcome
from ehmo.studies.uncertainty import ParameterModel, parameter_model
from ehmo.units import PER_CM_PER_EV

DRAWS: Final = 64
SEED: Final = 20_261_201
FEWEST_DRAWS: Final = 2
MOST_DRAWS: Final = 100_000

BoolArray = NDArray[np.bool_]


def spread_report(
    fragment: Fragment,
    params: str | ParameterTable = AUTOMATIC,
    options: Options | None = None,
    *,
    draws: int = DRAWS,
    seed: int = SEED,
) -> BondReport:
    """Bond report that carries the standard deviations of its numbers.

    Parameters
    ----------
    fragment, params, options
        As in `bond_report`.
    draws : int
        Draws of the parameters.
    seed : int
        Seed of the random numbers.

    Returns
    -------
    report : BondReport
        With `spread` set, and a warning where it rests on few draws.

    Raises
    ------
    EhmoError
        As `bond_report`; or if there are too few or too many draws, or none gives a result.
    """
    options = options or Options()
    table = parameters_for(params, fragment.symbols)
    report = bond_report(fragment, table, options)
    spread = parameter_spread(report, table, options, draws=draws, seed=seed)
    lost = spread.draws - spread.used
    warnings = report.warnings
    if 10 * lost > spread.draws:
        warnings += (
            f"{lost} of {spread.draws} draws of the parameters have no result or another filling of the ladder: "
            "the ground state hangs on the parameters",
        )
    return replace(report, spread=spread, warnings=warnings)


def parameter_spread(
    report: BondReport, table: ParameterTable, options: Options, *, draws: int = DRAWS, seed: int = SEED
) -> Spread:
    """Standard deviations of the numbers of a report over draws of its parameters.

    Parameters
    ----------
    report : BondReport
        Undrawn calculation.
    table : ParameterTable
        Set that it was made with.
    options : Options
        Options that it was made with.
    draws : int
        Draws of the parameters.
    seed : int
        Seed of the random numbers.

    Returns
    -------
    spread : Spread

    Raises
    ------
    InputError
        If there are too few or too many draws, or the table is another one.
    ConvergenceError
        If no draw gives a result.
    """
    if not FEWEST_DRAWS <= draws <= MOST_DRAWS:
        raise InputError(
            f"{draws} draws of the parameters", mend=f"ask for {FEWEST_DRAWS} to {MOST_DRAWS}; {DRAWS} are usual"
        )
    if table.content_sha256 != report.method.parameter_sha256:
        raise InputError(
            f"the report was made with {report.method.parameter_set!r}, not with the table {table.name!r}",
            mend="give the table of the report",
        )
    settings = effective_settings(table.settings, options)
    model = parameter_model(
        report.basis, table, settings, self_consistent=report.state.charge_model == "self-consistent"
    )
    followed = tuple(dict.fromkeys(k for band in report.spectroscopy.bands for k in band.orbitals or ()))
    ensemble = Ensemble(report, table, model, followed)
    one_by_one = np.eye(len(model.entries))
    steps = np.concatenate([model.draws(draws, seed), one_by_one, -one_by_one])
    results = ensemble.results(steps)
    used = results.outcome[:draws] == Outcome.USED
    bands = band_energies(report, options, results.numbers, followed)
    mayer = _effects(report, results, draws)
    return Spread(
        draws=draws,
        seed=seed,
        used=int(used.sum()),
        indefinite_overlap=_count(results, draws, Outcome.INDEFINITE_OVERLAP),
        unsettled=_count(results, draws, Outcome.UNSETTLED),
        other_configuration=_count(results, draws, Outcome.OTHER_CONFIGURATION),
        parameters=model.parameters,
        charges=_deviation(results.numbers.charges[:draws], used),
        orbital_energies_eV=_deviation(results.numbers.energies_eV[:draws], used),
        bonds=_bonds(results, draws, used, model, mayer),
        levels=_levels(report, results, draws, used),
        bands_per_cm=tuple(
            None if energies is None else float(_deviation(energies[:draws], used)) for energies in bands
        ),
    )


def _count(results: DrawResults, draws: int, outcome: Outcome) -> int:
    return int((results.outcome[:draws] == outcome).sum())


def _deviation(values: FloatArray, used: BoolArray) -> FloatArray:
    """Standard deviation over the draws that count; NaN for fewer than two."""
    if used.sum() < FEWEST_DRAWS:
        return np.full(values.shape[1:], np.nan)
    deviation: FloatArray = np.std(values[used], axis=0, ddof=1)
    return deviation


def _effects(report: BondReport, results: DrawResults, draws: int) -> FloatArray:
    """(n_parameters, n_bonds) change of the Mayer orders with one standard deviation of each parameter."""
    undrawn = np.array([orders.mayer for orders in report.orders])
    same = (results.outcome == Outcome.USED)[:, None]
    change = np.where(same, results.numbers.orders.mayer - undrawn, np.nan)[draws:]
    up, down = change[: len(change) // 2], -change[len(change) // 2 :]
    # Where one of the two steps has no result or another configuration, the other one speaks alone.
    one_sided = np.where(np.isnan(up), down, up)
    effects: FloatArray = np.where(np.isnan(up + down), one_sided, (up + down) / 2)
    return effects


def _bonds(
    results: DrawResults, draws: int, used: BoolArray, model: ParameterModel, mayer: FloatArray
) -> tuple[BondSpread, ...]:
    orders = results.numbers.orders
    population, by_mayer, wiberg = (
        _deviation(values[:draws], used) for values in (orders.overlap_population, orders.mayer, orders.wiberg)
    )
    found = []
    for bond in range(len(population)):
        effects = [
            ParameterEffect(parameter.name, float(effect))
            for parameter, effect in zip(model.parameters, mayer[:, bond], strict=True)
            if np.isfinite(effect)
        ]
        found.append(
            BondSpread(
                float(population[bond]),
                float(by_mayer[bond]),
                float(wiberg[bond]),
                tuple(_deviation(orders.channel_weights[bond][:draws], used).tolist()),
                tuple(sorted(effects, key=lambda effect: -abs(effect.mayer_per_sd))),
            )
        )
    return tuple(found)


def _levels(
    report: BondReport, results: DrawResults, draws: int, used: BoolArray
) -> tuple[tuple[LevelSpread, ...], ...]:
    found: list[tuple[LevelSpread, ...]] = []
    followed = iter(results.numbers.ladders)
    for site in report.sites:
        if site.ladder is None:
            found.append(())
            continue
        ladder = next(followed)
        energies = ladder.energies_eV[:draws]
        own = _deviation(energies, used)
        above = _deviation((energies - energies[:, :1]) * PER_CM_PER_EV, used)
        found.append(tuple(LevelSpread(*pair) for pair in zip(own.tolist(), above.tolist(), strict=True)))
    return tuple(found)
