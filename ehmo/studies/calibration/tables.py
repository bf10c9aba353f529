"""From the values of the free parameters to a parameter table."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import replace

import numpy as np

import basis_params
from basis_params import ElementParameters, ModelSettings, PairRepulsion, ParameterTable, Shell
from ehmo.records.arrays import FloatArray
from ehmo.records.calibration import CalibrationSpec, ElectronicFit, FreeParameter

DIGITS = {"h_ii": 3, "zeta": 4, "constant": 4}
"""Decimals of what is written; far below any standard deviation."""

ShellKey = tuple[str, int, int]


def fitted_table(base: ParameterTable, parameters: Sequence[FreeParameter], values: FloatArray) -> ParameterTable:
    """Base set with the parameters at given values.

    Parameters
    ----------
    base : ParameterTable
    parameters : sequence of FreeParameter
    values : (n_parameters,) ndarray
        Constants themselves, changes of h_ii [eV], logarithms of factors of exponents.

    Returns
    -------
    table : ParameterTable
        Parameters that move one shell add up. Numbers are rounded as they are written.
    """
    change, factor = (_sums(parameters, values, kind) for kind in ("h_ii", "zeta"))
    constants = {
        "lambda_" if parameter.key == "lambda" else parameter.key: round(value, DIGITS["constant"])
        for parameter, value in zip(parameters, values.tolist(), strict=True)
        if parameter.kind == "constant"
    }
    elements = dict(base.elements)
    for symbol in {symbol for symbol, _, _ in (*change, *factor)}:
        element = elements[symbol]
        shells = tuple(
            _moved(shell, change.get((symbol, shell.n, shell.l)), factor.get((symbol, shell.n, shell.l)))
            for shell in element.shells
        )
        elements[symbol] = ElementParameters(symbol, element.valence_electrons, shells)
    return ParameterTable(base.name, base.edition, replace(base.settings, **constants), elements)


def written_table(
    base: ParameterTable,
    spec: CalibrationSpec,
    fit: ElectronicFit,
    repulsion: Iterable[PairRepulsion] = (),
    notes: Sequence[str] = (),
) -> ParameterTable:
    """Fitted set with where each number comes from and its standard deviation.

    Parameters
    ----------
    base : ParameterTable
    spec : CalibrationSpec
    fit : ElectronicFit
    repulsion : iterable of PairRepulsion
        Two-body terms.
    notes : sequence of str
        Remarks beyond those of the specification.

    Returns
    -------
    table : ParameterTable
        Rows that were not fitted keep their source; outliers of the audits are named in the notes.
    """
    parameters = spec.parameters
    moved = fitted_table(base, parameters, fit.values)
    symbols = spec.elements or tuple(moved.elements)
    elements = {
        symbol: replace(
            moved.elements[symbol],
            shells=tuple(
                _sourced(symbol, old, new, spec, fit)
                for old, new in zip(base.elements[symbol].shells, moved.elements[symbol].shells, strict=True)
            ),
        )
        for symbol in basis_params.atom_symbols()
        if symbol in symbols
    }
    table = ParameterTable(
        name=spec.name,
        edition=spec.edition,
        settings=_settings(moved.settings, parameters, fit),
        elements=elements,
        notes=(*spec.notes, *notes),
        repulsion={term.label: term for term in repulsion},
    )
    outliers = tuple(
        f"Audit outlier: {row.element} {row.shell} {row.check} {row.ratio:.2f} "
        f"({row.value:.2f} in the table, {row.reference:.2f} in the free atom)."
        for row in basis_params.audit(table).outliers
    )
    return replace(table, notes=(*table.notes, *outliers))


def _moved(shell: Shell, change: float | None, factor: float | None) -> Shell:
    h_ii = shell.h_ii_eV if change is None else round(shell.h_ii_eV + change, DIGITS["h_ii"])
    zetas = shell.zetas
    if factor is not None:
        zetas = tuple(round(zeta * float(np.exp(factor)), DIGITS["zeta"]) for zeta in zetas)
    return replace(shell, h_ii_eV=h_ii, zetas=zetas)


def _sums(parameters: Sequence[FreeParameter], values: FloatArray, kind: str) -> dict[ShellKey, float]:
    total: dict[ShellKey, float] = {}
    for parameter, value in zip(parameters, values.tolist(), strict=True):
        if parameter.kind == kind:
            for shell in parameter.shells:
                total[shell] = total.get(shell, 0.0) + value
    return total


def _sd(key: ShellKey, kind: str, parameters: Sequence[FreeParameter], fit: ElectronicFit) -> float | None:
    """Standard deviation of what one shell's number rests on; None where it was not fitted."""
    moves = np.array([float(p.kind == kind and key in p.shells) for p in parameters])
    return float(np.sqrt(moves @ fit.covariance @ moves)) if moves.any() else None


def _sourced(symbol: str, old: Shell, new: Shell, spec: CalibrationSpec, fit: ElectronicFit) -> Shell:
    key = (symbol, old.n, old.l)
    h_sd, zeta_sd = (_sd(key, kind, spec.parameters, fit) for kind in ("h_ii", "zeta"))
    if h_sd is None and zeta_sd is None:
        return new
    fitted = " and ".join(
        words
        for words, sd in ((f"h_ii (from {old.h_ii_eV:g})", h_sd), (f"exponents (from {_listed(old.zetas)})", zeta_sd))
        if sd is not None
    )
    return replace(
        new,
        source_key=spec.source_key,
        locator=f"{fitted} fitted; the rest {old.source_key} ({old.provenance})",
        provenance="derived",
        h_ii_sd_eV=old.h_ii_sd_eV if h_sd is None else round(h_sd, 2),
        zeta_sd=old.zeta_sd if zeta_sd is None else round(min(zeta_sd, 0.5) * min(new.zetas), 3),
    )


def _listed(zetas: tuple[float, ...]) -> str:
    return " and ".join(f"{zeta:g}" for zeta in zetas)


def _settings(settings: ModelSettings, parameters: Sequence[FreeParameter], fit: ElectronicFit) -> ModelSettings:
    sds = dict(settings.sd)
    for place, parameter in enumerate(parameters):
        if parameter.kind == "constant":
            sds[parameter.key] = round(float(np.sqrt(fit.covariance[place, place])), DIGITS["constant"])
    return replace(settings, sd=sds)
