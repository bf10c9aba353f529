"""Ladder and orbitals of one calculation, followed through a stack of draws by their overlap."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import permutations

import numpy as np
from numpy.typing import NDArray

from ehmo.conventions import FRONTIER_TOLERANCE_EV
from ehmo.harmonics import harmonic_rotations
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.coordination import LocalFrame
from ehmo.records.ligand_field import Ladder

BoolArray = NDArray[np.bool_]

_SINGULAR = 0.05
"""Smallest singular value of the projections on the metal's shell for which there is a ladder."""

_ANOTHER_FILLING = 0.5
"""A level that differs by as many electrons makes another ground configuration [e]."""


@dataclass(frozen=True, slots=True, eq=False)
class FollowedLadder:
    """One ladder in every draw; rows of draws that have lost it hold NaN.

    Attributes
    ----------
    energies_eV : (n_draws, n_levels) ndarray
        In the order of the levels of the undrawn ladder [eV].
    electrons : (n_draws, n_levels) ndarray
    metal_shares : (n_draws, n_levels) ndarray
    field_eV : (n_draws, n_levels, n_levels) ndarray
        Effective matrix in the local axes [eV].
    same_filling : (n_draws,) ndarray of bool
        Whether every level, degenerate ones together, holds the electrons of the undrawn ladder.
    """

    energies_eV: FloatArray
    electrons: FloatArray
    metal_shares: FloatArray
    field_eV: FloatArray
    same_filling: BoolArray


def follow_orbitals(undrawn: FloatArray, vectors: FloatArray) -> IntArray:
    """Orbital of each draw that is most like each of some undrawn orbitals.

    Parameters
    ----------
    undrawn : (n_ao, n_followed) ndarray
        Orbitals in the Löwdin basis.
    vectors : (n_draws, n_ao, n_mo) ndarray
        Orbitals of the draws in their Löwdin basis.

    Returns
    -------
    orbitals : (n_draws, n_followed) ndarray of int
    """
    alike: IntArray = ((undrawn.T @ vectors) ** 2).argmax(axis=2)
    return alike


def follow_ladders(
    ladders: Sequence[Ladder],
    frames: Sequence[LocalFrame],
    basis: Basis,
    undrawn: FloatArray,
    energies_eV: FloatArray,
    vectors: FloatArray,
    filling: FloatArray,
) -> tuple[FollowedLadder, ...]:
    """Ladders of a stack of draws.

    The orbitals of each draw that lie most in the space of the undrawn ladder's orbitals make its ladder; its levels
    are matched to the undrawn ones by their vectors in the metal's shell.

    Parameters
    ----------
    ladders : sequence of Ladder
        Of the undrawn calculation.
    frames : sequence of LocalFrame
        Their metals.
    basis : Basis
    undrawn : (n_ao, n_mo) ndarray
        Orbitals of the undrawn calculation in the Löwdin basis.
    energies_eV : (n_draws, n_mo) ndarray
        [eV].
    vectors : (n_draws, n_ao, n_mo) ndarray
        Orbitals in the Löwdin basis.
    filling : (n_draws, n_mo) ndarray
        Electrons.

    Returns
    -------
    followed : tuple of FollowedLadder
        One per ladder.
    """
    space = undrawn[:, list(ladders[0].orbitals)]
    likeness = ((space.T @ vectors) ** 2).sum(axis=1)
    chosen = np.sort(np.argsort(-likeness, axis=1)[:, : space.shape[1]], axis=1)
    taken = np.take_along_axis(vectors, chosen[:, None, :], axis=2)
    amplitudes = np.concatenate(
        [_turned(ladder, frame, basis, taken) for ladder, frame in zip(ladders, frames, strict=True)], axis=1
    )
    left, singular, right = np.linalg.svd(amplitudes)
    orthonormal = left @ right
    energies = np.take_along_axis(energies_eV, chosen, axis=1)
    matrices = (orthonormal * energies[:, None, :]) @ orthonormal.swapaxes(1, 2)
    matrices = (matrices + matrices.swapaxes(1, 2)) / 2
    held = np.take_along_axis(filling, chosen, axis=1)
    lost = singular[:, -1] < _SINGULAR
    result, start = [], 0
    for ladder in ladders:
        own = slice(start, start + len(ladder.levels))
        start = own.stop
        parts = _Parts(matrices[:, own, own], orthonormal[:, own], amplitudes[:, own], held)
        result.append(_one(ladder, parts, lost))
    return tuple(result)


def _turned(ladder: Ladder, frame: LocalFrame, basis: Basis, orbitals: FloatArray) -> FloatArray:
    """(n_draws, 2l+1, n) parts of the orbitals on the metal's shell, in its local axes."""
    l = ladder.angular_momentum
    shell = next(
        k for k in np.flatnonzero(basis.shell_atom == ladder.metal) if basis.shell_label(int(k)) == ladder.shell
    )
    start = int(basis.shell_start[shell])
    turned: FloatArray = harmonic_rotations(frame.axes.T[None], l)[0].T @ orbitals[:, start : start + 2 * l + 1]
    return turned


@dataclass(frozen=True, slots=True, eq=False)
class _Parts:
    """One metal in every draw: its effective matrix, and the chosen orbitals on its shell and their electrons."""

    field: FloatArray
    orthonormal: FloatArray
    amplitudes: FloatArray
    held: FloatArray


def _one(ladder: Ladder, parts: _Parts, lost: BoolArray) -> FollowedLadder:
    energies, levels = np.linalg.eigh(parts.field)
    orbitals = parts.orthonormal.swapaxes(1, 2) @ levels
    shares = ((parts.amplitudes @ orbitals) ** 2).sum(axis=1)
    electrons = (parts.held[:, None, :] @ orbitals**2)[:, 0]
    undrawn = np.array([level.energy_eV for level in ladder.levels])
    sets: IntArray = np.cumsum(np.diff(undrawn, prepend=undrawn[0]) > FRONTIER_TOLERANCE_EV, dtype=np.intp)
    order = _matched(ladder.vectors, sets, levels)
    energies, shares, electrons = (np.take_along_axis(a, order, axis=1) for a in (energies, shares, electrons))
    before = np.array([level.electrons for level in ladder.levels])
    starts = np.flatnonzero(np.diff(sets, prepend=-1))
    moved = np.abs(np.add.reduceat(electrons - before, starts, axis=1)).max(axis=1)
    field = parts.field.copy()
    for array in (energies, shares, electrons, field):
        array[lost] = np.nan
    return FollowedLadder(energies, electrons, shares, field, ~lost & (moved < _ANOTHER_FILLING))


def _matched(undrawn: FloatArray, sets: IntArray, levels: FloatArray) -> IntArray:
    """(n_draws, n) level of each draw for each undrawn level; within a degenerate set by rising energy."""
    membership = (sets[:, None] == sets).astype(np.float64)
    likeness = membership @ (undrawn.T @ levels) ** 2
    every = np.array(list(permutations(range(len(sets)))), dtype=np.intp)
    scores = likeness[:, np.arange(len(sets)), every].sum(axis=2)
    order: IntArray = every[scores.argmax(axis=1)]
    starts = np.flatnonzero(np.diff(sets, prepend=-1))
    for start, stop in zip(starts, [*starts[1:], len(sets)], strict=True):
        order[:, start:stop] = np.sort(order[:, start:stop], axis=1)
    return order
