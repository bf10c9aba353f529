"""The ladder: which orbitals are the d-like (f-like) levels, and the effective matrix they make.

The chosen orbitals, projected on the metal's shell and symmetrically orthonormalised there, give the effective
Hamiltonian of des Cloizeaux: its eigenvalues are the orbital energies.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ehmo.analysis.bonded import BondedFunctions
from ehmo.conventions import ORBITAL_NAMES
from ehmo.errors import EhmoError
from ehmo.harmonics import harmonic_rotations
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.coordination import LocalFrame
from ehmo.records.electronic import ElectronicState
from ehmo.records.ligand_field import Ladder, LadderLevel

LEAST_SHARE = {2: 0.20, 3: 0.10}
"""Orbitals with less of the metal's d (f) shell are no levels of the ladder; fσ* of actinyls holds little f."""

BONDING_OVERLAP = 0.05
"""Metal-donor overlap population of two electrons above which an orbital counts as bonding [e]."""

_SINGULAR = 0.05
_CLEARLY = 0.005
_SAME_LEVEL_EV = 1e-3


BoolArray = NDArray[np.bool_]


class LadderError(EhmoError):
    """No ladder can be told apart from the other orbitals."""


@dataclass(frozen=True, slots=True, eq=False)
class _Shell:
    """Shell of one metal in the local axes: rows of the orthonormalised orbitals."""

    metal: int
    l: int
    label: str
    amplitudes: FloatArray
    reference_eV: float


def ladders(
    frames: Sequence[LocalFrame],
    basis: Basis,
    bonded: BondedFunctions,
    state: ElectronicState,
    overlap_population: FloatArray,
    *,
    parts: Sequence[FloatArray] = (),
    naming: Sequence[FloatArray] = (),
    counted_electrons: int | None = None,
) -> tuple[Ladder, ...]:
    """Ladder of each metal of a fragment.

    Part by part of the shell (irreps of the idealised sphere), those orbitals are taken that have at least 20 %
    of it (10 % in f shells), are antibonding or nonbonding between metal and donors, and have most of it. Where
    this puts another number of electrons in the ladder than counted, the highest such orbitals are tried (actinyls
    have a filled, nonbonding 6p-5f level), then those with most of the shell, bonding or not (d levels of
    carbonyls are bonding).

    Parameters
    ----------
    frames : sequence of LocalFrame
        The metals.
    basis : Basis
        Functions.
    bonded : BondedFunctions
        Orbitals on metals and donors.
    state : ElectronicState
        Orbitals and their filling.
    overlap_population : (n_mo,) ndarray
        Metal-donor overlap population of each orbital for two electrons [e].
    parts : sequence of (2l+1, n) ndarray
        For one metal: orthonormal columns in the local axes that span the irreps within the shell; the whole shell
        at once if empty.
    naming : sequence of (2l+1, 2l+1) ndarray
        Per metal: columns are the functions that levels are named after, in the local axes; the local functions
        themselves if empty.
    counted_electrons : int, optional
        d (f) electrons by textbook counting.

    Returns
    -------
    ladders : tuple of Ladder
        One per metal.

    Raises
    ------
    LadderError
        If a metal has no d or f shell, or too few orbitals carry it.

    References
    ----------
    .. [1] des-cloizeaux-1960: J. des Cloizeaux, Nucl. Phys. 20, 321 (1960).
    """
    shells = [_shell_of(frame, basis, bonded, state) for frame in frames]
    amplitudes = np.concatenate([shell.amplitudes for shell in shells])
    whole = (np.eye(len(amplitudes)),)
    spans = tuple(parts) if len(shells) == 1 and parts else whole
    least = min(LEAST_SHARE[shell.l] for shell in shells)
    not_bonding = overlap_population <= BONDING_OVERLAP
    everything = np.ones(len(overlap_population), dtype=bool)
    ways = (
        (not_bonding, False, "antibonding or nonbonding orbitals with most of the shell"),
        (not_bonding, True, "the highest antibonding or nonbonding orbitals, which hold the counted electrons"),
        (everything, False, "orbitals with most of the shell, bonding or not, which hold the counted electrons"),
    )
    filling = state.occupations.sum(axis=0)
    chosen, selection = None, ""
    for allowed, by_energy, said in ways:
        found = _choice(amplitudes, spans, allowed, least, by_energy=by_energy)
        if found is not None and (chosen is None or _holds(found, filling, counted_electrons)):
            chosen, selection = found, said
        if counted_electrons is None or _holds(chosen, filling, counted_electrons):
            break
    if chosen is None:
        raise LadderError(
            f"fewer than {len(amplitudes)} orbitals are nonbonding or antibonding with at least "
            f"{100 * least:.0f} % of the metal's shell",
            mend="read the frontier orbitals one by one",
        )
    projected = amplitudes[:, chosen]
    frame_of_orbitals = _orthonormal(projected)
    matrix = (frame_of_orbitals * state.energies_eV[chosen]) @ frame_of_orbitals.T
    bonding = overlap_population > BONDING_OVERLAP
    bonding[chosen] = False
    orbitals = _Chosen(
        places=chosen,
        filling=filling[chosen],
        donors=bonded.lowdin_orbitals[~bonded.on_metals][:, chosen],
        overlap_population=overlap_population[chosen],
        alone=len(shells) == 1,
    )
    result, start = [], 0
    for place, shell in enumerate(shells):
        own = slice(start, start + 2 * shell.l + 1)
        start = own.stop
        names = naming[place] if naming else np.eye(2 * shell.l + 1)
        energies, vectors = _named_levels(matrix[own, own], names)
        ladder = Ladder(
            shell.metal,
            shell.label,
            _levels(shell, energies, vectors, names, frame_of_orbitals[own], orbitals, bonding),
            matrix[own, own],
            vectors,
            shell.reference_eV,
            selection,
            tuple(int(k) for k in chosen),
        )
        result.append(ladder)
    return tuple(result)


@dataclass(frozen=True, slots=True, eq=False)
class _Chosen:
    """The orbitals of the ladder: their places, filling, donor rows and metal-donor overlap populations."""

    places: IntArray
    filling: FloatArray
    donors: FloatArray
    overlap_population: FloatArray
    alone: bool


def _shell_of(frame: LocalFrame, basis: Basis, bonded: BondedFunctions, state: ElectronicState) -> _Shell:
    layout = basis.layouts[frame.metal]
    l = 3 if 3 in layout else 2
    if l not in layout:
        raise LadderError(
            f"the parameter set gives {basis.symbols[frame.metal]} no d or f functions",
            mend="read the frontier orbitals instead",
        )
    first_shell = int(np.searchsorted(basis.shell_atom, frame.metal))
    place = max((k for k, shell in enumerate(layout) if shell == l), key=lambda k: int(basis.shell_n[first_shell + k]))
    start = int(bonded.start[frame.metal]) + sum(2 * shell + 1 for shell in layout[:place])
    rows = slice(start, start + 2 * l + 1)
    turn = harmonic_rotations(frame.axes.T[None], l)[0].T
    seen = bonded.overlap_orbitals[rows]
    diagonal = np.einsum("ik,k,ik->i", seen, state.energies_eV, seen)
    return _Shell(
        frame.metal,
        l,
        basis.shell_label(first_shell + place),
        turn @ bonded.lowdin_orbitals[rows],
        float(diagonal.mean()),
    )


def _choice(
    amplitudes: FloatArray, spans: Sequence[FloatArray], allowed: BoolArray, least: float, *, by_energy: bool
) -> IntArray | None:
    """Orbitals that carry each part best: as many as its functions, linearly independent in it."""
    chosen: list[int] = []
    for span in spans:
        parts = span.T @ amplitudes
        candidates = np.flatnonzero(allowed & ((parts**2).sum(axis=0) >= least))
        candidates = candidates[~np.isin(candidates, chosen)]
        picked = _independent(parts[:, candidates], least, by_energy=by_energy)
        if picked is None:
            return None
        chosen.extend(int(k) for k in candidates[picked])
    return np.sort(np.array(chosen, dtype=np.intp))


def _independent(columns: FloatArray, least: float, *, by_energy: bool) -> list[int] | None:
    """As many columns as rows: the last ones or the largest, each with enough outside the span of those before."""
    rest = columns.copy()
    picked: list[int] = []
    for _ in range(len(columns)):
        norms = (rest**2).sum(axis=0)
        fit = np.flatnonzero(norms >= least / 2)
        if not len(fit):
            return None
        best = int(fit[-1] if by_energy else norms.argmax())
        picked.append(best)
        direction = rest[:, best] / np.sqrt(norms[best])
        rest -= np.outer(direction, direction @ rest)
        rest[:, best] = 0.0
    return picked


def _holds(chosen: IntArray | None, filling: FloatArray, electrons: int | None) -> bool:
    return chosen is not None and electrons is not None and abs(float(filling[chosen].sum()) - electrons) < 0.5


def _orthonormal(projected: FloatArray) -> FloatArray:
    """Projections of the chosen orbitals on the shells, symmetrically orthonormalised."""
    left, singular, right = np.linalg.svd(projected)
    if singular[-1] < _SINGULAR:
        raise LadderError(
            "two of the chosen orbitals are alike on the metal", mend="read the frontier orbitals one by one"
        )
    orthonormal: FloatArray = left @ right
    return orthonormal


def _named_levels(field: FloatArray, names: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Eigenvalues and vectors; within a degenerate set the vectors are turned towards the named functions."""
    field = (field + field.T) / 2
    energies, vectors = np.linalg.eigh(field)
    for members in _degenerate(energies):
        if len(members) == 1:
            continue
        held = vectors[:, members]
        weights = ((names.T @ held) ** 2).sum(axis=1)
        # The set's own functions: as many as it has members, in their usual order.
        functions = np.sort(np.argsort(-np.round(weights, 6), kind="stable")[: len(members)])
        left, _, right = np.linalg.svd(held.T @ names[:, functions])
        vectors[:, members] = held @ (left @ right)
    return energies, vectors


def _degenerate(energies: FloatArray) -> list[IntArray]:
    """Places of the levels, those of one energy together."""
    starts = np.flatnonzero(np.diff(energies, prepend=-np.inf) > _SAME_LEVEL_EV)
    return np.split(np.arange(len(energies)), starts[1:])


def _levels(
    shell: _Shell,
    energies: FloatArray,
    vectors: FloatArray,
    names: FloatArray,
    orbital_frame: FloatArray,
    orbitals: _Chosen,
    bonding: BoolArray,
) -> tuple[LadderLevel, ...]:
    """Levels of one metal: each is the combination of the chosen orbitals that its vector stands for."""
    parts = orbital_frame.T @ vectors
    on_shell = shell.amplitudes[:, orbitals.places] @ parts
    on_donors = orbitals.donors @ parts
    partners = np.zeros(len(energies))
    for members in _degenerate(energies):
        if bonding.any():
            held = vectors[:, members].T @ shell.amplitudes[:, bonding]
            partners[members] = float((held**2).sum(axis=0).max())
    levels = []
    free = list(range(len(orbitals.places)))
    for k in range(len(energies)):
        named = (names.T @ vectors[:, k]) ** 2
        leading = int(named.argmax())
        share = float((on_shell[:, k] ** 2).sum())
        orbital = None
        if orbitals.alone:
            # Within a degenerate set any member will do, but each only once.
            place = max(free, key=lambda place: parts[place, k] ** 2)
            free.remove(place)
            orbital = int(orbitals.places[place])
        levels.append(
            LadderLevel(
                function=ORBITAL_NAMES[shell.l][leading],
                function_share=float(named[leading]),
                energy_eV=float(energies[k]),
                orbital=orbital,
                electrons=float(parts[:, k] ** 2 @ orbitals.filling),
                metal_share=share,
                donor_share=float((on_donors[:, k] ** 2).sum()),
                overlap_population=float(parts[:, k] ** 2 @ orbitals.overlap_population),
                inverted=float(partners[k]) > share + _CLEARLY,
                partner_share=float(partners[k]),
            )
        )
    return tuple(levels)
