"""Directions that may be axes or normals of mirror planes, and which operations they carry."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations
from typing import Final

import numpy as np

from ehmo.analysis.symmetry.fitting import are_permutations, nearest_atoms
from ehmo.analysis.symmetry.groups import HIGHEST_ORDER
from ehmo.records.arrays import FloatArray, IntArray

_SHORTEST: Final = 0.05
_ALIKE_A: Final = 0.35
"""Two directions count as one if the outermost atom does not move further between them [angstrom]."""
_WIDEST_ALIKE: Final = 0.17
_MAX_CROSSED: Final = 12
_LARGE_CLASS: Final = 24
_ENOUGH_DIRECTIONS: Final = 1500
_ENOUGH_TO_RULE_OUT: Final = 8
_LARGEST_TABLE: Final = 1_000_000

PROPER: Final = tuple(range(2, HIGHEST_ORDER + 1))
IMPROPER: Final = (1, 4, 6, 8, 10, 12)
"""Orders of S_n that are tried; S1 is the mirror, S3 and S5 follow from rotation and mirror."""


@dataclass(frozen=True, slots=True, eq=False)
class Elements:
    """Residual of the operations about each candidate direction; infinite where the atoms do not allow one.

    Attributes
    ----------
    directions : (n, 3) ndarray
        Unit vectors.
    proper : dict of int to (n,) ndarray
        Root mean square distance under C_n [angstrom].
    improper : dict of int to (n,) ndarray
        Under S_n; S_1 is the mirror plane normal to the direction [angstrom].
    inversion : float
        Under inversion [angstrom].
    """

    directions: FloatArray
    proper: dict[int, FloatArray]
    improper: dict[int, FloatArray]
    inversion: float


def symmetry_elements(vectors_A: FloatArray, colours: IntArray, largest_A: float) -> Elements:
    """Residuals of all operations about all candidate directions.

    Parameters
    ----------
    vectors_A : (n, 3) ndarray
        Positions from the fixed point [angstrom].
    colours : (n,) ndarray of int
        Only atoms of one colour may be exchanged.
    largest_A : float
        Operations with a larger residual are of no interest [angstrom].

    Returns
    -------
    elements : Elements
    """
    directions = candidate_directions(vectors_A, colours)
    turns = [(n, 1.0) for n in PROPER] + [(n, -1.0) for n in IMPROPER]
    residuals = np.full((len(turns), len(directions)), np.inf)
    few = _smallest_classes(colours)
    # A few atoms rule out most operations of a large molecule.
    within = largest_A * np.sqrt(len(colours) / len(few))
    for row, (order, sign) in zip(residuals, turns, strict=True):
        operations = _operations(directions, order, sign)
        left = np.flatnonzero(_residuals(operations, vectors_A[few], colours[few]) < within)
        row[left] = _residuals(operations[left], vectors_A, colours)
    proper = dict(zip(PROPER, residuals, strict=False))
    improper = dict(zip(IMPROPER, residuals[len(PROPER) :], strict=True))
    return Elements(directions, proper, improper, float(_residuals(-np.eye(3)[None], vectors_A, colours)[0]))


def _smallest_classes(colours: IntArray) -> IntArray:
    """Whole classes of atoms, the smallest first, until there are enough to rule out most operations."""
    _, inverse, sizes = np.unique(colours, return_inverse=True, return_counts=True)
    order = np.argsort(sizes, kind="stable")
    rank = np.argsort(order)
    taken = 1 + np.searchsorted(np.cumsum(sizes[order]), _ENOUGH_TO_RULE_OUT)
    return np.flatnonzero(rank[inverse] < taken)


def _operations(axes: FloatArray, order: int, along: float) -> FloatArray:
    """Rotations by 360/order degrees about axes, the component along the axis times +1 or -1."""
    angle = 2 * np.pi / order
    outer = axes[:, :, None] * axes[:, None, :]
    cross = np.cross(axes[:, None, :], np.eye(3))
    matrices: FloatArray = along * outer + np.cos(angle) * (np.eye(3) - outer) + np.sin(angle) * cross.swapaxes(1, 2)
    return matrices


def _residuals(operations: FloatArray, vectors: FloatArray, colours: IntArray) -> FloatArray:
    """Root mean square distances, taken in portions that keep the table of distances small."""
    residuals = np.empty(len(operations))
    portion = max(1, _LARGEST_TABLE // len(vectors) ** 2)
    for start in range(0, len(operations), portion):
        part = slice(start, start + portion)
        nearest, squared = nearest_atoms(operations[part], vectors, colours)
        residuals[part] = np.where(are_permutations(nearest), np.sqrt(squared.mean(axis=1)), np.inf)
    return residuals


def candidate_directions(vectors_A: FloatArray, colours: IntArray) -> FloatArray:
    """Unit vectors among which every axis and every normal of a mirror plane is found.

    An axis runs through an atom, along the sum of two atoms it exchanges, or normal to the plane of three it
    moves round; the normal of a mirror plane runs along the difference of two atoms or across two in the plane.

    Parameters
    ----------
    vectors_A : (n, 3) ndarray
        Positions from the fixed point [angstrom].
    colours : (n,) ndarray of int

    Returns
    -------
    directions : (n_directions, 3) ndarray
        Each kept once, whatever its sign.
    """
    lengths = np.linalg.norm(vectors_A, axis=1)
    outer = np.flatnonzero(lengths > _SHORTEST)
    classes = sorted((outer[colours[outer] == colour] for colour in np.unique(colours[outer])), key=len)
    found = [vectors_A[outer]]
    count = len(outer)
    for members in classes:
        if count > _ENOUGH_DIRECTIONS:
            break
        points = vectors_A[members]
        # Every operation moves the first atom of a large class somewhere within it.
        first, second = np.triu_indices(len(points), 1) if len(points) <= _LARGE_CLASS else (0, np.arange(len(points)))
        found += [points[first] + points[second], points[first] - points[second]]
        found.append(_plane_normals(points[:_LARGE_CLASS]))
        count += sum(map(len, found[-3:]))
    some = vectors_A[np.concatenate(classes)[:_MAX_CROSSED]]
    first, second = np.triu_indices(len(some), 1)
    found.append(np.cross(some[first], some[second]))
    stacked = np.concatenate(found)
    norms = np.linalg.norm(stacked, axis=1)
    return _distinct(stacked[norms > _SHORTEST] / norms[norms > _SHORTEST, None], float(lengths.max()))


def _plane_normals(points: FloatArray) -> FloatArray:
    """Normals of the planes through three points, the first among them if there are many."""
    if len(points) < 3:
        return np.empty((0, 3))
    rows = combinations(range(len(points)), 3)
    triples = np.array([row for row in rows if len(points) <= _MAX_CROSSED or row[0] == 0])
    a, b, c = points[triples.T]
    return np.cross(b - a, c - a)


def _distinct(directions: FloatArray, radius_A: float) -> FloatArray:
    """Mean of each bundle of directions that lie close together, up to sign."""
    alike = min(_WIDEST_ALIKE, _ALIKE_A / radius_A)
    cosines = directions @ directions.T
    close = np.abs(cosines) > 1 - alike**2 / 2
    left = np.ones(len(directions), dtype=bool)
    bundles = []
    for k in range(len(directions)):
        if left[k]:
            members = np.flatnonzero(close[k] & left)
            left[members] = False
            mean = np.sign(cosines[k, members]) @ directions[members]
            bundles.append(mean / np.linalg.norm(mean))
    return np.array(bundles)
