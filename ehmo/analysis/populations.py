"""Mulliken population analysis."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.bonding import Populations
from ehmo.records.electronic import ElectronicState


def mulliken(state: ElectronicState, overlap: FloatArray, overlap_orbitals: FloatArray, basis: Basis) -> Populations:
    """Populations of functions, shells and atoms.

    Parameters
    ----------
    state : ElectronicState
        Orbitals and their filling.
    overlap : (n_ao, n_ao) ndarray
        S.
    overlap_orbitals : (n_ao, n_mo) ndarray
        S C.
    basis : Basis
        Functions.

    Returns
    -------
    populations : Populations

    References
    ----------
    .. [1] mulliken1955: R. S. Mulliken, J. Chem. Phys. 23, 1833 (1955).
    """
    filling = state.occupations.sum(axis=0)
    orbital_gross = state.coefficients * overlap_orbitals
    gross = orbital_gross @ filling
    shares = np.add.reduceat(orbital_gross, basis.atom_start[:-1], axis=0)
    pairs = density(state.coefficients, filling)
    net = pairs.diagonal().copy()
    pairs *= overlap
    by_shell = _sum_blocks(pairs, basis.shell_start)
    first_shell = np.searchsorted(basis.shell_atom, np.arange(len(basis.symbols)))
    by_atom = _sum_blocks(by_shell, first_shell)
    return Populations(
        gross,
        net,
        np.add.reduceat(gross, basis.atom_start[:-1]),
        shares @ (state.occupations[0] - state.occupations[1]),
        _both_halves(by_shell),
        _both_halves(by_atom),
        shares,
    )


def density(coefficients: FloatArray, filling: FloatArray) -> FloatArray:
    """Density matrix P = C n C^T."""
    n_occupied = int(filling.nonzero()[0][-1]) + 1
    occupied = coefficients[:, :n_occupied]
    return (occupied * filling[:n_occupied]) @ occupied.T


def _sum_blocks(matrix: FloatArray, starts: NDArray[np.intp]) -> FloatArray:
    return np.add.reduceat(np.add.reduceat(matrix, starts, axis=0), starts, axis=1)


def _both_halves(matrix: FloatArray) -> FloatArray:
    """Off-diagonal elements doubled: the overlap population counts P_AB S_AB and P_BA S_BA."""
    doubled = 2 * matrix
    np.fill_diagonal(doubled, matrix.diagonal())
    return doubled
