"""Oxidation states of the metals from bond valences."""

from __future__ import annotations

from dataclasses import dataclass
from math import exp
from typing import Final

from basis_params.bond_valence import bond_valence_R0
from ehmo.records.coordination import Coordination
from ehmo.records.fragment import Fragment
from ehmo.structure.elements import OXIDATION_STATES

MAX_DEVIATION: Final = 0.75
"""A bond-valence sum farther from every usual oxidation state decides nothing [valence units]."""

MIN_MARGIN: Final = 0.10
"""The best oxidation state must beat the next by this much [valence units]."""


@dataclass(frozen=True, slots=True)
class OxidationGuess:
    """Oxidation state of one metal by its bond-valence sum; None where the sum does not decide."""

    state: int | None
    reason: str


def oxidation_guess(fragment: Fragment, coordination: Coordination, metal: int) -> OxidationGuess:
    """Usual oxidation state whose own bond-valence sum comes nearest to it.

    Parameters
    ----------
    fragment : Fragment
    coordination : Coordination
    metal : int
        Atom index.

    References
    ----------
    brown-1985
    """
    symbol, label = fragment.symbols[metal], fragment.labels[metal]
    states = [state for state in OXIDATION_STATES.get(symbol, ()) if state > 0]
    sums = {state: total for state in states if (total := _valence_sum(fragment, coordination, metal, state))}
    if not sums:
        return OxidationGuess(None, f"no bond-valence parameters for all bonds of {label}")
    ranked = sorted(sums, key=lambda state: abs(sums[state] - state))
    best = ranked[0]
    deviation = abs(sums[best] - best)
    if deviation > MAX_DEVIATION:
        return OxidationGuess(None, f"the bond-valence sum of {label}, {sums[best]:.2f}, fits no usual oxidation state")
    if len(ranked) > 1 and abs(sums[ranked[1]] - ranked[1]) - deviation < MIN_MARGIN:
        return OxidationGuess(
            None,
            f"the bond-valence sum of {label}, {sums[best]:.2f}, fits {symbol}({best:+d}) and"
            f" {symbol}({ranked[1]:+d}) alike",
        )
    return OxidationGuess(best, f"bond-valence sum of {label} {sums[best]:.2f}, so {symbol}({best:+d})")


def _valence_sum(fragment: Fragment, coordination: Coordination, metal: int, state: int) -> float | None:
    """Bond-valence sum of a metal; None where a bond has no fitted or estimated R0."""
    total = 0.0
    for bond in coordination.bonds_of(metal):
        try:
            row = bond_valence_R0(fragment.symbols[metal], fragment.symbols[bond.donor], state)
        except KeyError:
            return None
        total += exp((row.R0_A - bond.length_A) / row.B_A)
    return total or None
