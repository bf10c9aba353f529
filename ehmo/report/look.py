"""Colours and fonts that every figure and page shares.

Colours of one role differ in lightness as well as in hue, so that they stay apart for readers who see two cone types
only and in a grey print; a test simulates both. On a figure, colour never stands alone: line style, place or a label
says the same.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Final

from ehmo.conventions import BOND_SYMMETRIES, ELEMENT_SYMBOLS
from ehmo.structure.elements import ALKALI, ALKALINE_EARTH, F_BLOCK, TRANSITION_METALS


@dataclass(frozen=True, slots=True)
class Look:
    """Colours on one background, as ``#rrggbb``.

    Attributes
    ----------
    name : str
        "light" or "dark".
    paper, shade : str
        Background, and the slightly different one of a panel or a striped row.
    ink, muted, grid : str
        Text and axes, secondary text, and rules that only guide the eye.
    sigma, pi, delta, phi : str
        Part of a bond.
    metal, donor, other : str
        Where an orbital or level comes from: metal, donor atoms, the rest of the ligands.
    alpha, beta : str
        Spin.
    positive, negative : str
        Phase of an orbital, and sign of a quantity drawn as an area.
    """

    name: str
    paper: str
    shade: str
    ink: str
    muted: str
    grid: str
    sigma: str
    pi: str
    delta: str
    phi: str
    metal: str
    donor: str
    other: str
    alpha: str
    beta: str
    positive: str
    negative: str

    def part(self, symmetry: str) -> str:
        """Colour of a bond part by its name in `BOND_SYMMETRIES`."""
        return dict(zip(BOND_SYMMETRIES, (self.sigma, self.pi, self.delta, self.phi), strict=True))[symmetry]

    @property
    def origins(self) -> tuple[str, str, str]:
        """Colours of metal, donors and rest, in the order of `Populations.orbital_shares`."""
        return self.metal, self.donor, self.other

    @property
    def series(self) -> tuple[str, str, str, str]:
        """Colours of lines that only need to differ; beyond four, line style or marker must tell."""
        return self.sigma, self.pi, self.delta, self.phi


LIGHT: Final = Look(
    name="light",
    paper="#ffffff",
    shade="#f1f4f7",
    ink="#1b2028",
    muted="#5f636b",
    grid="#d9dde2",
    sigma="#29276d",
    pi="#ca4423",
    delta="#5ea087",
    phi="#7c2847",
    metal="#15558d",
    donor="#cc7e33",
    other="#7b6e5a",
    alpha="#07467b",
    beta="#da5f2e",
    positive="#cd821d",
    negative="#4e43ac",
)
"""On white: screen and print."""

DARK: Final = Look(
    name="dark",
    paper="#141a20",
    shade="#1d242c",
    ink="#eae8e4",
    muted="#a1a6ad",
    grid="#3a4147",
    sigma="#8473d8",
    pi="#f8b459",
    delta="#c7f3f3",
    phi="#f65a82",
    metal="#5daaee",
    donor="#fcc17f",
    other="#777879",
    alpha="#82d7fd",
    beta="#f6843e",
    positive="#f8af2a",
    negative="#756fe4",
)
"""For slides and dark pages."""

LOOKS: Final[Mapping[str, Look]] = MappingProxyType({look.name: look for look in (LIGHT, DARK)})

PAGE_FONTS: Final = ("Noto Sans", "Segoe UI", "Helvetica Neue", "Arial", "DejaVu Sans", "sans-serif")
"""Fonts of a page, the first at hand is taken; all have Greek letters and the angstrom sign."""

FIGURE_FONT: Final = "DejaVu Sans"
"""Font of the figures: it comes with the plotting library, so that a figure is the same everywhere."""

LINE_STYLES: Final[Mapping[str, tuple[int, ...]]] = MappingProxyType(
    {"sigma": (), "pi": (5, 2), "delta": (2, 2), "phi": (6, 2, 1, 2)}
)
"""Dashes of each bond part, strokes and gaps in points; none for a full line."""

ELEMENT_FAMILIES: Final[Mapping[str, tuple[str, ...]]] = MappingProxyType(
    {
        "hydrogen": ("#c2baaf",),
        "groups 1 and 2": ("#9cba7f", "#8caa6f", "#7c9a60", "#6d8a52", "#5d7a43", "#4f6b35"),
        "d metals": ("#7683bf", "#5c6aa3", "#425289"),
        "f metals": ("#aa6da2", "#894e83"),
        "group 13": ("#ce9287", "#bd8277", "#ac7368", "#9b645a", "#8b554c"),
        "group 14": ("#887366", "#a89284", "#988275", "#8a7568", "#786457"),
        "group 15": ("#9fad4e", "#8a983a", "#748325", "#627111", "#506000"),
        "group 16": ("#32b4af", "#0c9c97", "#04827e", "#006d69", "#005a57"),
        "group 17": ("#ef8ead", "#d47795", "#ba5f7d", "#a34b69", "#903958"),
        "group 18": ("#cabbd8", "#b9abc7", "#a99bb6", "#998ba6", "#897c96", "#7a6d87"),
    }
)
"""Colours of the elements: one hue per family, darker from period to period, on light and dark backgrounds alike."""

_NOBLE_GASES = (2, 10, 18, 36, 54, 86)


def element_family(symbol: str) -> str:
    """Family of an element, a key of `ELEMENT_FAMILIES`.

    Examples
    --------
    >>> element_family("O"), element_family("V"), element_family("U"), element_family("Na")
    ('group 16', 'd metals', 'f metals', 'groups 1 and 2')
    """
    if symbol == "H":
        return "hydrogen"
    if symbol in ALKALI | ALKALINE_EARTH:
        return "groups 1 and 2"
    if symbol in TRANSITION_METALS:
        return "f metals" if symbol in F_BLOCK else "d metals"
    number = ELEMENT_SYMBOLS.index(symbol) + 1
    if number > _NOBLE_GASES[-1]:
        return "d metals"
    return f"group {18 + number - min(gas for gas in _NOBLE_GASES if gas >= number)}"


def element_colour(symbol: str) -> str:
    """Colour of an element as ``#rrggbb``, by family and period.

    Examples
    --------
    >>> element_colour("O"), element_colour("S")
    ('#32b4af', '#0c9c97')
    """
    family = element_family(symbol)
    shades = ELEMENT_FAMILIES[family]
    number = ELEMENT_SYMBOLS.index(symbol) + 1
    period = 1 + sum(gas < number for gas in _NOBLE_GASES)
    first = {"hydrogen": 1, "d metals": 4, "f metals": 6, "group 18": 1}.get(family, 2)
    return shades[min(period - first, len(shades) - 1)]
