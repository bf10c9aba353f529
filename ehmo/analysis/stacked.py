"""Bond analysis of a stack of draws: the same definitions as for one calculation, many at once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ehmo.analysis.bonds import same_layout
from ehmo.analysis.channels import bond_channels
from ehmo.conventions import BOND_SYMMETRIES
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.bonding import BondOrders
from ehmo.records.coordination import MetalDonorBond


@dataclass(frozen=True, slots=True, eq=False)
class StackedOrders:
    """Orders of the metal-donor bonds in every draw.

    Attributes
    ----------
    overlap_population, mayer, wiberg : (n_draws, n_bonds) ndarray
    channel_weights : tuple of (n_draws, n_listed) ndarray
        Per bond: weight of the channel that has the type and the place within its type of each listed channel of
        the undrawn calculation.
    """

    overlap_population: FloatArray
    mayer: FloatArray
    wiberg: FloatArray
    channel_weights: tuple[FloatArray, ...]


@dataclass(frozen=True, slots=True, eq=False)
class StackedFunctions:
    """Functions of the bonded atoms in every draw.

    Attributes
    ----------
    rows : (n_rows,) ndarray of int
        Their places in the basis, ascending.
    overlap : (n_draws, n_rows, n_rows) or (n_rows, n_rows) ndarray
        S among them.
    coefficients, overlap_orbitals, lowdin_orbitals : (n_draws, n_rows, n_occupied) ndarray
        C, S C and S^(1/2) C.
    """

    rows: IntArray
    overlap: FloatArray
    coefficients: FloatArray
    overlap_orbitals: FloatArray
    lowdin_orbitals: FloatArray


def stacked_orders(
    bonds: Sequence[MetalDonorBond],
    positions_A: FloatArray,
    basis: Basis,
    bonded: StackedFunctions,
    occupations: FloatArray,
    undrawn: Sequence[BondOrders],
) -> StackedOrders:
    """Orders and channels of each bond in every draw; see `bond_orders`.

    Parameters
    ----------
    bonds : sequence of MetalDonorBond
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].
    basis : Basis
    bonded : StackedFunctions
        Orbitals on metals and donors.
    occupations : (n_draws, 2, n_occupied) ndarray
        Alpha and beta filling.
    undrawn : sequence of BondOrders
        Of the undrawn calculation: they say which channels are listed.

    Returns
    -------
    orders : StackedOrders
    """
    coefficients, overlap_orbitals = bonded.coefficients, bonded.overlap_orbitals
    n_draws, n_bonds = len(coefficients), len(bonds)
    first_rows = np.searchsorted(bonded.rows, basis.atom_start[:-1])
    population, mayer, wiberg = (np.zeros((n_draws, n_bonds)) for _ in range(3))
    weights: dict[int, FloatArray] = {}
    metals, donors = (np.array([getattr(bond, end) for bond in bonds], dtype=np.intp) for end in ("metal", "donor"))
    directions = positions_A[donors] - positions_A[metals]
    directions /= np.sqrt((directions * directions).sum(axis=1, keepdims=True))
    closed = bool((occupations[:, 0] == occupations[:, 1]).all())
    spins = occupations[:, :1] if closed else occupations
    factor = 4 if closed else 2
    for members in same_layout(basis, metals, donors) if n_bonds else ():
        on_metal, on_donor = (_rows(basis, first_rows, ends[members]) for ends in (metals, donors))
        forward = _between(coefficients, overlap_orbitals, spins, on_metal, on_donor)
        backward = _between(overlap_orbitals, coefficients, spins, on_metal, on_donor)
        plain = _between(coefficients, coefficients, spins, on_metal, on_donor).sum(axis=0)
        blocks = _between(bonded.lowdin_orbitals, bonded.lowdin_orbitals, spins, on_metal, on_donor)
        within = bonded.overlap[..., on_metal[:, :, None], on_donor[:, None, :]]
        population[:, members] = factor * (plain * within).sum(axis=(-2, -1))
        mayer[:, members] = factor * (forward * backward).sum(axis=(0, -2, -1))
        wiberg[:, members] = factor * (blocks * blocks).sum(axis=(0, -2, -1))
        both = np.concatenate([blocks, blocks]) if closed else blocks
        flat = both.reshape(2, n_draws * len(members), *both.shape[-2:])
        layouts = basis.layouts[metals[members[0]]], basis.layouts[donors[members[0]]]
        channels = bond_channels(flat, np.tile(directions[members], (n_draws, 1)), *layouts)
        found = channels.weights.reshape(n_draws, len(members), -1)
        kinds = channels.shares.argmax(axis=2).reshape(found.shape)
        for place, index in enumerate(members):
            weights[index] = _matched(found[:, place], kinds[:, place], undrawn[index])
    return StackedOrders(population, mayer, wiberg, tuple(weights[index] for index in range(n_bonds)))


def _rows(basis: Basis, first_rows: IntArray, atoms: IntArray) -> IntArray:
    """(n_atoms, n_functions) rows of atoms with the same layout."""
    n_functions = basis.atom_start[atoms[0] + 1] - basis.atom_start[atoms[0]]
    rows: IntArray = first_rows[atoms][:, None] + np.arange(n_functions)
    return rows


def _between(
    left: FloatArray, right: FloatArray, spins: FloatArray, on_metal: IntArray, on_donor: IntArray
) -> FloatArray:
    """(n_spins, n_draws, n_bonds, n_metal, n_donor) blocks of left n right^T."""
    taken, met = left[:, on_metal], right[:, on_donor].swapaxes(-1, -2)
    return np.stack([(taken * spins[:, s, None, None, :]) @ met for s in range(spins.shape[1])])


def _matched(weights: FloatArray, kinds: IntArray, undrawn: BondOrders) -> FloatArray:
    """(n_draws, n_listed) weights by type and by place within the type; zero where a draw has fewer of a type."""
    listed = [BOND_SYMMETRIES.index(channel.type) for channel in undrawn.channels]
    columns = np.zeros((len(weights), len(listed)))
    for kind in set(listed):
        places = [k for k, other in enumerate(listed) if other == kind]
        own = -np.sort(-np.where(kinds == kind, weights, 0.0), axis=1)
        taken = min(len(places), own.shape[1])
        columns[:, places[:taken]] = own[:, :taken]
    return columns
