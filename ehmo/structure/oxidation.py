"""Oxidation states of the metals: actinyl lengths, the eighteen-electron rule, bond-valence sums."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from basis_params.bond_valence import BondValence, bond_valence_R0
from ehmo.records.coordination import Coordination, DonorKind, MetalDonorBond
from ehmo.records.fragment import Fragment
from ehmo.structure.elements import ACTINIDES, LANTHANIDES, OXIDATION_STATES, valence_d_or_f_electrons, with_state

MAX_DEVIATION: Final = 0.75
"""A bond-valence sum farther from every usual oxidation state decides nothing [valence units]."""

MAX_OPEN_DEVIATION: Final = 0.35
"""The same for a state that keeps d electrons: bond valences of such ions scatter less [valence units]."""

MIN_MARGIN: Final = 0.10
"""The best oxidation state must beat the next by this much [valence units]."""

MAX_SHORTFALL: Final = 1.25
"""Bond-valence sums of d0 centres with several multiple bonds fall short by up to this (OsO4 1.0) [valence units]."""

ACTINYL_VI_A: Final = 1.80
"""Actinyl(VI) bonds are shorter (1.73-1.80), actinyl(V) bonds longer (1.81-1.88) (common practice) [angstrom]."""

MIN_OXO_STATE: Final = 4
"""Terminal oxo and nitrido ligands need at least this oxidation state (common practice)."""

MAX_ION_CHARGE: Final = 3
"""Complex ions of one d-block metal beyond group 4 carry no higher charge (common practice)."""

_ACCEPTORS: Final = frozenset(
    {DonorKind.CARBONYL, DonorKind.NITROSYL_LINEAR, DonorKind.NITROSYL_BENT, DonorKind.SIDE_ON_CARBON}
)
_TERMINAL: Final = frozenset({DonorKind.OXO, DonorKind.NITRIDO})


@dataclass(frozen=True, slots=True)
class OxidationGuess:
    """Oxidation state of one metal; None where nothing decides, with the reason why."""

    state: int | None
    reason: str


def oxidation_guess(fragment: Fragment, coordination: Coordination, metal: int) -> OxidationGuess:
    """Oxidation state of one metal from its bonds.

    Actinyls go by their bond length, complexes of carbon monoxide, nitric oxide and side-on carbon by the eighteen-
    electron rule, all others by the usual oxidation state whose bond-valence sum comes nearest to it.

    Parameters
    ----------
    fragment : Fragment
    coordination : Coordination
    metal : int
        Atom index.

    Returns
    -------
    guess : OxidationGuess

    References
    ----------
    brown-1985
    """
    bonds = coordination.bonds_of(metal)
    oxo = [bond for bond in bonds if bond.kind is DonorKind.OXO]
    if fragment.symbols[metal] in ACTINIDES and len(oxo) == 2 and _trans(fragment, oxo):
        return _actinyl(fragment, metal, oxo)
    if len(coordination.metals) == 1 and any(bond.kind in _ACCEPTORS for bond in bonds) and not oxo:
        return _eighteen_electrons(fragment, coordination, metal)
    return _by_bond_valence(fragment, coordination, metal)


def _trans(fragment: Fragment, pair: list[MetalDonorBond]) -> bool:
    a, b = (fragment.positions_A[bond.donor] - fragment.positions_A[bond.metal] for bond in pair)
    return bool(a @ b < -0.9 * np.linalg.norm(a) * np.linalg.norm(b))


def _actinyl(fragment: Fragment, metal: int, oxo: list[MetalDonorBond]) -> OxidationGuess:
    mean = (oxo[0].length_A + oxo[1].length_A) / 2.0
    state = 6 if mean < ACTINYL_VI_A else 5
    symbol = fragment.symbols[metal]
    return OxidationGuess(
        state, f"actinyl bonds of {fragment.labels[metal]}, {mean:.2f} A, so {with_state(symbol, state)}"
    )


def _eighteen_electrons(fragment: Fragment, coordination: Coordination, metal: int) -> OxidationGuess:
    """Oxidation state that leaves 18 valence electrons with closed-shell ligands."""
    symbol, label = fragment.symbols[metal], fragment.labels[metal]
    bonds = coordination.bonds_of(metal)
    side_on = {bond.ligand for bond in bonds if bond.kind is DonorKind.SIDE_ON_CARBON}
    donated = sum(_donated(coordination, bond) for bond in bonds if bond.kind is not DonorKind.SIDE_ON_CARBON)
    for ligand in side_on:
        carbons = sum(bond.ligand == ligand and bond.kind is DonorKind.SIDE_ON_CARBON for bond in bonds)
        # Closed-shell polyenes and polyenyl anions: C2 2, C3 4, C4 4, C5 6, C6 6 electrons.
        donated += 2 * ((carbons + 1) // 2)
    group = valence_d_or_f_electrons(symbol, 0)
    state = None if group is None else group - (18 - donated)
    if state is None or symbol in LANTHANIDES | ACTINIDES or not -2 <= state <= (group or 0):
        return OxidationGuess(None, f"the eighteen-electron rule gives {label} no sensible oxidation state")
    return OxidationGuess(state, f"eighteen-electron rule for {label}, so {with_state(symbol, state)}")


def _donated(coordination: Coordination, bond: MetalDonorBond) -> int:
    """Electrons of one donor as a closed shell: multiply bonded anions give a pair per charge."""
    charge = coordination.ligands[bond.ligand].charge or 0
    return 2 * max(1, -charge) if bond.may_be_multiple else 2


def _by_bond_valence(fragment: Fragment, coordination: Coordination, metal: int) -> OxidationGuess:
    symbol, label = fragment.symbols[metal], fragment.labels[metal]
    bonds = coordination.bonds_of(metal)
    trans = [bond for bond in bonds if bond.kind is DonorKind.OXO]
    trans_dioxo = len(trans) == 2 and _trans(fragment, trans)
    if (
        any(bond.kind is DonorKind.CYANIDO for bond in bonds)
        and any(b.may_be_multiple for b in bonds)
        and not trans_dioxo
    ):
        return OxidationGuess(None, f"bond valences do not tell the state of {label} beside cyanido ligands")
    sums: dict[int, float] = {}
    estimated = False
    for state in _candidates(fragment, coordination, metal):
        rows = _rows(fragment, bonds, state)
        if rows is None:
            return OxidationGuess(None, f"there are no bond-valence parameters for all bonds of {label}")
        sums[state] = sum(row.valence(bond.length_A) for row, bond in zip(rows, bonds, strict=True))
        estimated = estimated or any(row.oxidation_state is None for row in rows)
    if not sums or not bonds:
        return OxidationGuess(None, f"no usual oxidation state of {label} is known")
    ranked = sorted(sums, key=lambda state: abs(sums[state] - state))
    empty = next((state for state in sums if valence_d_or_f_electrons(symbol, state) == 0), None)
    best = ranked[0]
    if sum(bond.may_be_multiple for bond in bonds) >= 2 and empty is not None and best != empty:
        if empty - sums[empty] > MAX_SHORTFALL:
            return OxidationGuess(None, f"bond valences fall short at the multiple bonds of {label}")
        return OxidationGuess(
            empty,
            f"several multiple bonds, bond-valence sum of {label} {sums[empty]:.2f}, so {with_state(symbol, empty)}",
        )
    runner_up = abs(sums[ranked[1]] - ranked[1]) if len(ranked) > 1 else np.inf
    deviation = abs(sums[best] - best)
    if (
        deviation > (MAX_DEVIATION if best == empty or trans_dioxo else MAX_OPEN_DEVIATION)
        or runner_up - deviation < MIN_MARGIN
        or (estimated and best != empty and len(sums) > 1)
    ):
        return OxidationGuess(
            None, f"the bond-valence sum of {label}, {sums[best]:.2f} for {with_state(symbol, best)}, does not decide"
        )
    return OxidationGuess(best, f"bond-valence sum of {label} {sums[best]:.2f}, so {with_state(symbol, best)}")


def bond_valence_sum(fragment: Fragment, coordination: Coordination, metal: int, state: int | None) -> float | None:
    """Sum of the bond valences about a metal.

    Parameters
    ----------
    fragment : Fragment
    coordination : Coordination
    metal : int
        Atom index.
    state : int or None
        Oxidation state whose parameters are taken, or the nearest tabulated ones.

    Returns
    -------
    total : float or None
        None where a pair of elements has no parameters, and for carbon donors, whose bonds do not follow
        valences [valence units].

    References
    ----------
    brown-1985
    """
    bonds = coordination.bonds_of(metal)
    if not bonds or any(fragment.symbols[bond.donor] == "C" for bond in bonds):
        return None
    try:
        rows = [bond_valence_R0(fragment.symbols[b.metal], fragment.symbols[b.donor], state) for b in bonds]
    except KeyError:
        return None
    return sum(row.valence(bond.length_A) for row, bond in zip(rows, bonds, strict=True))


def _candidates(fragment: Fragment, coordination: Coordination, metal: int) -> list[int]:
    """Usual positive oxidation states that the ligands and the charge of the ion allow."""
    symbol = fragment.symbols[metal]
    low = MIN_OXO_STATE if any(bond.kind in _TERMINAL for bond in coordination.bonds_of(metal)) else 1
    high = 8
    beyond_group_4 = (valence_d_or_f_electrons(symbol, 4) or 0) > 0
    if len(coordination.metals) == 1 and beyond_group_4 and symbol not in LANTHANIDES | ACTINIDES:
        high = MAX_ION_CHARGE - sum(ligand.charge or 0 for ligand in coordination.ligands)
    states = [state for state in OXIDATION_STATES.get(symbol, ()) if low <= state <= high]
    oxo = [bond for bond in coordination.bonds_of(metal) if bond.kind is DonorKind.OXO]
    if len(oxo) == 2 and len(coordination.bonds_of(metal)) > 2 and _trans(fragment, oxo):
        # Two oxo ligands share the pi functions when cis (d0), and leave dxy filled when trans (d2; common practice).
        states = [state for state in states if valence_d_or_f_electrons(symbol, state) == 2] or states
    return states


def _rows(fragment: Fragment, bonds: tuple[MetalDonorBond, ...], state: int) -> list[BondValence] | None:
    try:
        return [bond_valence_R0(fragment.symbols[b.metal], fragment.symbols[b.donor], state) for b in bonds]
    except KeyError:
        return None
