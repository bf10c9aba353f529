"""How well atoms follow a group: assignment of the images, symmetrised positions, axes at their best."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.symmetry import PointGroup

_MAX_TURNS: Final = 20
_SETTLED: Final = 1e-11
_EXACT_A: Final = 1e-7


@dataclass(frozen=True, slots=True, eq=False)
class GroupFit:
    """Atoms beside their symmetrised positions.

    Attributes
    ----------
    group : PointGroup
    axes : (3, 3) ndarray
        Rows are the x, y, z of the group.
    permutations : (n_ops, n) ndarray of int
        Place that each atom goes to under each operation.
    symmetrised_A : (n, 3) ndarray
        Positions from the fixed point in the axes of the group [angstrom].
    squared_A2 : float
        Sum of squared distances from them [angstrom^2].
    """

    group: PointGroup
    axes: FloatArray
    permutations: IntArray
    symmetrised_A: FloatArray
    squared_A2: float


def fit_group(group: PointGroup, vectors_A: FloatArray, colours: IntArray, axes: FloatArray) -> GroupFit | None:
    """Nearest positions that have a group, with its axes started from a guess and turned to their best.

    The mean of the images taken back by the group is the nearest symmetric arrangement for given axes, a
    superposition on it gives better axes; both steps lower the sum of squared distances.

    Parameters
    ----------
    group : PointGroup
    vectors_A : (n, 3) ndarray
        Positions from the fixed point [angstrom].
    colours : (n,) ndarray of int
        Only atoms of one colour may be exchanged.
    axes : (3, 3) ndarray
        Guess; rows are x, y, z.

    Returns
    -------
    fit : GroupFit or None
        None if the images of two atoms fall nearest to the same atom.

    References
    ----------
    .. [1] zabrodsky-1992: H. Zabrodsky, S. Peleg, D. Avnir, J. Am. Chem. Soc. 114, 7843 (1992).
    .. [2] kabsch-1976: W. Kabsch, Acta Crystallogr., Sect. A 32, 922 (1976).
    """
    turned = vectors_A @ axes.T
    nearest, _ = nearest_atoms(group.operations, turned, colours)
    if not are_permutations(nearest).all():
        return None
    # Row n of the gathered images, times the stacked operations, sums R^-1 x over the group.
    stacked = group.operations.reshape(-1, 3) / len(group)
    target = turned
    for _ in range(_MAX_TURNS):
        target = turned[nearest].transpose(1, 0, 2).reshape(len(turned), -1) @ stacked
        turn = superposition(turned, target)
        turned = turned @ turn.T
        axes = turn @ axes
        if np.abs(turn - np.eye(3)).max() < _SETTLED:
            break
    images = target @ group.operations.swapaxes(1, 2)
    if np.abs(images - target[nearest]).max() > _EXACT_A:
        return None  # the permutations are no representation of the group
    return GroupFit(group, axes, nearest, target, float(((turned - target) ** 2).sum()))


def nearest_atoms(operations: FloatArray, vectors: FloatArray, colours: IntArray) -> tuple[IntArray, FloatArray]:
    """Atom of the same colour nearest to each image.

    Parameters
    ----------
    operations : (n_ops, 3, 3) ndarray
    vectors : (n, 3) ndarray
    colours : (n,) ndarray of int

    Returns
    -------
    nearest : (n_ops, n) ndarray of int
        If a row is a permutation, it is the best possible assignment, since every distance is the least.
    squared : (n_ops, n) ndarray
        Squared distances.
    """
    images = vectors @ operations.swapaxes(1, 2)
    lengths = (vectors**2).sum(axis=1)
    foreign = np.where(colours[:, None] == colours, 0.0, np.inf)
    distances = lengths[:, None] + lengths - 2 * images @ vectors.T + foreign
    nearest = distances.argmin(axis=2)
    squared = np.take_along_axis(distances, nearest[:, :, None], axis=2)[:, :, 0]
    return nearest, np.maximum(squared, 0.0)


def are_permutations(rows: IntArray) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    """Whether each row names every place once."""
    found: np.ndarray[tuple[int], np.dtype[np.bool_]] = (np.sort(rows, axis=1) == np.arange(rows.shape[1])).all(axis=1)
    return found


def superposition(vectors: FloatArray, targets: FloatArray) -> FloatArray:
    """Rotation R that makes the sum of |R v - t|^2 least; see `fit_group` for the source."""
    left, _, right = np.linalg.svd(vectors.T @ targets)
    left[:, 2] *= np.sign(np.linalg.det(left) * np.linalg.det(right))
    rotation: FloatArray = (left @ right).T
    return rotation
