"""Charge and unpaired electrons of a fragment: given, or guessed with the reason stated."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import combinations
from typing import Final

import numpy as np

from ehmo.errors import ElectronCountError
from ehmo.records.coordination import Coordination, DonorKind, ElectronAssignment
from ehmo.records.fragment import Fragment
from ehmo.structure.elements import (
    F_BLOCK,
    LANTHANIDES,
    OXIDATION_STATES,
    TRANSITION_METALS,
    atomic_number,
    covalent_radius_A,
    valence_d_or_f_electrons,
    with_state,
)
from ehmo.structure.oxidation import oxidation_guess

MAX_CHARGE: Final = 100
"""Charges beyond this are taken for mistakes."""

_HUND_F: Final = (1, 2, 3)

_METAL_CONTACT: Final = 1.25
"""Metals nearer than this times the sum of their covalent radii may be bonded and pair their spins."""


@dataclass(frozen=True, slots=True)
class _Choice:
    value: int
    reason: str
    candidates: tuple[int, ...] = ()


def assign_electrons(
    fragment: Fragment,
    coordination: Coordination,
    charge: int | None = None,
    unpaired: int | None = None,
    oxidation_state: int | None = None,
) -> ElectronAssignment:
    """Charge and unpaired electrons of a fragment.

    What is given here wins over what the file states; what neither gives is guessed, with the reasoning in
    words, or refused with the candidates named. Where counting leaves several spin states of a d shell open, the
    lowest is taken for the time being and all are listed for the ladder to decide.

    Parameters
    ----------
    fragment : Fragment
    coordination : Coordination
        Of the same fragment.
    charge, unpaired : int or None
        Total charge and number of unpaired electrons.
    oxidation_state : int or None
        Overrides counting, for a fragment with one metal.

    Returns
    -------
    assignment : ElectronAssignment

    Raises
    ------
    ElectronCountError
        If the values do not fit the atoms or each other, or cannot be guessed.
    """
    place = fragment.source or "fragment"
    total = _charge(fragment, coordination, charge, unpaired, place)
    _check_charge(fragment, total.value, place)
    oxidation = _oxidation_total(coordination, total.value) if oxidation_state is None else oxidation_state
    count = _metal_electrons(fragment, coordination, oxidation, place)
    spin = _unpaired(fragment, coordination, total.value, unpaired, count, place)
    return ElectronAssignment(
        charge=total.value,
        unpaired_electrons=spin.value,
        charge_reason=total.reason,
        unpaired_reason=spin.reason,
        metal_oxidation_total=oxidation,
        d_electrons=count,
        spin_candidates=spin.candidates,
    )


def charge_guess(fragment: Fragment, coordination: Coordination) -> int:
    """Charge by ligand charges and bond valences alone, whatever the fragment states.

    Raises
    ------
    ElectronCountError
        If they do not decide.
    """
    return _charge(replace(fragment, charge=None), coordination, None, None, fragment.source or "fragment").value


def _electrons(fragment: Fragment, charge: int) -> int:
    return sum(atomic_number(symbol) for symbol in fragment.symbols) - charge


def _charge(
    fragment: Fragment, coordination: Coordination, given: int | None, unpaired: int | None, place: str
) -> _Choice:
    if given is not None:
        return _Choice(given, "given")
    if fragment.charge is not None:
        return _Choice(fragment.charge, fragment.charge_reason or "given in the file")
    doubtful = [
        bond for bond in coordination.bonds if bond.kind in (DonorKind.HYDROXO_DOUBTFUL, DonorKind.AQUA_DOUBTFUL)
    ]
    if doubtful:
        raise ElectronCountError(
            f"no charge is given and {fragment.labels[doubtful[0].donor]} may lack hydrogen ({doubtful[0].kind.value})",
            place=place,
            mend="add the hydrogens (--hydrogens place) or give the charge",
        )
    unknown = [ligand for ligand in coordination.ligands if ligand.charge is None]
    if unknown:
        raise ElectronCountError(
            f"no charge is given and that of the ligand {unknown[0].formula} cannot be told"
            f" ({unknown[0].charge_reason})",
            place=place,
            mend="give the charge" + ", or add them (--hydrogens place)" * ("hydrogens" in unknown[0].charge_reason),
        )
    return _guessed_charge(fragment, coordination, _stated_unpaired(fragment, unpaired), place)


def _guessed_charge(fragment: Fragment, coordination: Coordination, unpaired: int | None, place: str) -> _Choice:
    ligands = sum(ligand.charge or 0 for ligand in coordination.ligands)
    guesses = [oxidation_guess(fragment, coordination, metal) for metal in coordination.metals]
    undecided = next((guess for guess in guesses if guess.state is None), None)
    if undecided is not None:
        raise ElectronCountError(
            f"no charge is given and {undecided.reason}",
            place=place,
            mend=f"give the charge{_charge_candidates(fragment, coordination, ligands)}",
        )
    charge = ligands + sum(guess.state or 0 for guess in guesses)
    reasons = "; ".join(guess.reason for guess in guesses)
    if unpaired is not None and (_electrons(fragment, charge) - unpaired) % 2:
        raise ElectronCountError(
            f"no charge is given; the guess {charge:+d} ({reasons}) does not fit {unpaired} unpaired electrons",
            place=place,
            mend="give the charge",
        )
    return _Choice(charge, f"guessed: {reasons}; ligands {ligands:+d} in all")


def _charge_candidates(fragment: Fragment, coordination: Coordination, ligands: int) -> str:
    """Charges by the usual oxidation states of a single metal, as words for a message."""
    if len(coordination.metals) != 1:
        return ""
    symbol = fragment.symbols[coordination.metals[0]]
    states = OXIDATION_STATES.get(symbol, ())
    listed = ", ".join(f"{ligands + state:+d} for {with_state(symbol, state)}" for state in states)
    return f": {listed}" if listed else ""


def _check_charge(fragment: Fragment, charge: int, place: str) -> None:
    if abs(charge) > MAX_CHARGE or _electrons(fragment, charge) < 0:
        raise ElectronCountError(
            f"charge {charge:+d} is impossible for {fragment.formula}", place=place, mend="correct the charge"
        )


def _oxidation_total(coordination: Coordination, charge: int) -> int | None:
    charges = [ligand.charge for ligand in coordination.ligands]
    return None if None in charges else charge - sum(c for c in charges if c is not None)


def _metal_electrons(fragment: Fragment, coordination: Coordination, oxidation: int | None, place: str) -> int | None:
    """Valence d or f electrons of a single metal; counted ones below zero mean a wrong charge."""
    if oxidation is None or len(coordination.metals) != 1:
        return None
    symbol = fragment.symbols[coordination.metals[0]]
    count = valence_d_or_f_electrons(symbol, oxidation)
    if count is not None and count < 0 and _counts_are_firm(coordination):
        raise ElectronCountError(
            f"the charge asks for {with_state(symbol, oxidation)}, {-count} more electron{'' if count == -1 else 's'} "
            "than it has",
            place=place,
            mend="correct the charge, or add missing hydrogens",
        )
    return count if count is None or count >= 0 else None


def _counts_are_firm(coordination: Coordination) -> bool:
    """Whether every ligand is one whose closed-shell charge nobody disputes: monatomic, water or ammonia."""
    return all(len(ligand.atoms) == 1 or ligand.formula in ("H2O", "H3N") for ligand in coordination.ligands)


def _stated_unpaired(fragment: Fragment, given: int | None) -> int | None:
    return fragment.unpaired_electrons if given is None else given


def _unpaired(
    fragment: Fragment,
    coordination: Coordination,
    charge: int,
    given: int | None,
    count: int | None,
    place: str,
) -> _Choice:
    electrons = _electrons(fragment, charge)
    stated = _stated_unpaired(fragment, given)
    if stated is not None:
        _check_unpaired(stated, electrons, place)
        return _Choice(stated, "given" if given is not None else "given in the file")
    return _guessed_unpaired(fragment, coordination, charge, count, place)


def _check_unpaired(unpaired: int, electrons: int, place: str) -> None:
    parity = electrons % 2
    allowed = f"with {electrons} electrons it is {parity}, {parity + 2}, {parity + 4} ..."
    if unpaired < 0 or unpaired > electrons:
        raise ElectronCountError(f"{unpaired} unpaired electrons are impossible", place=place, mend=allowed)
    if unpaired % 2 != parity:
        raise ElectronCountError(
            f"{unpaired} unpaired electrons do not fit {electrons} electrons", place=place, mend=allowed
        )


def _guessed_unpaired(
    fragment: Fragment, coordination: Coordination, charge: int, count: int | None, place: str
) -> _Choice:
    parity = _electrons(fragment, charge) % 2
    if count is None:
        if _all_empty(fragment, coordination, charge):
            return _Choice(parity, "guessed: no metal has d or f electrons left")
        return _several_metals(fragment, coordination, charge, parity, place)
    symbol = fragment.symbols[coordination.metals[0]]
    f_block = symbol in F_BLOCK
    shell, size = ("f", 7) if f_block else ("d", 5)
    most = min(count, 2 * size - count)
    candidates = [n for n in range(most % 2, most + 1, 2) if n % 2 == parity]
    if not candidates:
        raise ElectronCountError(
            f"unpaired electrons are not given and {shell}{count} by counting does not fit their parity",
            place=place,
            mend=f"check charge and hydrogens, or give their number: {parity}, {parity + 2} ...",
        )
    if len(candidates) == 1:
        return _Choice(candidates[0], f"only count of {shell}{count}")
    if f_block:
        if count in _HUND_F or symbol in LANTHANIDES:
            return _Choice(candidates[-1], f"guessed: Hund's rule for nonbonding {shell}{count}")
    else:
        listed = " or ".join(str(n) for n in candidates)
        return _Choice(candidates[0], f"lowest for {shell}{count}; {listed} by counting", tuple(candidates))
    raise ElectronCountError(
        f"unpaired electrons are not given for {shell}{count}",
        place=place,
        mend=f"give their number: {' or '.join(str(n) for n in candidates)}",
    )


def _several_metals(fragment: Fragment, coordination: Coordination, charge: int, parity: int, place: str) -> _Choice:
    """Parallel spins of equal d1 metals far from one another; else refused with what counting gives."""
    metals, total = coordination.metals, _oxidation_total(coordination, charge)
    symbols = [fragment.symbols[metal] for metal in metals]
    valence = [valence_d_or_f_electrons(symbol, 0) for symbol in symbols]
    counted = None
    if total is not None and None not in valence and len(metals) > 1:
        counted = sum(count or 0 for count in valence) - total
    if counted == len(metals) and len(set(symbols)) == 1 and counted % 2 == parity and _far_apart(fragment, metals):
        state = with_state(symbols[0], total // len(metals)) if total is not None else symbols[0]
        shell = "f" if symbols[0] in F_BLOCK else "d"
        return _Choice(
            counted,
            f"guessed: {state} {shell}1 at each of {counted} metals without bonds between them, spins taken as "
            "parallel; how they couple is not looked for",
        )
    known = "the metal's electrons cannot be counted"
    if counted is not None and counted >= 0:
        known = f"the {len(metals)} metals hold {counted} d or f electrons in all by counting"
    raise ElectronCountError(
        f"unpaired electrons are not given and {known}",
        place=place,
        mend=f"give their number: {parity}, {parity + 2}, {parity + 4} ...",
    )


def _far_apart(fragment: Fragment, metals: Sequence[int]) -> bool:
    """Whether no two metals are near enough for a bond between them."""
    return all(
        float(np.linalg.norm(fragment.positions_A[one] - fragment.positions_A[other]))
        > _METAL_CONTACT * (covalent_radius_A(fragment.symbols[one]) + covalent_radius_A(fragment.symbols[other]))
        for one, other in combinations(metals, 2)
    )


def _all_empty(fragment: Fragment, coordination: Coordination, charge: int) -> bool:
    """Whether the charge leaves no metal d or f electrons: main-group metals, or every metal in its highest state."""
    valence = [valence_d_or_f_electrons(fragment.symbols[metal], 0) for metal in coordination.metals]
    if None not in valence and _oxidation_total(coordination, charge) == sum(count or 0 for count in valence):
        return True
    highest = 0
    for metal in coordination.metals:
        if fragment.symbols[metal] not in TRANSITION_METALS:
            continue
        state = oxidation_guess(fragment, coordination, metal).state
        if state is None or valence_d_or_f_electrons(fragment.symbols[metal], state) != 0:
            return False
        highest += state
    return highest in (0, _oxidation_total(coordination, charge))
