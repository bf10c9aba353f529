"""Parameter sets at the door: faults of basis_params become errors of ehmo."""

from __future__ import annotations

import basis_params
from basis_params import ElementParameters, MissingElementError, ParameterTable
from ehmo.errors import ParameterError


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
