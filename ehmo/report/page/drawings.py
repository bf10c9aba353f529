"""Figures of a page: drawings in the colours of the page, light or dark."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

from ehmo.report.figures.canvas import figure_bytes
from ehmo.report.look import LIGHT
from ehmo.report.page.markup import Markup, element

if TYPE_CHECKING:
    from matplotlib.figure import Figure

FIGURE_CM: Final = 11.0
"""Width of a drawing as it is laid out [cm]; on the page it takes the room there is."""

_ROLES: Final = tuple(
    (getattr(LIGHT, role), f"var(--{role})") for role in dict.fromkeys(LIGHT.__slots__) if role != "name"
)
_METADATA = re.compile(r"<metadata>.*?</metadata>", re.DOTALL)
_OWN = re.compile(r' id="([^"]+)"')
_POINTED = re.compile(r'(?:href="#|url\(#)([^"()]+)')
_NAME = re.compile(r'(\bid="|href="#|url\(#)([^"()]+)')


def drawing(figure: Figure, identity: str) -> Markup:
    """Figure as an SVG element whose colours are the page's variables.

    Parameters
    ----------
    figure : Figure
        Drawn in the light look.
    identity : str
        Put before the names within the drawing, so that several stand on one page.

    Returns
    -------
    svg : Markup
    """
    text = figure_bytes(figure, "svg").decode("utf-8")
    text = _METADATA.sub("", text[text.index("<svg") :])
    for colour, variable in _ROLES:
        text = text.replace(colour, variable)
    # Names that nothing points to stand on several elements; those of orbitals are choices.
    wanted = set(_POINTED.findall(text))
    text = _OWN.sub(lambda found: found[0] if found[1] in wanted or found[1].startswith("orbital ") else "", text)
    return Markup(_NAME.sub(lambda found: f"{found[1]}{identity}-{found[2].replace(' ', '-')}", text))


def figure_block(figure: Figure, identity: str, label: str, caption: str) -> Markup:
    """Drawing with its words for those who do not see it, and its caption."""
    return element(
        "figure",
        element("div", drawing(figure, identity), class_="drawing", role="img", aria_label=label),
        element("figcaption", caption),
        class_="drawn",
    )
