"""Where labels and levels go so that none covers another."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ehmo.records.arrays import FloatArray


def spread_out(wanted: Sequence[float], sizes: Sequence[float], low: float, high: float) -> FloatArray:
    """Centres of labels along a line, as near as possible to where they are wanted, without overlap.

    Parameters
    ----------
    wanted : sequence of float
        Ascending.
    sizes : sequence of float
        Extent of each label along the line.
    low, high : float
        Ends of the line.

    Returns
    -------
    centres : (n,) ndarray
        In the same order; the sum of squared displacements is the least possible.

    Raises
    ------
    ValueError
        If the labels do not fit between the ends.

    Notes
    -----
    With the extents taken off, neighbours only have to keep their order: isotonic regression.
    """
    from scipy.optimize import isotonic_regression

    extents = np.asarray(sizes, dtype=np.float64)
    if extents.sum() > high - low + 1e-9:
        raise ValueError(f"labels of {extents.sum():g} do not fit into {high - low:g}")
    if not len(extents):
        return np.empty(0)
    before = np.concatenate([[0.0], np.cumsum((extents[1:] + extents[:-1]) / 2)])
    kept = isotonic_regression(np.asarray(wanted, dtype=np.float64) - before).x
    first, last = low + extents[0] / 2, high - extents[-1] / 2 - before[-1]
    centres: FloatArray = np.clip(kept, first, max(first, last)) + before
    return centres


def side_by_side(
    heights: Sequence[float], widths: Sequence[float], clearance: float, step: float, limit: float
) -> FloatArray:
    """Horizontal places of levels such that those at nearly one height stand side by side, round the middle.

    Parameters
    ----------
    heights : sequence of float
        Where each level stands.
    widths : sequence of float
        Width of each level with the gap to the next.
    clearance : float
        Levels closer in height than this must not overlap sideways.
    step : float
        Places tried lie so far apart.
    limit : float
        Largest distance of a level's edge from the middle.

    Returns
    -------
    centres : (n,) ndarray
        Distance of each level's centre from the middle; NaN for one that has no room.
    """
    order = np.argsort(heights, kind="stable")
    centres = np.full(len(heights), np.nan)
    placed: list[int] = []
    for k in order:
        near = [j for j in placed if abs(heights[j] - heights[k]) < clearance]
        for place in _outwards(step, limit - widths[k] / 2):
            if all(abs(place - centres[j]) >= (widths[j] + widths[k]) / 2 - 1e-9 for j in near):
                centres[k] = place
                placed.append(int(k))
                break
    return centres


def _outwards(step: float, limit: float) -> list[float]:
    count = int(limit / step + 1e-9)
    return [0.0, *(sign * step * k for k in range(1, count + 1) for sign in (-1, 1))]
