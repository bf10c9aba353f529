"""Bond order by textbook counting."""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction


@dataclass(frozen=True, slots=True)
class FormalOrder:
    """(bonding - antibonding electrons)/2 of one bond, limited by symmetry.

    Attributes
    ----------
    order : Fraction
    sigma, pi : Fraction
        Its parts.
    words : str
        Such as ``triple: one sigma, two pi``.
    rule : str
        How it was counted, where that is debatable.
    """

    order: Fraction
    sigma: Fraction
    pi: Fraction
    words: str
    rule: str
