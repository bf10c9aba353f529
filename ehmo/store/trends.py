"""Bond order against length: a line that outliers do not turn."""

from __future__ import annotations

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.records.store_summary import Trend

LEAST_SPREAD_A = 0.01
"""Lengths whose outer thirds lie closer than this give no slope [angstrom]."""

_POLISHES = 5


def resistant_line(lengths_A: FloatArray, orders: FloatArray) -> Trend:
    """Line through the medians of the outer thirds, polished on its residuals (Tukey's resistant line).

    Parameters
    ----------
    lengths_A : (n,) ndarray
        At least one, finite [angstrom].
    orders : (n,) ndarray
        Finite.

    Returns
    -------
    trend : Trend
        With a slope of zero where the lengths are too few or too much alike to tell one.

    References
    ----------
    tukey-1977

    Examples
    --------
    >>> resistant_line(np.array([1.5, 1.6, 1.7, 1.8, 1.9, 2.0]), np.array([2.5, 2.3, 2.1, 1.9, 9.9, 1.5]))
    Trend(slope_per_A=-2.0, length_A=1.75, order=2.0)
    """
    order = np.argsort(lengths_A, kind="stable")
    x, y = lengths_A[order], orders[order]
    third = len(x) // 3
    centre, slope = float(np.median(x)), 0.0
    left, right = slice(0, third), slice(len(x) - third, None)
    width = float(np.median(x[right]) - np.median(x[left])) if third else 0.0
    if width >= LEAST_SPREAD_A:
        for _ in range(_POLISHES):
            rest = y - slope * (x - centre)
            slope += float(np.median(rest[right]) - np.median(rest[left])) / width
    level = float(np.median(y - slope * (x - centre)))
    return Trend(round(slope, 6), round(centre, 6), round(level, 6))
