"""Mayer and Wiberg orders, overlap populations and channels of metal-donor bonds."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ehmo.analysis.channels import bond_channels
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.bonding import BondOrders, Populations
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.electronic import ElectronicState, OverlapSpectrum


def bond_orders(
    bonds: Sequence[MetalDonorBond],
    positions_A: FloatArray,
    basis: Basis,
    overlap: OverlapSpectrum,
    overlap_orbitals: FloatArray,
    state: ElectronicState,
    populations: Populations,
) -> tuple[BondOrders, ...]:
    """Orders and channels of each bond.

    With P^a, P^b the spin density matrices: the Mayer order is 2 sum_ij [(P^a S)_ij (P^a S)_ji + (P^b S)_ij
    (P^b S)_ji] over i on one atom and j on the other; the Wiberg order is 2 sum_ij (|P^a_ij|^2 + |P^b_ij|^2) in
    the Löwdin basis.

    Parameters
    ----------
    bonds : sequence of MetalDonorBond
        Bonds to analyse.
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].
    basis : Basis
        Functions.
    overlap : OverlapSpectrum
        S with its eigenvectors.
    overlap_orbitals : (n_ao, n_mo) ndarray
        S C.
    state : ElectronicState
        Orbitals and their filling.
    populations : Populations
        Gives the overlap populations.

    Returns
    -------
    orders : tuple of BondOrders
        In the order of `bonds`.

    References
    ----------
    .. [1] mayer1983: I. Mayer, Chem. Phys. Lett. 97, 270 (1983).
    .. [2] wiberg1968: K. B. Wiberg, Tetrahedron 24, 1083 (1968).
    .. [3] lowdin1950: P.-O. Löwdin, J. Chem. Phys. 18, 365 (1950).
    """
    if not bonds:
        return ()
    metals = np.array([bond.metal for bond in bonds])
    donors = np.array([bond.donor for bond in bonds])
    directions = positions_A[donors] - positions_A[metals]
    directions /= np.sqrt((directions * directions).sum(axis=1, keepdims=True))
    n_occupied = int(state.occupations[0].nonzero()[0][-1]) + 1
    filling = state.occupations[:, None, None, :n_occupied]
    occupied, overlap_occupied = state.coefficients[:, :n_occupied], overlap_orbitals[:, :n_occupied]
    lowdin = _lowdin_orbitals(occupied, overlap, basis, np.concatenate([metals, donors]))
    result: dict[int, BondOrders] = {}
    for members in _same_layout(basis, metals, donors):
        first, second = metals[members], donors[members]
        on_metal, on_donor = _functions(basis, first), _functions(basis, second)
        forward = _between(occupied, overlap_occupied, filling, on_metal, on_donor)
        backward = _between(overlap_occupied, occupied, filling, on_metal, on_donor)
        mayer = 2 * (forward * backward).sum(axis=(0, 2, 3))
        blocks = _between(lowdin, lowdin, filling, on_metal, on_donor)
        wiberg = 2 * (blocks * blocks).sum(axis=(0, 2, 3))
        channels = bond_channels(blocks, directions[members], basis.layouts[first[0]], basis.layouts[second[0]])
        orbital_overlap = _orbital_overlaps(state.coefficients, overlap.matrix, on_metal, on_donor)
        for place, index in enumerate(members):
            result[index] = BondOrders(
                overlap_population=float(populations.atom_overlap[metals[index], donors[index]]),
                mayer=float(mayer[place]),
                wiberg=float(wiberg[place]),
                channel_weights=channels.weights[place],
                channel_shares=channels.shares[place],
                metal_hybrids=channels.metal_hybrids[place],
                donor_hybrids=channels.donor_hybrids[place],
                orbital_overlap=orbital_overlap[place],
            )
    return tuple(result[index] for index in range(len(bonds)))


def _same_layout(basis: Basis, metals: IntArray, donors: IntArray) -> list[list[int]]:
    """Indices of the bonds whose atoms carry the same shells, so that each lot is one array operation."""
    lots: dict[tuple[tuple[int, ...], tuple[int, ...]], list[int]] = {}
    for index, (metal, donor) in enumerate(zip(metals, donors, strict=True)):
        lots.setdefault((basis.layouts[metal], basis.layouts[donor]), []).append(index)
    return list(lots.values())


def _functions(basis: Basis, atoms: IntArray) -> IntArray:
    """(n_atoms, n_functions) indices of the functions of atoms with the same layout."""
    start = basis.atom_start[atoms]
    functions: IntArray = start[:, None] + np.arange(basis.atom_start[atoms[0] + 1] - start[0])
    return functions


def _between(
    left: FloatArray, right: FloatArray, filling: FloatArray, on_metal: IntArray, on_donor: IntArray
) -> FloatArray:
    """(2, n_bonds, n_metal, n_donor) blocks of left n right^T for both spins."""
    blocks: FloatArray = (left[on_metal] * filling) @ right[on_donor].swapaxes(-1, -2)
    return blocks


def _lowdin_orbitals(occupied: FloatArray, overlap: OverlapSpectrum, basis: Basis, atoms: IntArray) -> FloatArray:
    """Rows of S^(1/2) C for the functions of the given atoms; the other rows are zero."""
    wanted = np.zeros(len(basis.symbols), dtype=bool)
    wanted[atoms] = True
    functions = wanted[basis.atom_of].nonzero()[0]
    half = (overlap.vectors[functions] * np.sqrt(overlap.eigenvalues)) @ overlap.vectors.T
    rows = np.zeros_like(occupied)
    rows[functions] = half @ occupied
    return rows


def _orbital_overlaps(
    coefficients: FloatArray, overlap: FloatArray, on_metal: IntArray, on_donor: IntArray
) -> FloatArray:
    """(n_bonds, n_mo) overlap population of each orbital holding two electrons."""
    between = overlap[on_metal[:, :, None], on_donor[:, None, :]]
    overlaps: FloatArray = 4 * (coefficients[on_metal] * (between @ coefficients[on_donor])).sum(axis=1)
    return overlaps
