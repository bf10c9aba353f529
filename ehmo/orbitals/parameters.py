"""Parameter sets at the door: faults of basis_params become errors of ehmo."""

from __future__ import annotations

from collections.abc import Iterable

import basis_params
from basis_params import ElementParameters, MissingElementError, ParameterTable
from ehmo.errors import ParameterError

AUTOMATIC = "auto"
"""In place of a set: the first of `CALIBRATED_SETS` that has every element, else `standard`."""

CALIBRATED_SETS: tuple[str, ...] = ("oxo",)
"""Sets that are preferred where they have every element."""

STANDARD = "standard"


def parameters_for(params: str | ParameterTable, symbols: Iterable[str]) -> ParameterTable:
    """Parameter set for some elements.

    Parameters
    ----------
    params : str or ParameterTable
        A table, or as for `load_parameters`, or "auto".
    symbols : iterable of str
        Elements of the fragment.

    Returns
    -------
    table : ParameterTable

    Raises
    ------
    ParameterError
        See `load_parameters`.
    """
    if isinstance(params, ParameterTable):
        return params
    if params != AUTOMATIC:
        return load_parameters(params)
    wanted = set(symbols)
    for name in CALIBRATED_SETS:
        table = load_parameters(name)
        if wanted <= set(table.elements):
            return table
    return load_parameters(STANDARD)


def spin_parameters(table: ParameterTable) -> ParameterTable:
    """Set whose ladder decides an open spin: `standard` in place of a shipped calibrated set.

    The pairing energies that the ladder is held against were chosen for ladders of the literature parameters; those of
    a set that is fitted to bands are narrower.
    """
    shipped = table.origin == "built in" and table.name in basis_params.available_sets() and table.repulsion
    return load_parameters(STANDARD) if shipped else table


def load_parameters(name_or_path: str) -> ParameterTable:
    """Shipped set by name, or table file.

    Parameters
    ----------
    name_or_path : str
        Name of a shipped set, else a path.

    Returns
    -------
    table : ParameterTable

    Raises
    ------
    ParameterError
        If there is no such set or file, or if the file has faults; all of them are named with their lines.
    """
    try:
        return basis_params.load(name_or_path)
    except (ValueError, OSError) as fault:
        raise ParameterError(str(fault)) from fault


def element_parameters(table: ParameterTable, symbol: str) -> ElementParameters:
    """Parameters of one element.

    Raises
    ------
    ParameterError
        If the set lacks it.
    """
    try:
        return table.element(symbol)
    except MissingElementError as missing:
        raise ParameterError(str(missing)) from None
