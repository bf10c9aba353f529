"""The whole calibration: fit, leave one species out at a time, write the table."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace

import numpy as np

import basis_params
from basis_params import PairRepulsion, ParameterTable
from ehmo.errors import InputError
from ehmo.orbitals.parameters import load_parameters
from ehmo.records.arrays import FloatArray
from ehmo.records.calibration import MECHANICAL, Calibration, CalibrationSpec, ElectronicFit, Fitted, Observable
from ehmo.studies.calibration.least_squares import fit_parameters, without_species
from ehmo.studies.calibration.progress import Progress
from ehmo.studies.calibration.residuals import Residuals
from ehmo.studies.calibration.tables import fitted_table, written_table
from ehmo.studies.calibration.training import TrainingStructure, training_structures
from ehmo.studies.calibration.two_body import (
    fit_pairs,
    mechanical_observables,
    mechanical_value,
    stretched_structures,
)

Say = Callable[[str], None]
Keep = Callable[[Progress], None]


def calibrate(
    spec: CalibrationSpec,
    base: ParameterTable | None = None,
    *,
    leave_out: bool = True,
    progress: Progress | None = None,
    say: Say | None = None,
    keep: Keep | None = None,
) -> Calibration:
    """Fit a parameter set.

    Parameters
    ----------
    spec : CalibrationSpec
        What is fitted to what.
    base : ParameterTable, optional
        Set that the fit starts from; loaded by its name if left out.
    leave_out : bool
        Whether to fit again without each species in turn, to see how well it is predicted.
    progress : Progress, optional
        Of an earlier run that was stopped.
    say : callable, optional
        Called with one line on each step.
    keep : callable, optional
        Called with the progress after each step.

    Returns
    -------
    calibration : Calibration

    Raises
    ------
    EhmoError
        If a structure or an observable of the specification cannot be used, or nothing can be fitted.
    """
    say = say or _silent
    base = base if base is not None else load_parameters(spec.base)
    progress = progress or Progress(spec.sha256)
    structures = training_structures(spec, base)
    electronic = tuple(o for o in spec.observables if o.quantity not in MECHANICAL)
    if spec.parameters and not electronic:
        raise InputError("no observable tells the parameters", place=spec.place, mend="add orders, charges or bands")
    residuals = Residuals(base, spec.parameters, structures, electronic, spec.unsettled)
    fit, left_out = ElectronicFit(np.zeros(0), np.zeros((0, 0)), 0.0, 0), {}
    if spec.parameters:
        fit, slopes = _fitted(residuals, progress, say, keep)
        left_out = _left_out(residuals, fit, slopes, progress, say, keep) if leave_out else {}
    tables = {"base": base, "trained": fitted_table(base, spec.parameters, fit.values)}
    rows = _compared(
        electronic,
        structures,
        tables,
        {species: fitted_table(base, spec.parameters, values) for species, values in left_out.items()},
    )
    terms: dict[str, PairRepulsion] = {}
    if spec.pairs:
        say("forces and force constants of the two-body terms")
        mechanical, terms = _mechanical(spec, structures, tables, leave_out=leave_out)
        rows += mechanical
    table = written_table(base, spec, fit, terms.values())
    return Calibration(spec, fit, rows, basis_params.format_table(table), _warnings(spec, fit, rows))


def _mechanical(
    spec: CalibrationSpec,
    structures: dict[str, TrainingStructure],
    tables: dict[str, ParameterTable],
    *,
    leave_out: bool,
) -> tuple[tuple[Fitted, ...], dict[str, PairRepulsion]]:
    """Two-body terms, and lengths and wavenumbers beside what they give; electronic parameters stay as they are."""
    trained = tables["trained"]
    stretched = stretched_structures(spec, structures, trained)
    observables = mechanical_observables(spec, stretched)
    terms = fit_pairs(spec, stretched, observables)
    rows = []
    for species in dict.fromkeys(o.species for o in observables):
        without: dict[str, PairRepulsion] = {}
        if leave_out:
            without = fit_pairs(spec, stretched, [o for o in observables if o.species != species])
        for o in (o for o in observables if o.species == species):
            one = stretched[o.structure]
            needed = {pair.label for place, pair in enumerate(spec.pairs) if place in one.pair_of}
            rows.append(
                Fitted(
                    o,
                    mechanical_value(o, one, tables["base"]),
                    mechanical_value(o, one, replace(trained, repulsion=terms)),
                    mechanical_value(o, one, replace(trained, repulsion=without)) if needed <= without.keys() else None,
                )
            )
    return tuple(rows), terms


def _fitted(residuals: Residuals, progress: Progress, say: Say, keep: Keep | None) -> tuple[ElectronicFit, FloatArray]:
    """Solution for the whole set, with its derivatives; from the last step of an earlier run if there is one."""
    if progress.fit is not None:
        say("derivatives at the solution of the earlier run")
        return progress.fit, residuals.jacobian(progress.fit.values)
    start = progress.values
    if start is None:
        start = np.array([parameter.start for parameter in residuals.parameters])

    def note(values: FloatArray) -> None:
        progress.values = values.copy()
        if keep is not None:
            keep(progress)

    fit, slopes = fit_parameters(residuals, start, say=say, keep=note)
    progress.fit = fit
    note(fit.values)
    return fit, slopes


def _left_out(
    residuals: Residuals, fit: ElectronicFit, slopes: FloatArray, progress: Progress, say: Say, keep: Keep | None
) -> dict[str, FloatArray]:
    species = list(dict.fromkeys(o.species for o in residuals.observables))
    for count, name in enumerate(species, start=1):
        if name in progress.left_out:
            continue
        say(f"without {name} ({count} of {len(species)})")
        values, settled = without_species(residuals, fit, slopes, name)
        if not settled:
            say(f"without {name}: stopped before the last step was small")
        progress.left_out[name] = values
        if keep is not None:
            keep(progress)
    return progress.left_out


def _compared(
    observables: tuple[Observable, ...],
    structures: dict[str, TrainingStructure],
    tables: dict[str, ParameterTable],
    without: dict[str, ParameterTable],
) -> tuple[Fitted, ...]:
    """Every observable with what the base, the fitted set and the set without its species give."""
    found: dict[tuple[str, int], float | None] = {}
    for name in dict.fromkeys(o.structure for o in observables):
        rows = [(place, o) for place, o in enumerate(observables) if o.structure == name]
        sets = dict(tables)
        species = {o.species for _, o in rows}
        for one in species & without.keys():
            sets[f"without {one}"] = without[one]
        for label, table in sets.items():
            for (place, _), value in zip(rows, structures[name].values(table, [o for _, o in rows]), strict=True):
                found[label, place] = None if np.isnan(value) else float(value)
    return tuple(
        Fitted(o, found["base", k], found["trained", k], found.get((f"without {o.species}", k)))
        for k, o in enumerate(observables)
    )


def _warnings(spec: CalibrationSpec, fit: ElectronicFit, rows: tuple[Fitted, ...]) -> tuple[str, ...]:
    found = []
    idle = len(spec.observables) - len(rows)
    if idle:
        found.append(f"{idle} lengths and stretching wavenumbers are not used: no two-body term of theirs is fitted")
    for parameter, value in zip(spec.parameters, fit.values.tolist(), strict=True):
        room = min(value - parameter.lowest, parameter.highest - value)
        if room < 1e-3 * (parameter.highest - parameter.lowest):
            found.append(f"{parameter.name} lies at a bound, {value:.3g}")
    return tuple(found)


def _silent(_: str) -> None:
    return
