"""Charges of molecules and networks from the neutrality of the crystal."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

from ehmo.errors import EhmoError
from ehmo.records.crystal import CrystalSpecies
from ehmo.records.fragment import Fragment
from ehmo.records.wording import signed
from ehmo.structure.electrons import charge_guess
from ehmo.structure.perceive import perceive
from ehmo.structure.periodic import StatedFacts
from ehmo.structure.species import species_in_words

MAX_FRACTION: Final = 0.15
"""A balance farther from a whole number than this decides nothing [e]."""

MAX_GUESSED_ATOMS: Final = 600
"""Larger molecules are left without a guess of their own beside the balance."""


@dataclass(frozen=True, slots=True)
class CrystalUnit:
    """One kind of molecule or network with metals, for the balance.

    Attributes
    ----------
    formula : str
    count : float
        In the unit cell, weighted with the occupancy.
    incomplete : bool
        Whether it lacks hydrogens.
    mixed : bool
        Whether one of its sites stands for two elements.
    labelled_charge : int or None
        Sum of the oxidation numbers that the file gives its atoms.
    fragment : Fragment or None
        Its atoms; None for a network.
    """

    formula: str
    count: float
    incomplete: bool
    mixed: bool
    labelled_charge: int | None
    fragment: Fragment | None


@dataclass(frozen=True, slots=True)
class Balance:
    """Charge of one unit and where it comes from; None where the crystal does not tell.

    `notes` say what could not be done, `doubts` what disagrees.
    """

    charge: int | None
    reason: str
    notes: tuple[str, ...] = ()
    doubts: tuple[str, ...] = ()


def balance_charges(
    units: Sequence[CrystalUnit], species: Sequence[CrystalSpecies], facts: StatedFacts
) -> list[Balance]:
    """Charges of the units of a crystal.

    What the author states in the moiety formula comes first, then the balance against counter-ions, then the sum
    of the oxidation numbers in the file. Where several kinds of units share the crystal, those whose charge bond
    valences tell leave the rest to the last one.

    Parameters
    ----------
    units : sequence of CrystalUnit
    species : sequence of CrystalSpecies
        Counter-ions and solvent.
    facts : StatedFacts

    Returns
    -------
    balances : list of Balance
        One per unit.
    """
    guesses = [_guess(unit) for unit in units]
    stated = [facts.moieties.get(unit.formula) if unit.fragment is not None else None for unit in units]
    obstacle = _obstacle(units, species, facts)
    found: list[Balance] = []
    for k, unit in enumerate(units):
        balanced = None if obstacle else _rest(k, units, species, guesses, stated)
        if unit.fragment is not None and not facts.deposited and not any(one.charge for one in species):
            balanced = None
        found.append(_decided(unit, stated[k], balanced, guesses[k], species, obstacle))
    return found


def _guess(unit: CrystalUnit) -> int | None:
    """Charge by bond valences alone."""
    if unit.fragment is None or unit.incomplete or len(unit.fragment) > MAX_GUESSED_ATOMS:
        return None
    try:
        return charge_guess(unit.fragment, perceive(unit.fragment))
    except EhmoError:
        return None


def _obstacle(units: Sequence[CrystalUnit], species: Sequence[CrystalSpecies], facts: StatedFacts) -> str:
    """Why the crystal cannot be balanced; empty if it can."""
    if facts.masked:
        return "solvent was masked in the refinement, so ions may be missing"
    if any(unit.mixed for unit in units):
        return "two elements share a site"
    unknown = next((s for s in species if s.charge is None), None)
    if unknown is not None:
        return f"the charge of {unknown.formula} cannot be told"
    lacking = next((unit for unit in units if unit.incomplete), None)
    return f"{lacking.formula} lacks hydrogens" if lacking is not None else ""


def _rest(
    k: int,
    units: Sequence[CrystalUnit],
    species: Sequence[CrystalSpecies],
    guesses: Sequence[int | None],
    stated: Sequence[int | None],
) -> float | None:
    """Charge that is left for one unit; None where another one is open too."""
    total = sum((s.charge or 0) * s.count for s in species)
    for other, unit in enumerate(units):
        if other != k:
            known = stated[other] if stated[other] is not None else guesses[other]
            if known is None:
                return None
            total += known * unit.count
    return -total / units[k].count if units[k].count else None


def _decided(
    unit: CrystalUnit,
    stated: int | None,
    balanced: float | None,
    guess: int | None,
    species: Sequence[CrystalSpecies],
    obstacle: str,
) -> Balance:
    whole = None if balanced is None or abs(balanced - round(balanced)) > MAX_FRACTION else round(balanced)
    if stated is not None and not unit.incomplete:
        doubts: tuple[str, ...] = ()
        if whole is not None and whole != stated:
            doubts = (f"The moiety formula gives the charge {signed(stated)}, the balance {signed(whole)}.",)
        return Balance(stated, "moiety formula of the file", doubts=doubts)
    if whole is not None:
        against = species_in_words([s for s in species if s.charge], unit.count)
        reason = f"balance of the crystal: {against} for each" if against else "balance of the crystal: no counter-ions"
        if guess is not None and guess != whole:
            said = f"bond valences alone give the charge {signed(guess)}"
            if not against:
                # Without any counter-ion the file may just lack it.
                return Balance(None, "", doubts=(f"Without counter-ions the crystal asks for the charge 0, {said}.",))
            return Balance(whole, reason, doubts=(f"The balance of the crystal gives {signed(whole)}, {said}.",))
        return Balance(whole, reason)
    if unit.labelled_charge is not None and not unit.incomplete and guess is None:
        return Balance(unit.labelled_charge, "sum of the oxidation numbers in the file")
    notes = (f"No balance of charges: {obstacle}.",) if obstacle else ()
    return Balance(None, "", notes)
