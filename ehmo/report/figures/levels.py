"""Levels as dashes, with their electrons, on axes in centimetres."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Final

from ehmo.records.electronic import NO_ELECTRON
from ehmo.report.figures.canvas import SMALL_POINTS
from ehmo.report.figures.markup import write
from ehmo.report.look import Look

if TYPE_CHECKING:
    from matplotlib.axes import Axes

DASH_CM: Final = 0.30
GAP_CM: Final = 0.07
"""Length of a level, and gap to the next of a degenerate set [cm]."""

ARROW_CM: Final = 0.13
"""Half the height of an arrow [cm]."""

LABEL_CM: Final = 0.29
"""Height of a line of labels [cm]."""


def set_width(degeneracy: int) -> float:
    """Width of a set of degenerate levels [cm]."""
    return degeneracy * (DASH_CM + GAP_CM) - GAP_CM


def draw_set(
    axes: Axes, degeneracy: int, left: float, y: float, colour: str, names: Sequence[str | None] | None = None
) -> None:
    """Dashes of one set of degenerate levels, side by side.

    Parameters
    ----------
    axes : Axes
        With centimetres as coordinates.
    degeneracy : int
    left, y : float
        Left end and height [cm].
    colour : str
    names : sequence of str, optional
        Name of each dash in the file, for a page whose reader can choose it.
    """
    for n, name in enumerate(names or [None] * degeneracy):
        x = left + n * (DASH_CM + GAP_CM)
        axes.plot([x, x + DASH_CM], [y, y], color=colour, lw=1.8, solid_capstyle="butt", zorder=4, gid=name)


def draw_electrons(axes: Axes, alpha: float, beta: float, left: float, y: float, look: Look) -> None:
    """Half arrows, one per electron; the number in place of them where it is broken.

    Parameters
    ----------
    axes : Axes
        With centimetres as coordinates.
    alpha, beta : float
        Electrons of either spin in the set.
    left, y : float
        Left end and height of the set [cm].
    look : Look
    """
    if max(abs(alpha - round(alpha)), abs(beta - round(beta))) > NO_ELECTRON:
        write(
            axes, left, y + 0.05, f"{alpha + beta:.1f} e", ha="left", va="bottom", fontsize=SMALL_POINTS - 1,
            color=look.ink, zorder=6, gid="electrons",
        )  # fmt: skip
        return
    for count, shift, up, colour in ((round(alpha), -0.065, 1, look.alpha), (round(beta), 0.065, -1, look.beta)):
        for n in range(count):
            x = left + n * (DASH_CM + GAP_CM) + DASH_CM / 2 + shift
            tip = y + up * ARROW_CM
            axes.plot(
                [x, x, x - up * 0.05], [y - up * ARROW_CM, tip, tip - up * 0.09], color=colour, lw=0.7, zorder=5,
                solid_joinstyle="miter",
            )  # fmt: skip
