"""What the bond graph needs to know of the elements: metals, groups, valences, oxidation states."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

from basis_params import atom
from ehmo.conventions import ELEMENT_SYMBOLS
from ehmo.errors import InputError


def _span(first: str, last: str) -> frozenset[str]:
    return frozenset(ELEMENT_SYMBOLS[ELEMENT_SYMBOLS.index(first) : ELEMENT_SYMBOLS.index(last) + 1])


LANTHANIDES: Final = _span("La", "Yb")
ACTINIDES: Final = _span("Ac", "No")
F_BLOCK: Final = LANTHANIDES | ACTINIDES
TRANSITION_METALS: Final = _span("Sc", "Zn") | _span("Y", "Cd") | _span("Lu", "Hg") | {"Lr"} | F_BLOCK
"""Groups 3 to 12 with the lanthanides and actinides: always metals."""

P_BLOCK_METALS: Final = frozenset({"Al", "Ga", "In", "Tl", "Sn", "Pb", "Bi"})
"""Metals only in a fragment without a transition metal; beside one, atoms of a ligand or counter-ion."""

ALKALI: Final = frozenset({"Li", "Na", "K", "Rb", "Cs", "Fr"})
ALKALINE_EARTH: Final = frozenset({"Be", "Mg", "Ca", "Sr", "Ba", "Ra"})
COUNTER_IONS: Final = ALKALI | ALKALINE_EARTH
"""Bare counter-ions, without bonds, unless the fragment has no other metal."""

_VALENCES: Final[dict[str, tuple[int, int]]] = {
    **dict.fromkeys(("H", "F"), (1, 1)),
    **dict.fromkeys(("Cl", "Br", "I", "At"), (1, 7)),
    "O": (2, 2),
    **dict.fromkeys(("S", "Se", "Te"), (2, 6)),
    "N": (3, 3),
    **dict.fromkeys(("P", "As", "Sb", "Bi"), (3, 5)),
    **dict.fromkeys(("C", "Si", "Ge"), (4, 4)),
    **dict.fromkeys(("Sn", "Pb"), (2, 4)),
    **dict.fromkeys(("B", "Al", "Ga", "In", "Tl"), (3, 3)),
}
"""Lowest and highest covalence of closed-shell main-group atoms (common practice)."""

OXIDATION_STATES: Final[dict[str, tuple[int, ...]]] = {
    "Sc": (3,), "Ti": (2, 3, 4), "V": (2, 3, 4, 5), "Cr": (0, 2, 3, 4, 5, 6), "Mn": (1, 2, 3, 4, 5, 6, 7),
    "Fe": (0, 2, 3, 4, 5, 6), "Co": (1, 2, 3, 4), "Ni": (0, 2, 3, 4), "Cu": (1, 2, 3), "Zn": (2,),
    "Y": (3,), "Zr": (4,), "Nb": (3, 4, 5), "Mo": (0, 2, 3, 4, 5, 6), "Tc": (1, 3, 4, 5, 6, 7),
    "Ru": (0, 2, 3, 4, 5, 6, 7, 8), "Rh": (1, 3), "Pd": (0, 2, 4), "Ag": (1, 2, 3), "Cd": (2,),
    "Hf": (4,), "Ta": (3, 4, 5), "W": (0, 2, 3, 4, 5, 6), "Re": (1, 3, 4, 5, 6, 7),
    "Os": (0, 2, 3, 4, 5, 6, 7, 8), "Ir": (1, 3, 4, 5, 6), "Pt": (0, 2, 4), "Au": (1, 3), "Hg": (1, 2),
    "La": (3,), "Ce": (3, 4), "Pr": (3, 4), "Nd": (3,), "Sm": (2, 3), "Eu": (2, 3), "Gd": (3,),
    "Tb": (3, 4), "Dy": (3,), "Ho": (3,), "Er": (3,), "Tm": (3,), "Yb": (2, 3), "Lu": (3,),
    "Th": (4,), "Pa": (4, 5), "U": (3, 4, 5, 6), "Np": (3, 4, 5, 6, 7), "Pu": (3, 4, 5, 6),
    "Am": (3, 4, 5, 6), "Cm": (3, 4),
    "Al": (3,), "Ga": (1, 3), "In": (1, 3), "Tl": (1, 3), "Sn": (2, 4), "Pb": (2, 4), "Bi": (3, 5),
    **dict.fromkeys(sorted(ALKALI), (1,)), **dict.fromkeys(sorted(ALKALINE_EARTH), (2,)),
}  # fmt: skip
"""Usual oxidation states (Greenwood & Earnshaw, Chemistry of the Elements, 1997; memory)."""


def metal_symbols(symbols: Sequence[str]) -> frozenset[str]:
    """Elements that count as metals in a fragment.

    Transition metals, lanthanides and actinides where there are any, else metals of the p block, else those
    of groups 1 and 2: beside a transition metal the others are counter-ions or atoms of a ligand.
    """
    for family in (TRANSITION_METALS, P_BLOCK_METALS, COUNTER_IONS):
        present = family.intersection(symbols)
        if present:
            return frozenset(present)
    return frozenset()


def covalent_radius_A(symbol: str) -> float:
    """Covalent radius [angstrom].

    Raises
    ------
    InputError
        If none is tabulated.

    References
    ----------
    cordero-2008
    """
    try:
        return atom(symbol).covalent_radius_A
    except KeyError:
        raise InputError(
            f"no covalent radius is tabulated for {symbol}", mend="leave that element out (H to Cm are known)"
        ) from None


def atomic_number(symbol: str) -> int:
    """Atomic number."""
    return ELEMENT_SYMBOLS.index(symbol) + 1


def covalence(symbol: str, n_bonds: int) -> int | None:
    """Covalence of a main-group atom with so many sigma bonds; None for other elements.

    Each bond beyond the lowest covalence brings a further electron pair into play, up to the highest: sulfur with two,
    three and four neighbours has 2, 4 and 6 (sulfide, sulfite, sulfate).

    Examples
    --------
    >>> covalence("S", 4), covalence("Cl", 3), covalence("N", 4)
    (6, 5, 3)
    """
    if symbol not in _VALENCES:
        return None
    low, high = _VALENCES[symbol]
    return min(low + 2 * max(n_bonds - low, 0), high)


def with_state(symbol: str, oxidation_state: int) -> str:
    """Element with its oxidation state in Roman numerals.

    Examples
    --------
    >>> with_state("V", 4), with_state("Cr", 0), with_state("Co", -1)
    ('V(IV)', 'Cr(0)', 'Co(-I)')
    """
    numerals = ("0", "I", "II", "III", "IV", "V", "VI", "VII", "VIII", "IX")
    size = abs(oxidation_state)
    text = numerals[size] if size < len(numerals) else str(size)
    return f"{symbol}({'-' if oxidation_state < 0 else ''}{text})"


def valence_d_or_f_electrons(symbol: str, oxidation_state: int) -> int | None:
    """Valence d (or f) electrons left at an oxidation state, by the group number; None in the p and s block.

    Examples
    --------
    >>> valence_d_or_f_electrons("Fe", 4), valence_d_or_f_electrons("Np", 6)
    (4, 1)
    """
    if symbol not in TRANSITION_METALS:
        return None
    noble_gas = max(z for z in (18, 36, 54, 86) if z < atomic_number(symbol))
    beyond = atomic_number(symbol) - noble_gas
    filled_f = 14 if noble_gas >= 54 and symbol not in F_BLOCK else 0
    return beyond - filled_f - oxidation_state
