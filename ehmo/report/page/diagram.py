"""The interaction diagram of a page: a figure whose levels can be chosen."""

from __future__ import annotations

import re
from collections.abc import Collection
from typing import Final

from ehmo.analysis.interaction import bond_interaction
from ehmo.records.report import BondReport
from ehmo.report.figures.interaction import default_bond, interaction_diagram
from ehmo.report.page.bonds import level_in_words
from ehmo.report.page.drawings import drawing
from ehmo.report.page.markup import Markup, element, markup
from ehmo.report.page.view import PICTURE_PX

WIDTH_CM: Final = 13.0

_LEVEL = re.compile(
    r'<g id="diagram-orbital-(\d+)">\s*<path d="M ([\d.]+) ([\d.]+)\s+L ([\d.]+) ([\d.]+)\s*"[^>]*/>\s*</g>'
)


def diagram_figure(report: BondReport, shown: Collection[int], bond: int | None = None) -> Markup:
    """Interaction diagram of one bond, its colours those of the page.

    Parameters
    ----------
    report : BondReport
    shown : collection of int
        Orbitals that can be shown: their levels are buttons.
    bond : int, optional
        Place of the bond; by default that of `default_bond`.

    Returns
    -------
    html : Markup
    """
    bond = default_bond(report) if bond is None else bond
    svg = drawing(interaction_diagram(report, bond, width_cm=WIDTH_CM), "diagram")
    words = {k: level_in_words(level) for level in bond_interaction(report, bond).sets for k in level.orbitals}

    def button(found: re.Match[str]) -> str:
        orbital, (x, y, end, _) = int(found[1]), (float(found[k]) for k in range(2, 6))
        if orbital not in shown:
            return found[0]
        room = element(
            "rect", x=f"{x - 1:g}", y=f"{y - 7:g}", width=f"{end - x + 2:g}", height="14", rx="2", class_="room"
        )
        return (
            f'<g class="level" data-orbital="{orbital}" tabindex="0" role="button" aria-pressed="false" '
            f'aria-label="Orbital {orbital + 1}: {markup(words[orbital])}">{room}{found[0]}</g>'
        )

    label = report.bond_label(report.coordination.bonds[bond])
    caption = (
        f"How the orbitals arise from the metal (left) and the ligands of {label} (right). Levels that carry the "
        "chosen channel are marked; choose a level to see it."
    )
    return element(
        "figure",
        element(
            "div",
            Markup(_LEVEL.sub(button, svg)),
            class_="drawing",
            role="group",
            aria_label=f"Interaction diagram of {label}",
        ),
        element(
            "figcaption",
            element("p", caption),
            element(
                "div",
                element("p", "", id="echo-words", class_="shown"),
                element("img", id="echo", src="data:,", alt="", width=PICTURE_PX, height=PICTURE_PX),
                element("p", element("a", "To the view", href="#viewer")),
                class_="echo needs-script",
            ),
        ),
        class_="diagram",
        id="diagram-figure",
    )
