"""The rows of C, S C and S^(1/2) C that belong to metals and donors: all that bond analysis needs."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.electronic import ElectronicState, OverlapSpectrum


@dataclass(frozen=True, slots=True, eq=False)
class BondedFunctions:
    """Functions of the bonded atoms, with their rows of the orbital matrices.

    Attributes
    ----------
    start : (n_atoms,) ndarray of int
        First row of each bonded atom; meaningless for the others.
    on_metals : (n_rows,) ndarray of bool
        Whether a row belongs to a metal.
    overlap : (n_rows, n_rows) ndarray
        S among the rows.
    coefficients, overlap_orbitals, lowdin_orbitals : (n_rows, n_mo) ndarray
        C, S C and S^(1/2) C.
    """

    start: IntArray
    on_metals: np.ndarray[tuple[int], np.dtype[np.bool_]]
    overlap: FloatArray
    coefficients: FloatArray
    overlap_orbitals: FloatArray
    lowdin_orbitals: FloatArray


def bonded_functions(
    bonds: Sequence[MetalDonorBond],
    basis: Basis,
    overlap: OverlapSpectrum,
    state: ElectronicState,
    metals: Sequence[int] = (),
) -> BondedFunctions:
    """Rows of the metals and donors of some bonds.

    Parameters
    ----------
    bonds : sequence of MetalDonorBond
        Bonds to analyse.
    basis : Basis
        Functions.
    overlap : OverlapSpectrum
        S with its eigenvectors.
    state : ElectronicState
        Orbitals.
    metals : sequence of int
        Metals that may have no bonds.

    Returns
    -------
    bonded : BondedFunctions

    References
    ----------
    .. [1] lowdin-1950: P.-O. Löwdin, J. Chem. Phys. 18, 365 (1950).
    """
    role = np.zeros(len(basis.symbols), dtype=np.int8)
    role[[bond.donor for bond in bonds]] = 1
    role[[*metals, *(bond.metal for bond in bonds)]] = 2
    rows = np.flatnonzero(role[basis.atom_of])
    chosen_overlap = overlap.matrix[rows]
    half = (overlap.vectors[rows] * np.sqrt(overlap.eigenvalues)) @ overlap.vectors.T
    return BondedFunctions(
        start=np.searchsorted(rows, basis.atom_start[:-1]),
        on_metals=role[basis.atom_of[rows]] == 2,
        overlap=chosen_overlap[:, rows],
        coefficients=state.coefficients[rows],
        overlap_orbitals=chosen_overlap @ state.coefficients,
        lowdin_orbitals=half @ state.coefficients,
    )
