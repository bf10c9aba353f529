"""Crystal momenta, Bloch sums and lattice bonds: what the boxes hand to one another for a crystal."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray, IntArray, frozen_floats, frozen_ints

ComplexArray = NDArray[np.complex128]
MatrixArray = NDArray[Any]
"""Real where k and -k are the same point, else complex."""

_BATCH_ELEMENTS = 1 << 17
"""Matrix elements that are summed at once: a few small matrices, or one large one."""


class BlochSum(Protocol):
    """Anything that gives M(k) = sum_T exp(2 pi i k.T) M(T) for one k after the other."""

    def sums(self, points: FloatArray) -> Iterator[MatrixArray]:
        """Hermitian matrices at fractional k-points, in column-major order; real where 2 k is a lattice vector."""


@dataclass(frozen=True, slots=True, eq=False)
class KMesh:
    """Mesh of k-points that contains the zone centre, reduced by time reversal.

    Attributes
    ----------
    counts : tuple of int
        Points along each reciprocal vector.
    points : (n_k, 3) ndarray
        Fractional coordinates in the reciprocal vectors, one of each pair k, -k.
    weights : (n_k,) ndarray
        Part of the mesh that each point stands for; they add up to 1.

    References
    ----------
    .. [1] monkhorst-1976: H. J. Monkhorst, J. D. Pack, Phys. Rev. B 13, 5188 (1976).
    """

    counts: tuple[int, int, int]
    points: FloatArray
    weights: FloatArray

    def __post_init__(self) -> None:
        n_k = len(self.points)
        object.__setattr__(self, "points", frozen_floats(self.points, (n_k, 3), "points"))
        object.__setattr__(self, "weights", frozen_floats(self.weights, (n_k,), "weights"))

    def __len__(self) -> int:
        return len(self.points)

    def __str__(self) -> str:
        return " x ".join(map(str, self.counts))


def k_mesh(counts: tuple[int, int, int]) -> KMesh:
    """Mesh k = j/N with j = 0 .. N-1 along each reciprocal vector; one point of each pair k, -k.

    Parameters
    ----------
    counts : tuple of int
        N along each reciprocal vector.

    Returns
    -------
    mesh : KMesh

    Raises
    ------
    InputError
        If a count is not positive.
    """
    if len(counts) != 3 or min(counts) < 1:
        raise InputError(f"the mesh {counts} is no mesh", mend="give three positive numbers such as 4,4,4")
    sizes = np.array(counts)
    steps = np.stack(np.meshgrid(*map(np.arange, counts), indexing="ij"), axis=-1).reshape(-1, 3)
    own = np.ravel_multi_index(tuple(steps.T), counts)
    mirrored = np.ravel_multi_index(tuple((-steps % sizes).T), counts)
    kept = own <= mirrored
    steps, weights = steps[kept], np.where(own == mirrored, 1.0, 2.0)[kept] / sizes.prod()
    centred = np.where(2 * steps > sizes, steps - sizes, steps)
    return KMesh((int(sizes[0]), int(sizes[1]), int(sizes[2])), centred / sizes, weights)


def is_real_point(point: FloatArray) -> bool:
    """Whether k and -k are the same point, so that Bloch sums of real functions are real."""
    return bool(np.abs(2 * point - np.round(2 * point)).max() < 1e-12)


@dataclass(frozen=True, slots=True, eq=False)
class BlochSeries:
    """Real matrices whose sums with cosines and sines give M(k) = constant + sum_t even cos + i odd sin.

    Attributes
    ----------
    translations : (n_t, 3) ndarray of int
        Lattice translations t of the terms, in cell vectors.
    even, odd : (n_t, n, n) ndarray
        Symmetric and antisymmetric matrices that go with cos(2 pi k.t) and sin(2 pi k.t).
    constant : float
        On the diagonal for every k.
    """

    translations: IntArray
    even: FloatArray
    odd: FloatArray
    constant: float

    def __post_init__(self) -> None:
        n_t, n, _ = self.even.shape
        object.__setattr__(self, "translations", frozen_ints(self.translations, (n_t, 3), "translations"))
        object.__setattr__(self, "even", frozen_floats(self.even, (n_t, n, n), "even"))
        object.__setattr__(self, "odd", frozen_floats(self.odd, (n_t, n, n), "odd"))

    def sums(self, points: FloatArray) -> Iterator[MatrixArray]:
        """M(k) at fractional k-points; see `BlochSum`."""
        n_t, n, _ = self.even.shape
        batch = max(1, _BATCH_ELEMENTS // (n * n))
        even, odd = self.even.reshape(n_t, n * n), self.odd.reshape(n_t, n * n)
        for start in range(0, len(points), batch):
            some = points[start : start + batch]
            phases = 2 * np.pi * (some @ self.translations.T)
            cosines, sines = np.cos(phases) @ even, np.sin(phases) @ odd
            for k, point in enumerate(some):
                yield hermitian(cosines[k].reshape(n, n), sines[k].reshape(n, n), self.constant, is_real_point(point))


def hermitian(even: FloatArray, odd: FloatArray, constant: float, real: bool) -> MatrixArray:
    """Column-major matrix even + i odd + constant on the diagonal; without its imaginary part where that vanishes.

    Parameters
    ----------
    even, odd : (n, n) ndarray
        Symmetric and antisymmetric.
    constant : float
        Added to the diagonal.
    real : bool
        Whether the imaginary part is zero but for rounding.

    Returns
    -------
    matrix : (n, n) ndarray
    """
    if real:
        matrix: MatrixArray = even.copy()
    else:
        matrix = np.empty(even.shape, dtype=np.complex128)
        # Row-major even - i odd, transposed: the solver then reads it without a copy.
        matrix.real = even
        np.negative(odd, out=matrix.imag)
    matrix.flat[:: len(matrix) + 1] += constant
    return matrix.T


@dataclass(frozen=True, slots=True)
class LatticeBond:
    """Bond from a metal in the home cell to a donor in some cell.

    Attributes
    ----------
    metal, donor : int
        Atom indices within the cell.
    translation : tuple of int
        Cell of the donor, in cell vectors.
    kind : str
        Kind of the donor, empty if not told.
    multiplicity : int
        Bonds of the cell that this one stands for.
    """

    metal: int
    donor: int
    translation: tuple[int, int, int]
    kind: str = ""
    multiplicity: int = 1
