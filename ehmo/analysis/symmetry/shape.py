"""Continuous shape measures of a coordination sphere against ideal polyhedra."""

from __future__ import annotations

from functools import cache
from itertools import permutations
from math import acos, cos, pi, sin, sqrt
from typing import Final

import numpy as np

from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.symmetry import ShapeMeasure

_TRIANGLE: Final = tuple(2 * pi * k / 3 for k in range(3))
_SQUARE: Final = tuple(pi * k / 2 for k in range(4))
_PENTAGON: Final = tuple(2 * pi * k / 5 for k in range(5))
_UPPER_TRIANGLE: Final = acos(sqrt(3 / 7))  # polar angle of a trigonal prism with square sides

# Polar angle and azimuth of each donor.
_DIRECTIONS: Final[dict[str, tuple[tuple[float, float], ...]]] = {
    "trigonal plane": tuple((pi / 2, phi) for phi in _TRIANGLE),
    "trigonal pyramid": tuple((acos(-1 / 3), phi) for phi in _TRIANGLE),
    "T shape": tuple((pi / 2, phi) for phi in _SQUARE[:3]),
    "tetrahedron": ((0.0, 0.0), *((acos(-1 / 3), phi) for phi in _TRIANGLE)),
    "square plane": tuple((pi / 2, phi) for phi in _SQUARE),
    "seesaw": ((0.0, 0.0), (pi, 0.0), *((pi / 2, phi) for phi in _TRIANGLE[:2])),
    "trigonal bipyramid": ((0.0, 0.0), (pi, 0.0), *((pi / 2, phi) for phi in _TRIANGLE)),
    "square pyramid": ((0.0, 0.0), *((acos(-1 / 4), phi) for phi in _SQUARE)),
    "square pyramid (flat base)": ((0.0, 0.0), *((pi / 2, phi) for phi in _SQUARE)),
    "octahedron": ((0.0, 0.0), (pi, 0.0), *((pi / 2, phi) for phi in _SQUARE)),
    "trigonal prism": tuple((theta, phi) for theta in (_UPPER_TRIANGLE, pi - _UPPER_TRIANGLE) for phi in _TRIANGLE),
    "pentagonal pyramid": ((0.0, 0.0), *((pi / 2, phi) for phi in _PENTAGON)),
    "pentagonal bipyramid": ((0.0, 0.0), (pi, 0.0), *((pi / 2, phi) for phi in _PENTAGON)),
}

SHAPES: Final[dict[int, tuple[str, ...]]] = {
    count: tuple(name for name, directions in _DIRECTIONS.items() if len(directions) == count)
    for count in sorted({len(directions) for directions in _DIRECTIONS.values()})
}
"""Ideal polyhedra by coordination number."""


def shape_measures(metal_A: FloatArray, donors_A: FloatArray) -> tuple[ShapeMeasure, ...]:
    """Distances of a metal and its donors from the ideal polyhedra of that coordination number.

    S = min 100 sum_k |q_k - p_k|^2 / sum_k |q_k - q_0|^2 over rotations, sizes and assignments of the ideal
    donors, where k runs over metal and donors and q_0 is their centre. The metal always meets the ideal centre.

    Parameters
    ----------
    metal_A : (3,) ndarray
        Position of the metal [angstrom].
    donors_A : (n, 3) ndarray
        Positions of the donors [angstrom].

    Returns
    -------
    measures : tuple of ShapeMeasure
        Nearest first; empty for coordination numbers without a polyhedron here.

    Notes
    -----
    All ideal donors lie on a sphere about the metal. "square pyramid" has apical-basal angles of arccos(-1/4) =
    104.5 degrees, so that the donors have their centre at the metal; with a flat base it is an octahedron less
    one donor. The trigonal prism has square sides; "trigonal pyramid" is a tetrahedron less one donor.

    References
    ----------
    .. [1] pinsky-1998: M. Pinsky, D. Avnir, Inorg. Chem. 37, 5575 (1998).
    """
    names = SHAPES.get(len(donors_A), ())
    centred = _centred(np.concatenate([[metal_A], donors_A])) if names else np.empty((0, 3))
    measures = [ShapeMeasure(name, _measure(centred, name)) for name in names]
    return tuple(sorted(measures, key=lambda measure: measure.measure))


def _measure(centred: FloatArray, name: str) -> float:
    ideal = ideal_shape(name)
    products = np.einsum("ni,pnj->pij", centred, ideal[_assignments(name)])
    singular = np.linalg.svd(products, compute_uv=False)
    # The largest trace over proper rotations; over sizes the fit leaves 1 - trace^2 / (|q|^2 |p|^2).
    singular[:, 2] *= np.sign(np.linalg.det(products))
    trace = singular.sum(axis=1).max()
    return float(max(0.0, 100 * (1 - trace**2 / ((centred**2).sum() * (ideal**2).sum()))))


@cache
def ideal_shape(name: str) -> FloatArray:
    """Metal and donors of an ideal polyhedron about their common centre.

    Parameters
    ----------
    name : str
        One of `SHAPES`.

    Returns
    -------
    points : (1 + n, 3) ndarray
        The metal first; donors at distance 1 from it.
    """
    donors = [(sin(theta) * cos(phi), sin(theta) * sin(phi), cos(theta)) for theta, phi in _DIRECTIONS[name]]
    points = _centred(np.array([(0.0, 0.0, 0.0), *donors]))
    points.setflags(write=False)
    return points


@cache
def _assignments(name: str) -> IntArray:
    """Orders of the ideal points that no rotation of the polyhedron turns into one another; the metal stays first."""
    points = ideal_shape(name)
    donors = len(points) - 1
    orders = np.array(list(permutations(range(donors))))
    turns = orders[_are_rotations(points, orders)]
    # An order followed by each turn names the same set of assignments: keep the first of each set.
    place = donors ** np.arange(donors)[::-1]
    sets = np.stack([turn[orders] @ place for turn in turns]).min(axis=0)
    kept = orders[np.sort(np.unique(sets, return_index=True)[1])]
    return np.concatenate([np.zeros((len(kept), 1), dtype=np.intp), kept + 1], axis=1)


def _are_rotations(points: FloatArray, orders: IntArray) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    """Which orders of the donors are proper rotations of the polyhedron."""
    vectors = points[1:] - points[0]
    cosines = vectors @ vectors.T
    rigid = (np.abs(cosines[orders[:, :, None], orders[:, None, :]] - cosines) < 1e-9).all(axis=(1, 2))
    products = np.einsum("ni,pnj->pij", vectors, vectors[orders[rigid]])
    # A rigid order is a proper rotation if the determinant is positive, or if all donors lie in one plane.
    planar = np.linalg.matrix_rank(vectors) < 3
    found = np.zeros(len(orders), dtype=bool)
    found[rigid] = planar | (np.linalg.det(products) > 0)
    return found


def _centred(points: FloatArray) -> FloatArray:
    centred: FloatArray = points - points.mean(axis=0)
    return centred
