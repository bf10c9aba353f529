"""Conventions that every box shares; README and DEVELOPERS.md state them for people.

Angular functions are real spherical harmonics in the order m = -l..l: negative m carries sin(|m| phi),
positive m carries cos(m phi), without the Condon-Shortley sign. Atoms count from 0 in arrays; people see
labels such as ``V1`` (element and position in the file, from 1).
"""

from __future__ import annotations

from typing import Final

SHELL_LETTERS: Final = "spdf"

ORBITAL_NAMES: Final[tuple[tuple[str, ...], ...]] = (
    ("s",),
    ("py", "pz", "px"),
    ("dxy", "dyz", "dz2", "dxz", "dx2-y2"),
    ("fy(3x2-y2)", "fxyz", "fyz2", "fz3", "fxz2", "fz(x2-y2)", "fx(x2-3y2)"),
)
"""Names of the real harmonics, ``ORBITAL_NAMES[l][m + l]``."""

BOND_SYMMETRIES: Final = ("sigma", "pi", "delta", "phi")
"""Name of |m| about a bond axis."""

DEGENERACY_TOLERANCE_EV: Final = 1e-4
"""Levels closer than this share their electrons evenly [eV]."""

FRONTIER_TOLERANCE_EV: Final = 0.02
"""A frontier set closer than this is reported as nearly degenerate [eV]."""

NEGLECTED_OVERLAP: Final = 1e-10
"""Every overlap left out of the pair list is smaller than this."""

# fmt: off
ELEMENT_SYMBOLS: Final[tuple[str, ...]] = (
    "H", "He", "Li", "Be", "B", "C", "N", "O", "F", "Ne", "Na", "Mg", "Al", "Si", "P", "S", "Cl", "Ar", "K",
    "Ca", "Sc", "Ti", "V", "Cr", "Mn", "Fe", "Co", "Ni", "Cu", "Zn", "Ga", "Ge", "As", "Se", "Br", "Kr", "Rb",
    "Sr", "Y", "Zr", "Nb", "Mo", "Tc", "Ru", "Rh", "Pd", "Ag", "Cd", "In", "Sn", "Sb", "Te", "I", "Xe", "Cs",
    "Ba", "La", "Ce", "Pr", "Nd", "Pm", "Sm", "Eu", "Gd", "Tb", "Dy", "Ho", "Er", "Tm", "Yb", "Lu", "Hf", "Ta",
    "W", "Re", "Os", "Ir", "Pt", "Au", "Hg", "Tl", "Pb", "Bi", "Po", "At", "Rn", "Fr", "Ra", "Ac", "Th", "Pa",
    "U", "Np", "Pu", "Am", "Cm", "Bk", "Cf", "Es", "Fm", "Md", "No", "Lr", "Rf", "Db", "Sg", "Bh", "Hs", "Mt",
    "Ds", "Rg", "Cn", "Nh", "Fl", "Mc", "Lv", "Ts", "Og",
)
# fmt: on
"""Chemical symbols by atomic number - 1."""


def atom_label(symbol: str, index: int) -> str:
    """Label of an atom as people see it, such as ``V1`` for the vanadium at index 0."""
    return f"{symbol}{index + 1}"
