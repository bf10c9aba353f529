"""From the values of the free parameters to a parameter table."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from basis_params import ElementParameters, ParameterTable
from ehmo.records.arrays import FloatArray
from ehmo.records.calibration import FreeParameter


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
        Parameters that move one shell add up.
    """
    settings, change, factor = base.settings, _by_shell(parameters, values, "h_ii"), _by_shell(parameters, values, "zeta")
    for parameter, value in zip(parameters, values.tolist(), strict=True):
        if parameter.kind == "constant":
            settings = replace(settings, **{"lambda_" if parameter.key == "lambda" else parameter.key: value})
    elements = dict(base.elements)
    for symbol in {symbol for symbol, _, _ in (*change, *factor)}:
        element = elements[symbol]
        shells = tuple(
            replace(
                shell,
                h_ii_eV=shell.h_ii_eV + change.get((symbol, shell.n, shell.l), 0.0),
                zetas=tuple(zeta * float(np.exp(factor.get((symbol, shell.n, shell.l), 0.0))) for zeta in shell.zetas),
            )
            for shell in element.shells
        )
        elements[symbol] = ElementParameters(symbol, element.valence_electrons, shells)
    return ParameterTable(base.name, base.edition, settings, elements)


def _by_shell(
    parameters: Sequence[FreeParameter], values: FloatArray, kind: str
) -> dict[tuple[str, int, int], float]:
    total: dict[tuple[str, int, int], float] = {}
    for parameter, value in zip(parameters, values.tolist(), strict=True):
        if parameter.kind == kind:
            for shell in parameter.shells:
                total[shell] = total.get(shell, 0.0) + value
    return total
