"""Bond channels: the sigma, pi and delta parts of a bond, from the Löwdin spin densities.

The eigenvalues of 2 (P^a_MX P^a_XM + P^b_MX P^b_XM) are the weights of the channels and add up to the Wiberg
order; its eigenvectors are the metal hybrids, those of the donor-side matrix the donor hybrids. Each spin counts
for itself: the spin-summed block would halve a half-filled pi* level.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np

from ehmo.harmonics import axis_rotations, harmonic_rotations
from ehmo.records.arrays import FloatArray

CLOSE_WEIGHTS = 0.15
"""Channels whose weights differ by less are separated by |m| rather than by weight."""

_WORTH_TURNING = 0.1  # below, a channel is a trace and its name does not matter
_MIXED = 0.02
_SQUARES = np.array([0.0, 1.0, 4.0, 9.0])
_FROM_MOMENTS = np.linalg.inv(np.vander(_SQUARES, increasing=True))


@dataclass(frozen=True, slots=True, eq=False)
class ChannelSet:
    """Channels of several bonds whose atoms carry the same shells, by falling weight.

    Attributes
    ----------
    weights : (n_bonds, n_channels) ndarray
    shares : (n_bonds, n_channels, 4) ndarray
    metal_hybrids, donor_hybrids : (n_bonds, n_channels, n) ndarray
    """

    weights: FloatArray
    shares: FloatArray
    metal_hybrids: FloatArray
    donor_hybrids: FloatArray


def bond_channels(
    blocks: FloatArray, directions: FloatArray, metal_layout: tuple[int, ...], donor_layout: tuple[int, ...]
) -> ChannelSet:
    """Channels of bonds whose atoms carry the same shells.

    Parameters
    ----------
    blocks : (2, n_bonds, n_metal, n_donor) ndarray
        Löwdin alpha and beta density between metal and donor.
    directions : (n_bonds, 3) ndarray
        Unit vectors from metal to donor.
    metal_layout, donor_layout : tuple of int
        l of each shell of the metal and of the donor.

    Returns
    -------
    channels : ChannelSet
    """
    mirrored = blocks.swapaxes(-1, -2)
    metal_m2 = squared_momenta(directions, metal_layout)
    weights, metal_hybrids = _separated((2 * blocks @ mirrored).sum(axis=0), metal_m2)
    _, donor_hybrids = _separated((2 * mirrored @ blocks).sum(axis=0), squared_momenta(directions, donor_layout))
    # Each spin density has its own pairs of hybrids; the total tells which donor hybrid meets which metal one.
    coupling = np.abs(metal_hybrids.swapaxes(1, 2) @ blocks.sum(axis=0) @ donor_hybrids)
    order = np.argsort(-weights, axis=1, kind="stable")
    bond = np.arange(len(directions))[:, None]
    partner = coupling.argmax(axis=2)[bond, order]
    return ChannelSet(
        weights[bond, order],
        momentum_shares(metal_hybrids, metal_m2)[bond, order],
        metal_hybrids.swapaxes(1, 2)[bond, order],
        donor_hybrids.swapaxes(1, 2)[bond, partner],
    )


def _separated(matrices: FloatArray, squared_m: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Eigenvalues and vectors, with sets of close weights turned to definite |m|."""
    weights, vectors = np.linalg.eigh(matrices)
    # <m^4> - <m^2>^2 vanishes for a vector of one |m|.
    turned = squared_m @ vectors
    spread = (turned * turned).sum(axis=1) - (vectors * turned).sum(axis=1) ** 2
    for b in ((spread > _MIXED) & (weights > _WORTH_TURNING)).any(axis=1).nonzero()[0]:
        for first, stop in _close_sets(weights[b]):
            vectors[b][:, first:stop] = _of_definite_m(vectors[b][:, first:stop], matrices[b], squared_m[b])
        weights[b] = np.einsum("ik,ij,jk->k", vectors[b], matrices[b], vectors[b])
    return weights, vectors


def _of_definite_m(vectors: FloatArray, matrix: FloatArray, squared_m: FloatArray) -> FloatArray:
    """Same space, block by block of |m|; within a block the eigenvectors of the matrix, so that rounding has no say."""
    values, turn = np.linalg.eigh(vectors.T @ squared_m @ vectors)
    turned: FloatArray = vectors @ turn
    nearest = np.abs(values[:, None] - _SQUARES).argmin(axis=1)
    for m in set(nearest.tolist()):
        block = turned[:, nearest == m]
        turned[:, nearest == m] = block @ np.linalg.eigh(block.T @ matrix @ block)[1]
    return turned


def _close_sets(weights: FloatArray) -> list[tuple[int, int]]:
    """Ranges of two or more ascending weights worth turning, each close to the next."""
    starts = [k for k in range(len(weights)) if k == 0 or weights[k] - weights[k - 1] > CLOSE_WEIGHTS]
    stops = [*starts[1:], len(weights)]
    return [
        (first, stop)
        for first, stop in zip(starts, stops, strict=True)
        if stop - first > 1 and weights[stop - 1] > _WORTH_TURNING
    ]


def squared_momenta(directions: FloatArray, layout: tuple[int, ...]) -> FloatArray:
    """Matrices of m^2, the squared angular momentum about each direction.

    Parameters
    ----------
    directions : (n, 3) ndarray
        Unit vectors.
    layout : tuple of int
        l of each shell.

    Returns
    -------
    matrices : (n, n_functions, n_functions) ndarray
        Eigenvalues 0, 1, 4, 9.
    """
    products = directions[:, :, None] * directions[:, None, :]
    flat = products.reshape(len(directions), 9) @ _squared_momentum_tensor(layout)
    size = sum(2 * l + 1 for l in layout)
    return flat.reshape(-1, size, size)


@cache
def _squared_momentum_tensor(layout: tuple[int, ...]) -> FloatArray:
    """(9, n*n) tensor whose contraction with n_a n_b gives m^2 about n: it is a quadratic form in n.

    The nine elements follow from m^2 about six directions, where the rotated harmonics give it directly.
    """
    root = np.sqrt(0.5)
    directions = np.array(
        [[1, 0, 0], [0, 1, 0], [0, 0, 1], [root, root, 0], [root, 0, root], [0, root, root]], dtype=np.float64
    )
    size = sum(2 * l + 1 for l in layout)
    along = np.zeros((6, size, size))
    start = 0
    for l in layout:
        turned = harmonic_rotations(axis_rotations(directions), l)
        stop = start + 2 * l + 1
        squares = np.arange(-l, l + 1) ** 2
        along[:, start:stop, start:stop] = (turned * squares) @ turned.swapaxes(1, 2)
        start = stop
    xx, yy, zz = along[:3]
    xy, xz, yz = (along[3] - (xx + yy) / 2), (along[4] - (xx + zz) / 2), (along[5] - (yy + zz) / 2)
    return np.array([xx, xy, xz, xy, yy, yz, xz, yz, zz]).reshape(9, size * size)


def momentum_shares(vectors: FloatArray, squared_m: FloatArray) -> FloatArray:
    """Parts of normalised vectors with |m| = 0, 1, 2, 3 about a bond.

    Parameters
    ----------
    vectors : (n, n_functions, n_vectors) ndarray
        Columns are vectors.
    squared_m : (n, n_functions, n_functions) ndarray
        See `squared_momenta`.

    Returns
    -------
    shares : (n, n_vectors, 4) ndarray
        They add up to 1.

    Notes
    -----
    The moments <1>, <m^2>, <m^4>, <m^6> are sums of the shares times powers of 0, 1, 4, 9; solving for the shares
    needs no rotation into the frame of the bond.
    """
    once = squared_m @ vectors
    twice = squared_m @ once
    moments = np.stack(
        [
            (vectors * vectors).sum(axis=1),
            (vectors * once).sum(axis=1),
            (once * once).sum(axis=1),
            (once * twice).sum(axis=1),
        ],
        axis=2,
    )
    shares: FloatArray = moments @ _FROM_MOMENTS
    return shares
