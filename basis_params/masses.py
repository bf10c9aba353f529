"""Atomic masses: standard weights and nuclides."""

from __future__ import annotations

from collections.abc import Mapping
from functools import cache

from basis_params.rows import side_table


@cache
def _masses() -> Mapping[tuple[str, int | None], float]:
    return {
        (row["symbol"], int(row["mass_number"]) if row["mass_number"] else None): float(row["mass_u"])
        for row in side_table("masses")
    }


def atomic_mass(symbol: str, mass_number: int | None = None) -> float:
    """Return the standard atomic weight of an element, or the mass of one nuclide [u].

    Raises
    ------
    KeyError
        If the table has no such element or nuclide.

    References
    ----------
    mendeleev

    Examples
    --------
    >>> atomic_mass("O"), round(atomic_mass("O", 18), 4)
    (15.999, 17.9992)
    """
    key = symbol, mass_number
    if key not in _masses():
        listed = ", ".join(str(number) for name, number in _masses() if name == symbol and number is not None)
        raise KeyError(f"no nuclide {symbol!a} {mass_number}: the table has {listed or 'no such element'}")
    return _masses()[key]
