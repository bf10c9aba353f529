"""The spin state where counting leaves several open: the ladder of a first pass decides."""

from __future__ import annotations

from dataclasses import replace

import basis_params
from ehmo.analysis.spin_choice import choose_spin
from ehmo.calculate.numbers import Bonding
from ehmo.calculate.sites import site_ladders, sphere_symmetries
from ehmo.errors import ElectronCountError
from ehmo.records.coordination import Coordination, DonorKind, ElectronAssignment
from ehmo.records.fragment import Fragment

FIRST_ROW = frozenset({"Sc", "Ti", "V", "Cr", "Mn", "Fe", "Co", "Ni", "Cu"})

HEAVY_PAIRING_PER_CM = 2500.0
"""4d and 5d complexes are low-spin but for degenerate levels (common practice) [cm^-1]."""

OXO_PAIRING = 0.75
"""Part of the pairing energy left beside a terminal oxo, nitrido or imido ligand (nephelauxetic; common practice)."""

TRIPLE_KINDS = frozenset(
    {DonorKind.OXO, DonorKind.NITRIDO, DonorKind.IMIDO_LINEAR, DonorKind.SULFIDO, DonorKind.CARBYNE}
)

CLOSE_SPINS = 0.3
"""A spin state less than this part of the pairing energy above the chosen one is a doubt."""


def settled_spin(
    fragment: Fragment, coordination: Coordination, electrons: ElectronAssignment, bonding: Bonding
) -> ElectronAssignment:
    """Unpaired electrons by the ladder against the pairing energy.

    Parameters
    ----------
    fragment : Fragment
    coordination : Coordination
    electrons : ElectronAssignment
        With the candidates.
    bonding : Bonding
        First pass, with the lowest candidate.

    Returns
    -------
    electrons : ElectronAssignment
        With the choice and its reason.

    Raises
    ------
    ElectronCountError
        If there is no ladder or no pairing energy; it names the candidates.
    """
    (metal,), state, count = coordination.metals, electrons.metal_oxidation_total, electrons.d_electrons
    found, withheld = site_ladders(coordination, electrons, bonding, sphere_symmetries(fragment, coordination))
    listed = " or ".join(str(candidate) for candidate in electrons.spin_candidates)
    ladder = found[0]
    if ladder is None or state is None or count is None:
        raise ElectronCountError(
            f"unpaired electrons are not given and no ladder decides ({withheld})", mend=f"give their number: {listed}"
        )
    symbol = fragment.symbols[metal]
    # Low-valent ions are not tabulated; the nearest charge of the metal is close enough for their strong fields.
    nearest = next((charge for charge in (state, 1, 2, 3) if charge >= state and _pairing(symbol, charge)), None)
    pairing = None if nearest is None else _pairing(symbol, nearest)
    if pairing is None:
        raise ElectronCountError(
            f"unpaired electrons are not given and no pairing energy of {symbol}{state}+ is tabulated",
            mend=f"give their number: {listed}",
        )
    source = f"{symbol}{nearest}+"
    if symbol not in FIRST_ROW:
        pairing, source = min(pairing, HEAVY_PAIRING_PER_CM), "a 4d or 5d ion, which pairs all but degenerate levels"
    elif any(bond.kind in TRIPLE_KINDS for bond in coordination.bonds):
        pairing, source = OXO_PAIRING * pairing, f"{source} times {OXO_PAIRING:g} for its multiple bond"
    choice = choose_spin(ladder, count, electrons.spin_candidates, pairing, source)
    return replace(
        electrons,
        unpaired_electrons=choice.unpaired_electrons,
        unpaired_reason=choice.reason,
        spin_doubt=choice.reason if choice.margin_per_cm < CLOSE_SPINS * pairing else "",
    )


def _pairing(symbol: str, charge: int) -> float | None:
    """Pairing energy of an ion [cm^-1]; None if it is not tabulated."""
    try:
        return basis_params.pairing_energy(symbol, charge).pairing_energy_per_cm
    except KeyError:
        return None
