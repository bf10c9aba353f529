"""How a multiply bonded donor may react, read from its charge and frontier orbitals."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Literal

Leaning = Literal["nucleophilic", "leans nucleophilic", "between", "leans electrophilic", "electrophilic"]

REACTIVITY_LIMITS: Final = (
    "The leaning of a donor is read from charges and frontier orbitals of one gas-phase calculation; compare it "
    "within a series, and expect solvent, counter-ions and strain to shift it."
)


@dataclass(frozen=True, slots=True)
class DonorReactivity:
    """Reading of one multiply bonded donor.

    Attributes
    ----------
    bond : int
        Place of its bond in the report.
    charge : float
        Mulliken charge of the donor [e].
    homo_share, lumo_share : float
        Donor p part of the highest filled and the lowest empty level, mean over degenerate orbitals.
    pi_star_eV : float or None
        Energy of the lowest level that is not full and is pi antibonding in this bond [eV].
    pi_star_gap_eV : float or None
        The same above the highest filled level with at least 10 % on this donor [eV].
    leaning : str
        From "nucleophilic" to "electrophilic".
    """

    bond: int
    charge: float
    homo_share: float
    lumo_share: float
    pi_star_eV: float | None
    pi_star_gap_eV: float | None
    leaning: Leaning
