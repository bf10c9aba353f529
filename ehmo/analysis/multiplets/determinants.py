"""Determinants of an open shell and one-electron operators among them.

Modes of a full space are the spin orbitals: real harmonics m = -l..l with spin alpha, then the same with beta.
Determinants stand in lexicographic order of their occupied modes.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from itertools import combinations
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from ehmo.harmonics import product_integrals
from ehmo.records.arrays import FloatArray, IntArray

Number = TypeVar("Number", np.float64, np.complex128)


@dataclass(frozen=True, slots=True, eq=False)
class FermionSpace:
    """All ways to put some fermions into some modes.

    Attributes
    ----------
    n_modes, n_particles : int
    strings : tuple of tuple of int
        Occupied modes of each determinant, ascending.
    index : dict
        Place of each string.
    occupations : (n_states, n_modes) ndarray
        1 where a mode is occupied.
    rows, columns : (n_single,) ndarray of int
        Pairs of determinants that differ in one mode.
    elements : (n_single,) ndarray of int
        Flat place, in an (n_modes, n_modes) matrix, of the element that joins them.
    signs : (n_single,) ndarray
    """

    n_modes: int
    n_particles: int
    strings: tuple[tuple[int, ...], ...]
    index: dict[tuple[int, ...], int]
    occupations: FloatArray
    rows: IntArray
    columns: IntArray
    elements: IntArray
    signs: FloatArray

    @property
    def size(self) -> int:
        """Number of determinants."""
        return len(self.strings)

    def one_body(self, matrix: NDArray[Number]) -> NDArray[Number]:
        """Matrix of sum_PQ h_PQ a†_P a_Q among the determinants.

        Parameters
        ----------
        matrix : (n_modes, n_modes) ndarray
            h, real or complex.

        Returns
        -------
        operator : (n_states, n_states) ndarray
        """
        operator = np.zeros((self.size, self.size), dtype=matrix.dtype)
        operator[self.rows, self.columns] = matrix.ravel()[self.elements] * self.signs
        np.fill_diagonal(operator, self.occupations @ np.diagonal(matrix))
        return operator


@cache
def fermion_space(n_modes: int, n_particles: int) -> FermionSpace:
    """Space of n_particles in n_modes, with the table of single replacements.

    Parameters
    ----------
    n_modes, n_particles : int

    Returns
    -------
    space : FermionSpace
    """
    strings = tuple(combinations(range(n_modes), n_particles))
    index = {string: place for place, string in enumerate(strings)}
    occupations = np.zeros((len(strings), n_modes))
    table: list[tuple[int, int, int, int]] = []
    for column, string in enumerate(strings):
        occupations[column, list(string)] = 1
        for place, old in enumerate(string):
            rest = string[:place] + string[place + 1 :]
            for new in range(n_modes):
                if new in string:
                    continue
                position = sum(mode < new for mode in rest)
                row = index[(*rest[:position], new, *rest[position:])]
                table.append((row, column, new * n_modes + old, (-1) ** (place + position)))
    rows, columns, elements, signs = np.array(table, dtype=np.intp).reshape(-1, 4).T
    return FermionSpace(
        n_modes, n_particles, strings, index, occupations, rows, columns, elements, signs.astype(np.float64)
    )


def shell_space(l: int, n_electrons: int) -> FermionSpace:
    """Space of all determinants of a shell; see the head of this module for the order."""
    return fermion_space(2 * (2 * l + 1), n_electrons)


@cache
def multipoles(l: int) -> tuple[tuple[FloatArray, float], ...]:
    """Multipole operators of a shell for k = 2, 4, .. 2l: the angular part of the Coulomb repulsion.

    Parameters
    ----------
    l : int

    Returns
    -------
    operators : tuple of (matrices, self_energy)
        `matrices` is (2k+1, 2l+1, 2l+1), scaled such that (ij|kl) = sum_k F^k sum_q M_ij M_kl; `self_energy` is
        the multiple of the unit matrix that sum_q M M is.

    References
    ----------
    .. [1] condon-1935: E. U. Condon, G. H. Shortley, The Theory of Atomic Spectra, Cambridge 1935 (from memory).
    """
    gaunt = product_integrals(l, l)
    operators = []
    for k in range(2, 2 * l + 1, 2):
        matrices = np.sqrt(4 * np.pi / (2 * k + 1)) * np.moveaxis(gaunt[:, :, k * k : (k + 1) ** 2], 2, 0)
        self_energy = float(np.sum(matrices**2)) / (2 * l + 1)
        matrices = np.ascontiguousarray(matrices)
        matrices.setflags(write=False)
        operators.append((matrices, self_energy))
    return tuple(operators)


@cache
def shell_repulsion(l: int, n_electrons: int) -> FloatArray:
    """Repulsion matrices among all determinants, per unit of F^2, F^4, (F^6).

    Parameters
    ----------
    l, n_electrons : int

    Returns
    -------
    matrices : (l, n_states, n_states) ndarray

    Notes
    -----
    With T_q = sum_ij M_ij E_ij the repulsion is (sum_q T_q T_q - self-energy of each electron)/2, since
    E_ij E_kl = a†_i a†_k a_l a_j summed over spins + delta_jk E_il.
    """
    space = shell_space(l, n_electrons)
    result = []
    for matrices, self_energy in multipoles(l):
        total = -n_electrons * self_energy * np.eye(space.size)
        for matrix in matrices:
            operator = space.one_body(np.kron(np.eye(2), matrix))
            total += operator @ operator
        result.append(total / 2)
    stacked = np.array(result)
    stacked.setflags(write=False)
    return stacked
