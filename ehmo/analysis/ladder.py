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
_CLEARLY = 0.01


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
    least = LEAST_SHARE[shells[0].l]
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
    matrix = _effective_matrix(amplitudes[:, chosen], state.energies_eV[chosen])
    bonding = overlap_population > BONDING_OVERLAP
    bonding[chosen] = False
    partners = _partner_shares(amplitudes, spans, bonding)
    result, start = [], 0
    for shell in shells:
        own = slice(start, start + 2 * shell.l + 1)
        start = own.stop
        result.append(
            _ladder(
                shell,
                matrix[own, own],
                chosen,
                len(shells) == 1,
                filling,
                bonded,
                partners[own],
                overlap_population,
                selection,
            )
        )
    return tuple(result)


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


def _effective_matrix(amplitudes: FloatArray, energies: FloatArray) -> FloatArray:
    """W E W^T with W the symmetrically orthonormalised projections."""
    left, singular, right = np.linalg.svd(amplitudes)
    if singular[-1] < _SINGULAR:
        raise LadderError(
            "two of the chosen orbitals are alike on the metal", mend="read the frontier orbitals one by one"
        )
    orthonormal = left @ right
    matrix: FloatArray = (orthonormal * energies) @ orthonormal.T
    return (matrix + matrix.T) / 2


def _partner_shares(amplitudes: FloatArray, spans: Sequence[FloatArray], bonding: BoolArray) -> FloatArray:
    """For each function, the largest share of its part in a bonding orbital."""
    shares = np.zeros(len(amplitudes))
    if bonding.any():
        for span in spans:
            best = float(((span.T @ amplitudes[:, bonding]) ** 2).sum(axis=0).max())
            shares += (span**2).sum(axis=1) * best
    return shares


def _ladder(
    shell: _Shell,
    field: FloatArray,
    chosen: IntArray,
    alone: bool,
    filling: FloatArray,
    bonded: BondedFunctions,
    partners: FloatArray,
    overlap_population: FloatArray,
    selection: str,
) -> Ladder:
    energies, vectors = np.linalg.eigh(field)
    shares = (shell.amplitudes[:, chosen] ** 2).sum(axis=0)
    donors = (bonded.lowdin_orbitals[~bonded.on_metals][:, chosen] ** 2).sum(axis=0)
    levels = []
    for k in range(len(energies)):
        # With several metals a level of one is spread over the orbitals: weigh them by its part in each.
        weights = (vectors[:, k] @ shell.amplitudes[:, chosen]) ** 2
        weights = weights / weights.sum() if not alone else np.eye(len(chosen))[k]
        leading = int((vectors[:, k] ** 2).argmax())
        partner = float(partners @ vectors[:, k] ** 2)
        share = float(weights @ shares)
        levels.append(
            LadderLevel(
                function=ORBITAL_NAMES[shell.l][leading],
                function_share=float(vectors[leading, k] ** 2),
                energy_eV=float(energies[k]),
                orbital=int(chosen[k]) if alone else None,
                electrons=float(weights @ filling[chosen]),
                metal_share=share,
                donor_share=float(weights @ donors),
                overlap_population=float(weights @ overlap_population[chosen]),
                inverted=partner > share + _CLEARLY,
                partner_share=partner,
            )
        )
    return Ladder(shell.metal, shell.label, tuple(levels), field, vectors, shell.reference_eV, selection)
