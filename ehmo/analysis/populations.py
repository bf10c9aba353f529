"""Mulliken population analysis."""

from __future__ import annotations

import numpy as np

from ehmo.analysis.bonded import BondedFunctions
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.bonding import Populations
from ehmo.records.electronic import ElectronicState


def mulliken(state: ElectronicState, overlap: FloatArray, basis: Basis, bonded: BondedFunctions) -> Populations:
    """Populations of functions, shells and atoms, and what each orbital has on metals and donors.

    Parameters
    ----------
    state : ElectronicState
        Orbitals and their filling.
    overlap : (n_ao, n_ao) ndarray
        S.
    basis : Basis
        Functions.
    bonded : BondedFunctions
        The metals and donors.

    Returns
    -------
    populations : Populations

    References
    ----------
    .. [1] mulliken-1955: R. S. Mulliken, J. Chem. Phys. 23, 1833 (1955).
    """
    pairs = _density(state.coefficients, state.occupations.sum(axis=0))
    net = pairs.diagonal().copy()
    pairs *= overlap
    gross = pairs.sum(axis=1)
    by_shell = _sum_blocks(pairs, basis.shell_start)
    by_atom = _sum_blocks(by_shell, np.searchsorted(basis.shell_atom, np.arange(len(basis.symbols))))
    return Populations(
        gross=gross,
        net=net,
        charges=basis.core_charges - np.add.reduceat(gross, basis.atom_start[:-1]),
        spin=_spin_populations(state, overlap, basis),
        shell_overlap=_both_halves(by_shell),
        atom_overlap=_both_halves(by_atom),
        orbital_shares=_orbital_shares(bonded),
    )


def _density(coefficients: FloatArray, filling: FloatArray) -> FloatArray:
    """Density matrix P = C n C^T."""
    n_occupied = int(filling.nonzero()[0][-1]) + 1
    occupied = coefficients[:, :n_occupied]
    density: FloatArray = (occupied * filling[:n_occupied]) @ occupied.T
    return density


def _spin_populations(state: ElectronicState, overlap: FloatArray, basis: Basis) -> FloatArray:
    """Alpha minus beta by atom: only the few orbitals filled unequally count."""
    difference = state.occupations[0] - state.occupations[1]
    open_orbitals = difference.nonzero()[0]
    chosen = state.coefficients[:, open_orbitals]
    gross = (chosen * (overlap @ chosen)) @ difference[open_orbitals]
    spin: FloatArray = np.add.reduceat(gross, basis.atom_start[:-1])
    return spin


def _orbital_shares(bonded: BondedFunctions) -> FloatArray:
    gross = bonded.coefficients * bonded.overlap_orbitals
    metal = gross[bonded.on_metals].sum(axis=0)
    donor = gross[~bonded.on_metals].sum(axis=0)
    return np.stack([metal, donor, 1 - metal - donor], axis=1)


def _sum_blocks(matrix: FloatArray, starts: IntArray) -> FloatArray:
    sums: FloatArray = np.add.reduceat(np.add.reduceat(matrix, starts, axis=0), starts, axis=1)
    return sums


def _both_halves(matrix: FloatArray) -> FloatArray:
    """Off-diagonal elements doubled: the overlap population counts P_AB S_AB and P_BA S_BA."""
    doubled = 2 * matrix
    np.fill_diagonal(doubled, matrix.diagonal())
    return doubled
