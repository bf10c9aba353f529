"""Which of the equivalent axis systems of a group is used."""

from __future__ import annotations

from itertools import permutations, product
from typing import Final

import numpy as np

from ehmo.records.arrays import FloatArray

_TIED: Final = 1e-3
"""Directions whose cosines with the preferred one differ by less are tied; the first wins."""


def settled_axes(name: str, axes: FloatArray, vectors_A: FloatArray, preferred: FloatArray | None) -> FloatArray:
    """The axes, among those in which the group keeps its setting, that lie nearest to preferred ones.

    z goes first: as near to the preferred z as the group allows. Then x, as near to the preferred x. Where no
    axes are preferred, those of the coordinates are, except that in C_nv, D_n and D_nh with n > 2 the x axis is
    laid towards atoms rather than between them.

    Parameters
    ----------
    name : str
        Schoenflies symbol.
    axes : (3, 3) ndarray
        Rows are the x, y, z of the group in some setting.
    vectors_A : (n, 3) ndarray
        Positions from the fixed point [angstrom].
    preferred : (3, 3) ndarray or None
        Rows are the preferred x, y, z.

    Returns
    -------
    axes : (3, 3) ndarray
        Right-handed.
    """
    wanted = np.eye(3) if preferred is None else preferred
    if name in ("C1", "Ci"):
        return wanted
    if name in ("Td", "Oh", "D2", "D2h"):
        return _nearest(_CUBE_TURNS @ axes, wanted)
    if name[0] == "S" or name == "Cs" or name[1] == "∞" or (name[0] == "C" and name[2:] in ("", "h")):
        return _with_free_x(axes[2], wanted)
    fold = int(name[1])
    steps = np.arange(2 * fold)
    if preferred is None and fold > 2 and name[2:] != "d":
        steps = steps[(steps % 2) == _towards_atoms(vectors_A @ axes.T, fold)]
    angles = steps * np.pi / fold
    turns = np.zeros((len(steps), 3, 3))
    turns[:, 0, 0] = turns[:, 1, 1] = np.cos(angles)
    turns[:, 0, 1], turns[:, 1, 0] = np.sin(angles), -np.sin(angles)
    turns[:, 2, 2] = 1.0
    return _nearest(np.concatenate([turns, np.diag([1.0, -1.0, -1.0]) @ turns]) @ axes, wanted)


def _nearest(choices: FloatArray, wanted: FloatArray) -> FloatArray:
    """Of several axis systems: largest z with the wanted z, then x with the wanted x, then y with y."""
    left = np.arange(len(choices))
    for row in (2, 0, 1):
        cosines = choices[left, row] @ wanted[row]
        left = left[cosines > cosines.max() - _TIED]
    chosen: FloatArray = choices[left[0]]
    return chosen


def _with_free_x(z: FloatArray, wanted: FloatArray) -> FloatArray:
    z = z if z @ wanted[2] >= 0 else -z
    guide = wanted[0] if abs(z @ wanted[0]) < 1 - _TIED else wanted[1]
    x = guide - (guide @ z) * z
    x /= np.linalg.norm(x)
    return np.array([x, np.cross(z, x), z])


def _towards_atoms(vectors: FloatArray, fold: int) -> int:
    """0 if x runs towards atoms, 1 if the axis half a step further does."""
    azimuth = np.arctan2(vectors[:, 1], vectors[:, 0])
    return int(np.hypot(vectors[:, 0], vectors[:, 1]) @ np.cos(fold * azimuth) < -_TIED)


def _cube_turns() -> FloatArray:
    matrices = np.array(
        [
            np.diag(signs) @ np.eye(3)[list(order)]
            for order in permutations(range(3))
            for signs in product((1.0, -1.0), repeat=3)
        ]
    )
    turns: FloatArray = matrices[np.linalg.det(matrices) > 0]
    return turns


_CUBE_TURNS: Final = _cube_turns()
