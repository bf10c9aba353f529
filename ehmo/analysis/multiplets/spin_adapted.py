"""Functions of definite spin: the spin-free problem falls apart into one small matrix for each S."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np

from ehmo.analysis.multiplets.determinants import fermion_space, multipoles
from ehmo.analysis.multiplets.momentum import orbital_momentum
from ehmo.records.arrays import FloatArray, IntArray


@dataclass(frozen=True, slots=True, eq=False)
class SpinSpace:
    """All functions of a shell with one S, at M_S = S.

    Attributes
    ----------
    l, n_electrons : int
    two_s : int
        2S.
    n_alpha, n_beta : int
    momenta : (size,) ndarray of int
        L of each function, ascending.
    distinct_momenta : (values, starts)
        Values of L and the first function of each.
    vectors : (n_alpha_strings * n_beta_strings, size) ndarray
        Orthonormal columns, each of one S and one L, in products of an alpha and a beta string.
    generators : ((2l+1)**2, size**2) ndarray
        Row (i, j) is the matrix of E_ij = sum over spins of a†_i a_j.
    repulsion : (l, size, size) ndarray
        Repulsion per unit of F^2, F^4, (F^6).
    """

    l: int
    n_electrons: int
    two_s: int
    n_alpha: int
    n_beta: int
    momenta: IntArray
    distinct_momenta: tuple[IntArray, IntArray]
    vectors: FloatArray
    generators: FloatArray
    repulsion: FloatArray

    @property
    def size(self) -> int:
        """Number of functions."""
        return int(self.vectors.shape[1])

    def one_body(self, matrix: FloatArray) -> FloatArray:
        """Matrix of the spin-free operator sum_ij h_ij E_ij, h given as (2l+1, 2l+1)."""
        operator: FloatArray = (matrix.ravel() @ self.generators).reshape(self.size, self.size)
        return operator


@cache
def spin_spaces(l: int, n_electrons: int) -> tuple[SpinSpace, ...]:
    """Spaces of each S of a shell, highest spin first.

    Parameters
    ----------
    l, n_electrons : int

    Returns
    -------
    spaces : tuple of SpinSpace
    """
    n_orbitals = 2 * l + 1
    highest = min(n_electrons, 2 * n_orbitals - n_electrons)
    return tuple(_spin_space(l, n_electrons, two_s) for two_s in range(highest, -1, -2))


def _spin_space(l: int, n_electrons: int, two_s: int) -> SpinSpace:
    n_orbitals = 2 * l + 1
    n_alpha, n_beta = (n_electrons + two_s) // 2, (n_electrons - two_s) // 2
    alpha, beta = _replacements(n_orbitals, n_alpha), _replacements(n_orbitals, n_beta)
    # S- S+ = n_beta - sum_ij E^alpha_ji E^beta_ij vanishes on the functions with S = M_S.
    exchange = np.einsum("pba,pcd->acbd", alpha, beta, optimize=True)
    size = alpha.shape[1] * beta.shape[1]
    values, vectors = np.linalg.eigh(n_beta * np.eye(size) - exchange.reshape(size, size))
    vectors = vectors[:, values < 0.5]
    generators = _generators(alpha, beta, vectors)
    # l is i times a real antisymmetric matrix, hence the sign.
    momentum = np.tensordot(orbital_momentum(l).imag.reshape(3, -1), generators, axes=1)
    squares, turn = np.linalg.eigh(-np.sum(momentum @ momentum, axis=0))
    generators = turn.T @ generators @ turn
    momenta = np.rint((np.sqrt(1 + 4 * np.maximum(squares, 0)) - 1) / 2).astype(np.intp)
    values, starts = np.unique(momenta, return_index=True)
    return SpinSpace(
        l,
        n_electrons,
        two_s,
        n_alpha,
        n_beta,
        momenta,
        (values, starts),
        vectors @ turn,
        generators.reshape(n_orbitals**2, -1),
        _repulsion(l, n_electrons, generators),
    )


def _generators(alpha: FloatArray, beta: FloatArray, vectors: FloatArray) -> FloatArray:
    """Matrices of E_ij among combinations of products of alpha and beta strings."""
    shaped = vectors.reshape(alpha.shape[1], beta.shape[1], -1)
    moved = np.einsum("pab,bck->pack", alpha, shaped, optimize=True)
    moved += np.einsum("pcd,adk->pack", beta, shaped, optimize=True)
    generators: FloatArray = vectors.T @ moved.reshape(len(alpha), *vectors.shape)
    return generators


def _repulsion(l: int, n_electrons: int, generators: FloatArray) -> FloatArray:
    """Repulsion per unit of each Slater integral; the formula is that of `determinants.shell_repulsion`."""
    result = []
    for matrices, self_energy in multipoles(l):
        operators = np.tensordot(matrices.reshape(len(matrices), -1), generators, axes=1)
        total = np.sum(operators @ operators, axis=0)
        result.append((total - n_electrons * self_energy * np.eye(len(total))) / 2)
    return np.array(result)


def _replacements(n_orbitals: int, n_particles: int) -> FloatArray:
    """(n_orbitals**2, n_strings, n_strings) matrices of a†_i a_j among strings of one spin."""
    space = fermion_space(n_orbitals, n_particles)
    units = np.eye(n_orbitals**2).reshape(-1, n_orbitals, n_orbitals)
    return np.array([space.one_body(unit) for unit in units])
