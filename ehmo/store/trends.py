"""Bond order against length: an exponential fall that outliers do not turn."""

from __future__ import annotations

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.records.store_summary import Trend

LEAST_SPREAD_A = 0.01
"""Lengths whose outer thirds lie closer than this give no slope [angstrom]."""

LEAST_ORDER = 0.02
"""Smaller orders, zero and negative ones have no useful logarithm and are left out of the line."""

_POLISHES = 5


def order_trend(lengths_A: FloatArray, orders: FloatArray) -> Trend | None:
    """Exponential fall of the order with length, as Pauling's relation between bond number and length has it.

    The logarithms of the orders are fitted by `resistant_line`.

    Parameters
    ----------
    lengths_A : (n,) ndarray
        Finite [angstrom].
    orders : (n,) ndarray
        Finite.

    Returns
    -------
    trend : Trend or None
        None if no order is above `LEAST_ORDER`.

    References
    ----------
    pauling-1947

    Examples
    --------
    >>> x = np.array([1.6, 1.7, 1.8, 1.9, 2.0, 2.1])
    >>> order_trend(x, 2.0 * np.exp(-(x - 1.6) / 0.4)).b_A
    0.4
    """
    usable = orders >= LEAST_ORDER
    if not usable.any():
        return None
    slope, centre, level = resistant_line(lengths_A[usable], np.log(orders[usable]))
    return Trend(round(slope, 6), round(centre, 6), round(float(np.exp(level)), 6))


def resistant_line(x: FloatArray, y: FloatArray) -> tuple[float, float, float]:
    """Line through the medians of the outer thirds, polished on its residuals (Tukey's resistant line).

    Parameters
    ----------
    x : (n,) ndarray
        At least one, finite; differences below `LEAST_SPREAD_A` give no slope.
    y : (n,) ndarray
        Finite.

    Returns
    -------
    slope : float
        Zero where x is too short or too much alike to tell one.
    centre : float
        Median of x.
    level : float
        Of the line at `centre`.

    References
    ----------
    tukey-1977

    Examples
    --------
    >>> y = 8.0 - 2.0 * np.arange(9.0)
    >>> y[7] = 9.9
    >>> slope, centre, level = resistant_line(np.arange(9.0), y)
    >>> round(slope, 2), centre, round(level, 2)
    (-2.0, 4.0, 0.0)
    """
    order = np.argsort(x, kind="stable")
    x, y = x[order], y[order]
    third = len(x) // 3
    centre, slope = float(np.median(x)), 0.0
    left, right = slice(0, third), slice(len(x) - third, None)
    width = float(np.median(x[right]) - np.median(x[left])) if third else 0.0
    if width >= LEAST_SPREAD_A:
        for _ in range(_POLISHES):
            rest = y - slope * (x - centre)
            slope += float(np.median(rest[right]) - np.median(rest[left])) / width
    return slope, centre, float(np.median(y - slope * (x - centre)))
