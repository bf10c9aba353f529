"""Mayer and Wiberg orders, overlap populations and channels of metal-donor bonds."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ehmo.analysis.bonded import BondedFunctions
from ehmo.analysis.channels import bond_channels
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.bonding import BondOrders
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.electronic import ElectronicState


def bond_orders(
    bonds: Sequence[MetalDonorBond],
    positions_A: FloatArray,
    basis: Basis,
    bonded: BondedFunctions,
    state: ElectronicState,
    atom_overlap: FloatArray,
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
    bonded : BondedFunctions
        Rows of the bonded atoms.
    state : ElectronicState
        Filling of the orbitals.
    atom_overlap : (n_atoms, n_atoms) ndarray
        Overlap populations [e].

    Returns
    -------
    orders : tuple of BondOrders
        In the order of `bonds`.

    References
    ----------
    .. [1] mayer-1983: I. Mayer, Chem. Phys. Lett. 97, 270 (1983).
    .. [2] wiberg-1968: K. B. Wiberg, Tetrahedron 24, 1083 (1968).
    """
    if not bonds:
        return ()
    metals = np.array([bond.metal for bond in bonds])
    donors = np.array([bond.donor for bond in bonds])
    directions = positions_A[donors] - positions_A[metals]
    directions /= np.sqrt((directions * directions).sum(axis=1, keepdims=True))
    n_occupied = int(state.occupations[0].nonzero()[0][-1]) + 1
    filling = state.occupations[:, None, None, :n_occupied]
    occupied = bonded.coefficients[:, :n_occupied]
    overlap_occupied = bonded.overlap_orbitals[:, :n_occupied]
    lowdin = bonded.lowdin_orbitals[:, :n_occupied]
    result: dict[int, BondOrders] = {}
    for members in same_layout(basis, metals, donors):
        on_metal = _rows(basis, bonded, metals[members])
        on_donor = _rows(basis, bonded, donors[members])
        forward = _between(occupied, overlap_occupied, filling, on_metal, on_donor)
        backward = _between(overlap_occupied, occupied, filling, on_metal, on_donor)
        blocks = _between(lowdin, lowdin, filling, on_metal, on_donor)
        layouts = basis.layouts[metals[members[0]]], basis.layouts[donors[members[0]]]
        channels = bond_channels(blocks, directions[members], *layouts)
        mayer = 2 * (forward * backward).sum(axis=(0, 2, 3))
        wiberg = 2 * (blocks * blocks).sum(axis=(0, 2, 3))
        orbital_overlap = _orbital_overlaps(bonded, on_metal, on_donor)
        for place, index in enumerate(members):
            result[index] = BondOrders(
                overlap_population=float(atom_overlap[metals[index], donors[index]]),
                mayer=float(mayer[place]),
                wiberg=float(wiberg[place]),
                channel_weights=channels.weights[place],
                channel_shares=channels.shares[place],
                metal_hybrids=channels.metal_hybrids[place],
                donor_hybrids=channels.donor_hybrids[place],
                orbital_overlap=orbital_overlap[place],
            )
    return tuple(result[index] for index in range(len(bonds)))


def same_layout(basis: Basis, metals: IntArray, donors: IntArray) -> list[list[int]]:
    """Indices of the bonds whose atoms carry the same shells, so that each lot is one array operation."""
    lots: dict[tuple[tuple[int, ...], tuple[int, ...]], list[int]] = {}
    for index, (metal, donor) in enumerate(zip(metals, donors, strict=True)):
        lots.setdefault((basis.layouts[metal], basis.layouts[donor]), []).append(index)
    return list(lots.values())


def _rows(basis: Basis, bonded: BondedFunctions, atoms: IntArray) -> IntArray:
    """(n_atoms, n_functions) rows of atoms with the same layout."""
    n_functions = basis.atom_start[atoms[0] + 1] - basis.atom_start[atoms[0]]
    rows: IntArray = bonded.start[atoms][:, None] + np.arange(n_functions)
    return rows


def _between(
    left: FloatArray, right: FloatArray, filling: FloatArray, on_metal: IntArray, on_donor: IntArray
) -> FloatArray:
    """(2, n_bonds, n_metal, n_donor) blocks of left n right^T for both spins."""
    blocks: FloatArray = (left[on_metal] * filling) @ right[on_donor].swapaxes(-1, -2)
    return blocks


def _orbital_overlaps(bonded: BondedFunctions, on_metal: IntArray, on_donor: IntArray) -> FloatArray:
    """(n_bonds, n_mo) overlap population of each orbital holding two electrons."""
    between = bonded.overlap[on_metal[:, :, None], on_donor[:, None, :]]
    products = bonded.coefficients[on_metal] * (between @ bonded.coefficients[on_donor])
    overlaps: FloatArray = 4 * products.sum(axis=1)
    return overlaps
