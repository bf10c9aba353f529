"""Channels as orbitals: hybrids over the basis functions, and the molecular orbitals that carry a channel."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.bonding import BondChannel
from ehmo.records.channel_orbitals import ChannelOrbitals
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.electronic import ElectronicState


def channel_orbitals(
    bond: MetalDonorBond,
    channels: Sequence[BondChannel],
    basis: Basis,
    root: FloatArray,
    state: ElectronicState,
) -> tuple[ChannelOrbitals, ...]:
    """Hybrids and carriers of the channels of one bond.

    With u_k = S^1/2 c_k the orbitals over the Löwdin functions, P^s = sum_k n^s_k u_k u_k^T the density of spin s
    and m the metal hybrid, the weight of a channel is w = 2 sum_s |P^s_XM m|^2. One factor of each square is a sum
    over the orbitals, so that w = sum_k w_k with

        w_k = 2 sum_s n^s_k (u_k,M . m) (u_k,X . P^s_XM m).

    w_k / w is the share of orbital k. Shares add up to 1; one is negative where an occupied orbital is antibonding
    in the channel. Of a degenerate set only the sum has a meaning.

    Parameters
    ----------
    bond : MetalDonorBond
    channels : sequence of BondChannel
        Channels of that bond.
    basis : Basis
        Functions.
    root : (n_ao, n_ao) ndarray
        S^1/2; see `half_overlap`.
    state : ElectronicState
        Orbitals and their filling.

    Returns
    -------
    found : tuple of ChannelOrbitals
        In the order of `channels`.

    References
    ----------
    .. [1] lowdin-1950: P.-O. Löwdin, J. Chem. Phys. 18, 365 (1950).
    .. [2] wiberg-1968: K. B. Wiberg, Tetrahedron 24, 1083 (1968).
    """
    on_metal, on_donor = basis.functions_of(bond.metal), basis.functions_of(bond.donor)
    metal_rows, donor_rows = (root[rows] @ state.coefficients for rows in (on_metal, on_donor))
    found = []
    for channel in channels:
        along = channel.metal_hybrid @ metal_rows
        # (2, n_X) image of the metal hybrid on the donor, for each spin
        image = (state.occupations * along) @ donor_rows.T
        parts = 2 * (state.occupations * along * (image @ donor_rows)).sum(axis=0)
        # The phases of the two eigenvectors are free; in the density they meet in phase.
        donor_hybrid = np.copysign(1.0, image.sum(axis=0) @ channel.donor_hybrid) * channel.donor_hybrid
        found.append(
            ChannelOrbitals(
                metal_orbital=_over_basis(channel.metal_hybrid, on_metal, root),
                donor_orbital=_over_basis(donor_hybrid, on_donor, root),
                shares=parts / parts.sum(),
                metal_amplitudes=along,
                donor_amplitudes=donor_hybrid @ donor_rows,
            )
        )
    return tuple(found)


def half_overlap(overlap: FloatArray) -> FloatArray:
    """Square root of the overlap matrix.

    Parameters
    ----------
    overlap : (n_ao, n_ao) ndarray
        S, positive definite.

    Returns
    -------
    root : (n_ao, n_ao) ndarray
        S^1/2, symmetric.
    """
    values, vectors = np.linalg.eigh(overlap)
    root: FloatArray = (vectors * np.sqrt(values)) @ vectors.T
    return root


def _over_basis(hybrid: FloatArray, rows: slice, root: FloatArray) -> FloatArray:
    """Coefficients S^-1/2 h over the basis functions of a hybrid h over the Löwdin functions of one atom."""
    vector = np.zeros(len(root))
    vector[rows] = hybrid
    return np.asarray(np.linalg.solve(root, vector), dtype=np.float64)
