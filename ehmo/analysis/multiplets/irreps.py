"""Functions of an open shell sorted by the irreps of a group."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from ehmo.analysis.multiplets.determinants import fermion_space
from ehmo.analysis.multiplets.spin_adapted import SpinSpace
from ehmo.harmonics import harmonic_rotations
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.symmetry import PointGroup

MOMENTUM_LETTERS = "SPDFGHIKLMNOQ"
"""Letters of L = 0, 1, 2, .."""

_TIE_BREAK = 1e-3  # per irrep [cm^-1]: parts irreps that meet by accident, far below any energy that matters


@dataclass(frozen=True, slots=True, eq=False)
class SortedBasis:
    """Orthonormal functions, irrep by irrep.

    Attributes
    ----------
    irreps : tuple of str
        Those that occur.
    dimensions, counts : (n,) ndarray of int
        Dimension of each, and the number of its functions here.
    functions : (size, size) ndarray
        Columns, in the order of `irreps`.
    tie_breaker : (size, size) ndarray
        Small operator with a value of its own for each irrep [cm^-1].
    """

    irreps: tuple[str, ...]
    dimensions: IntArray
    counts: IntArray
    functions: FloatArray
    tie_breaker: FloatArray

    def solve(self, matrix: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Eigenvalues, eigenvectors and the shares of the irreps in each.

        Parameters
        ----------
        matrix : (..., size, size) ndarray
            Symmetric, one or a stack [cm^-1].

        Returns
        -------
        values : (..., size) ndarray
            Ascending up to the tie breaker.
        vectors : (..., size, size) ndarray
            Columns. Where the matrix has the symmetry each belongs to one irrep, also in a level in which
            several irreps meet by accident.
        shares : (..., n_irreps, size) ndarray
            Columns add up to 1.
        """
        values, vectors = np.linalg.eigh(matrix + self.tie_breaker)
        starts = np.concatenate([[0], np.cumsum(self.counts)[:-1]])
        shares = np.add.reduceat((self.functions.T @ vectors) ** 2, starts, axis=-2)
        return values - _TIE_BREAK * np.arange(len(starts)) @ shares, vectors, shares


def sorted_basis(irreps: tuple[str, ...], dimensions: IntArray, projectors: FloatArray) -> SortedBasis:
    """Basis from the projectors on each irrep.

    Parameters
    ----------
    irreps : tuple of str
    dimensions : (n_irreps,) ndarray of int
    projectors : (n_irreps, size, size) ndarray
        They add up to the unit matrix; those of irreps that do not occur vanish.

    Returns
    -------
    basis : SortedBasis
    """
    traces = np.rint(np.trace(projectors, axis1=1, axis2=2)).astype(np.intp)
    found = np.flatnonzero(traces)
    ranks = np.arange(len(found), dtype=np.float64)
    mixed = np.tensordot(ranks, projectors[found], axes=1)
    _, functions = np.linalg.eigh((mixed + mixed.T) / 2)
    kept = tuple(irreps[k] for k in found)
    return SortedBasis(kept, dimensions[found], traces[found], functions, _TIE_BREAK * mixed)


def momentum_basis(space: SpinSpace) -> SortedBasis:
    """Basis of a free ion, sorted by L."""
    momenta = np.unique(space.momenta)
    projectors = np.array([np.diag((space.momenta == momentum).astype(np.float64)) for momentum in momenta])
    return sorted_basis(tuple(MOMENTUM_LETTERS[momentum] for momentum in momenta), 2 * momenta + 1, projectors)


@lru_cache(maxsize=128)
def orbital_basis(group: PointGroup, l: int) -> SortedBasis:
    """Basis of one shell in the axes of the group, small letters."""
    matrices = harmonic_rotations(group.operations, l)
    return sorted_basis(group.irreps, group.dimensions, _projectors(group, matrices.reshape(len(matrices), -1)))


@lru_cache(maxsize=256)
def term_basis(group: PointGroup, space: SpinSpace) -> SortedBasis:
    """Basis of all functions of one spin in the axes of the group, capitals."""
    turned = harmonic_rotations(group.operations, space.l)
    alpha, beta = minors(turned, space.n_alpha), minors(turned, space.n_beta)
    # A product of strings turns with the product of the minors; summing over operations first keeps this small.
    combined = group.projection_weights @ np.einsum("gab,gcd->gacbd", alpha, beta).reshape(len(turned), -1)
    size = alpha.shape[1] * beta.shape[1]
    projectors = space.vectors.T @ combined.reshape(-1, size, size) @ space.vectors
    return sorted_basis(group.term_irreps, group.dimensions, projectors)


def minors(matrices: FloatArray, order: int) -> FloatArray:
    """Matrices of one-electron transformations among determinants of several electrons of one spin.

    Parameters
    ----------
    matrices : (..., n, n) ndarray
    order : int
        Number of electrons.

    Returns
    -------
    compounds : (..., n_strings, n_strings) ndarray
        Determinants of all square parts, in the order of `fermion_space`.
    """
    occupied = fermion_space(matrices.shape[-1], order).strings
    strings = np.array(occupied, dtype=np.intp).reshape(len(occupied), order)
    parts = matrices[..., strings[:, None, :, None], strings[None, :, None, :]]
    compounds: FloatArray = np.linalg.det(parts)
    return compounds


def _projectors(group: PointGroup, matrices: FloatArray) -> FloatArray:
    """Projectors from flattened matrices of the operations."""
    size = round(matrices.shape[1] ** 0.5)
    return (group.projection_weights @ matrices).reshape(-1, size, size)


def irrep_of_states(shares: FloatArray, counts: IntArray) -> IntArray:
    """Irrep of each state, such that every irrep gets as many states as it has functions.

    Parameters
    ----------
    shares : (n_irreps, n_states) ndarray
    counts : (n_irreps,) ndarray of int

    Returns
    -------
    irreps : (n_states,) ndarray of int

    Notes
    -----
    The largest share is taken wherever the numbers allow it; in a strongly distorted field the rest goes, by
    falling share, to irreps that still lack states.
    """
    largest: IntArray = shares.argmax(axis=0)
    if np.array_equal(np.bincount(largest, minlength=len(counts)), counts):
        return largest
    left = counts.copy()
    irreps = np.full(shares.shape[1], -1, dtype=np.intp)
    for place in np.argsort(-shares, axis=None, kind="stable"):
        irrep, state = divmod(int(place), shares.shape[1])
        if irreps[state] < 0 and left[irrep]:
            irreps[state] = irrep
            left[irrep] -= 1
    return irreps


def component_sets(irreps: IntArray, dimensions: IntArray) -> tuple[IntArray, IntArray]:
    """States in the order of the sets they form.

    Parameters
    ----------
    irreps : (n_states,) ndarray of int
        Irrep of each state, energies ascending.
    dimensions : (n_irreps,) ndarray of int

    Returns
    -------
    order : (n_states,) ndarray of int
        States, set after set: the lowest `dimension` states of an irrep are its first set, and so on.
    starts : (n_sets,) ndarray of int
        Where each set begins in `order`.
    """
    order = np.argsort(irreps, kind="stable")
    sizes = dimensions[irreps[order]]
    counts = np.bincount(irreps, minlength=len(dimensions))
    within = np.arange(len(order)) - np.repeat(np.cumsum(counts) - counts, counts)
    return order, np.flatnonzero(within % sizes == 0)
