"""Irreps of orbitals, exact or as shares where the structure is distorted."""

from __future__ import annotations

from typing import Final

import numpy as np
from scipy.linalg import eigh

from ehmo.analysis.symmetry.adapted import AdaptedFunctions, adapted_functions, functions_of_atoms
from ehmo.conventions import DEGENERACY_TOLERANCE_EV
from ehmo.harmonics import harmonic_rotations
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.electronic import OverlapSpectrum
from ehmo.records.symmetry import OrbitalIrreps, Symmetry

SMALLEST_PART: Final = 1e-3
"""An orbital with less than this on the atoms judged gets no label."""

_MIXED: Final = 0.02
_NOTHING: Final = 1e-12


def lowdin_rows(overlap: OverlapSpectrum, rows: IntArray, coefficients: FloatArray) -> FloatArray:
    """Rows of S^(1/2) C.

    Parameters
    ----------
    overlap : OverlapSpectrum
    rows : (n,) ndarray of int
        Functions.
    coefficients : (n_ao, n_mo) ndarray
        C.

    Returns
    -------
    lowdin : (n, n_mo) ndarray
    """
    half = (overlap.vectors[rows] * np.sqrt(overlap.eigenvalues)) @ overlap.vectors.T
    lowdin: FloatArray = half @ coefficients
    return lowdin


def orbital_irreps(
    symmetry: Symmetry,
    basis: Basis,
    lowdin_orbitals: FloatArray,
    energies_eV: FloatArray,
    degeneracy_tolerance_eV: float = DEGENERACY_TOLERANCE_EV,
) -> OrbitalIrreps:
    """Irreps of orbitals, judged on the atoms of a symmetry.

    The share of an irrep is the squared norm of the projection of the orbital's Löwdin coefficients on the atoms
    judged, divided by that of the coefficients. The operations move the functions from atom to atom as in the
    symmetrised arrangement and turn them about the axes of the symmetry.

    Parameters
    ----------
    symmetry : Symmetry
        Of the coordination sphere, or of the whole molecule for exact labels.
    basis : Basis
        Functions of the fragment.
    lowdin_orbitals : (n_ao, n_mo) or (n_rows, n_mo) ndarray
        S^(1/2) C, or its rows for the functions of the atoms judged (see `functions_of_atoms`).
    energies_eV : (n_mo,) ndarray
        Ascending; orbitals closer than the tolerance count as one degenerate set [eV].
    degeneracy_tolerance_eV : float
        Tolerance [eV].

    Returns
    -------
    irreps : OrbitalIrreps
        Where a degenerate set holds several irreps, as f delta and f phi of a linear ion do, its labels stand in
        the order of the table and belong to the combinations that `parting_turns` makes.

    Raises
    ------
    ValueError
        If the symmetry exchanges atoms that carry different functions, or the rows do not match.
    """
    rows = functions_of_atoms(basis, symmetry.atoms)
    if len(lowdin_orbitals) not in (len(rows), len(basis)):
        raise ValueError(f"{len(lowdin_orbitals)} rows, expected {len(rows)} of the atoms judged or all {len(basis)}")
    chosen = lowdin_orbitals[rows] if len(lowdin_orbitals) == len(basis) else lowdin_orbitals
    adapted = adapted_functions(symmetry, basis)
    turned = _in_group_axes(chosen, basis, symmetry)
    components = adapted.combinations.T @ turned
    weights = (adapted.membership @ components**2).T
    starts = np.flatnonzero(np.diff(energies_eV, prepend=-np.inf) > degeneracy_tolerance_eV)
    shares = _set_shares(weights, starts, len(energies_eV))
    _part_mixed_sets(shares, components, adapted, starts)
    parts = _set_means(weights.sum(axis=1), starts, len(energies_eV))
    names = symmetry.group.irreps
    labels = tuple(
        names[k] if part >= SMALLEST_PART else "" for k, part in zip(shares.argmax(axis=1), parts, strict=True)
    )
    return OrbitalIrreps(labels, shares, parts)


def parting_turns(
    symmetry: Symmetry,
    basis: Basis,
    lowdin_orbitals: FloatArray,
    energies_eV: FloatArray,
    degeneracy_tolerance_eV: float = DEGENERACY_TOLERANCE_EV,
) -> tuple[tuple[slice, FloatArray], ...]:
    """Turns of the orbitals within degenerate sets of several irreps, after which each orbital has one of them.

    Parameters
    ----------
    symmetry, basis, lowdin_orbitals, energies_eV, degeneracy_tolerance_eV
        As in `orbital_irreps`.

    Returns
    -------
    turns : tuple of (slice, ndarray)
        Orbitals of each such set, and the orthogonal matrix that their columns are multiplied with from the right.
    """
    rows = functions_of_atoms(basis, symmetry.atoms)
    chosen = lowdin_orbitals[rows] if len(lowdin_orbitals) == len(basis) else lowdin_orbitals
    adapted = adapted_functions(symmetry, basis)
    starts = np.flatnonzero(np.diff(energies_eV, prepend=-np.inf) > degeneracy_tolerance_eV)
    turns = []
    for first, stop in zip(starts, np.append(starts[1:], len(energies_eV)), strict=True):
        if stop - first == 1:
            continue
        components = adapted.combinations.T @ _in_group_axes(chosen[:, first:stop], basis, symmetry)
        turn = _parting(components, adapted)
        if turn is None or len(np.unique((adapted.membership @ (components @ turn) ** 2).argmax(axis=0))) == 1:
            continue
        left, _, right = np.linalg.svd(turn)
        turns.append((slice(int(first), int(stop)), left @ right))
    return tuple(turns)


def _in_group_axes(orbitals: FloatArray, basis: Basis, symmetry: Symmetry) -> FloatArray:
    """Coefficients of the functions turned into the axes of the group, atom by atom."""
    momenta = np.array([l for atom in symmetry.atoms for l in basis.layouts[atom]])
    starts = np.concatenate([[0], np.cumsum(2 * momenta + 1)[:-1]])
    turned = np.array(orbitals)
    for l in range(1, int(momenta.max(initial=0)) + 1):
        places = starts[momenta == l]
        if len(places):
            # Y(A r), with the axes as rows of A, is the image of Y under the turn A^T.
            turn = harmonic_rotations(symmetry.axes.T[None], l)[0].T
            rows = places[:, None] + np.arange(2 * l + 1)
            turned[rows] = turn @ orbitals[rows]
    return turned


def _set_shares(weights: FloatArray, starts: IntArray, n_mo: int) -> FloatArray:
    """Shares of the irreps in each degenerate set, whatever combinations stand for it."""
    sums = np.add.reduceat(weights, starts, axis=0)
    totals = sums.sum(axis=1, keepdims=True)
    shares = np.where(totals > _NOTHING, sums / np.maximum(totals, _NOTHING), 1 / weights.shape[1])
    return np.repeat(shares, np.diff(starts, append=n_mo), axis=0)


def _set_means(values: FloatArray, starts: IntArray, n_mo: int) -> FloatArray:
    sizes = np.diff(starts, append=n_mo)
    return np.repeat(np.add.reduceat(values, starts) / sizes, sizes)


def _part_mixed_sets(shares: FloatArray, components: FloatArray, adapted: AdaptedFunctions, starts: IntArray) -> None:
    """Shares of each irrep's own orbitals in degenerate sets of more than one irrep."""
    stops = np.append(starts[1:], len(shares))
    several = (shares[starts] > _MIXED).sum(axis=1) > 1
    for first, stop in zip(starts[several], stops[several], strict=True):
        held = components[:, first:stop]
        turn = _parting(held, adapted)
        if turn is None:
            continue
        parted = (adapted.membership @ (held @ turn) ** 2).T
        labels = parted.argmax(axis=1)
        for label in np.unique(labels):
            shares[first:stop][labels == label] = parted[labels == label].mean(axis=0)


def _parting(held: FloatArray, adapted: AdaptedFunctions) -> FloatArray | None:
    """Combinations of a degenerate set with one irrep each; None if some of it is not on the atoms judged."""
    metric = held.T @ held
    if held.shape[1] == 1 or np.linalg.eigvalsh(metric)[0] < SMALLEST_PART:
        return None
    # Eigenvectors of the numbered projectors are combinations of one irrep each, as far as that is possible.
    turn: FloatArray = eigh(held.T @ (adapted.irrep_of[:, None] * held), metric)[1]
    return turn
