"""What the orbitals mean: populations, bond orders and bond channels."""

from __future__ import annotations

from collections.abc import Sequence

from ehmo.analysis.bonded import BondedFunctions
from ehmo.analysis.bonds import bond_orders
from ehmo.analysis.populations import mulliken
from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.bonding import BondOrders, Populations
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.electronic import ElectronicState, OverlapSpectrum

__all__ = ["analyse_bonding"]


def analyse_bonding(
    bonds: Sequence[MetalDonorBond],
    positions_A: FloatArray,
    basis: Basis,
    overlap: OverlapSpectrum,
    state: ElectronicState,
    bonded: BondedFunctions,
) -> tuple[Populations, tuple[BondOrders, ...]]:
    """Populations of the fragment, and orders and channels of its metal-donor bonds.

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
    state : ElectronicState
        Orbitals and their filling.
    bonded : BondedFunctions
        Their rows on metals and donors.

    Returns
    -------
    populations : Populations
    orders : tuple of BondOrders
        In the order of `bonds`.
    """
    populations = mulliken(state, overlap.matrix, basis, bonded)
    orders = bond_orders(bonds, positions_A, basis, bonded, state, populations.atom_overlap)
    return populations, orders
