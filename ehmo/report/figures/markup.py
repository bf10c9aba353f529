"""Irreps, terms and formulas with their subscripts, for the labels of figures.

Only text of a known form is set as a formula; everything else is drawn letter by letter.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, Final

from ehmo.report.figures.canvas import POINTS_PER_CM, SMALL_POINTS, plain
from ehmo.report.look import FIGURE_FONT, Look

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.text import Text


class Formula(str):
    """Text that the plotting library may set as a formula, because it was made here."""

    __slots__ = ()


PART_LETTERS: Final = {"sigma": "σ", "pi": "π", "delta": "δ", "phi": "φ"}
"""Greek letter of each bond part."""

_PRIMES = ("", "′", "″")
_IRREP = re.compile(r"(\d*)([abetABETσπδφγΣΠΔΦΓ])([123]?[gu]?)('{0,2})([+\-]?)")
_TERM = re.compile(r"(\d+)([A-Z]|[ΣΠΔΦΓ])([123]?[gu]?)('{0,2})([+\-]?)")
_FUNCTION = re.compile(r"[pdf]([xyz0-9()+\-]+)")
_POWER = re.compile(r"(?<=[xyz)])([2-9])")
_FORMULA_PIECE = re.compile(r"([A-Z][a-z]?|[()])(\d*)")


def irrep(label: str) -> str:
    """Orbital label such as ``2t2g`` with its subscript; other text as it is."""
    found = _IRREP.fullmatch(label)
    if not found:
        return label
    number, letter, below, primes, sign = found.groups()
    return _with_indices(number, "", letter, below, primes, sign)


def term(label: str) -> str:
    """Term symbol such as ``3T1g`` with its indices; other text as it is."""
    found = _TERM.fullmatch(label)
    if not found:
        return label
    multiplicity, letter, below, primes, sign = found.groups()
    return _with_indices("", multiplicity, letter, below, primes, sign)


def function(label: str) -> str:
    """Angular part of a function such as ``dx2-y2`` with its powers; other text as it is."""
    found = _FUNCTION.fullmatch(label)
    if not found:
        return label
    powers = _POWER.sub(r"^{\1}", found[1])
    return Formula(f"${powers}$")


def _with_indices(before: str, raised: str, letter: str, below: str, primes: str, sign: str) -> Formula:
    text = before + (f"^{{{raised}}}" if raised else "")
    text += rf"\mathrm{{{letter}}}"
    text += rf"_{{\mathrm{{{below}}}}}" if below else ""
    text += f"^{{{sign}}}" if sign else ""
    # Primes above an index would make the label taller than its line.
    return Formula(f"${text}${_PRIMES[len(primes)]}")


def part(name: str) -> str:
    """Bond part such as ``pi*`` with its Greek letter."""
    bare = name.rstrip("*")
    return PART_LETTERS.get(bare, bare) + name[len(bare) :]


def chemical(formula: str, charge: int | None = None) -> str:
    """Formula with its subscripts and charge; other text as it is."""
    pieces = _FORMULA_PIECE.findall(formula)
    if "".join(symbol + count for symbol, count in pieces) != formula:
        return formula
    text = "".join(symbol + (f"_{{{count}}}" if count else "") for symbol, count in pieces)
    if charge and "(" in text:
        text = f"[{text}]"
    if charge:
        size = "" if abs(charge) == 1 else str(abs(charge))
        text += f"^{{{size}{'+' if charge > 0 else '-'}}}"
    return Formula(rf"$\mathrm{{{text}}}$")


def joined(*parts: str) -> str:
    """Labels side by side; a formula if one of them is."""
    kept = [word for word in parts if word]
    if not any(isinstance(word, Formula) for word in kept):
        return " ".join(kept)
    return Formula(" ".join(word if isinstance(word, Formula) else plain(word).replace("$", "") for word in kept))


def width_cm(text: str, points: float) -> float:
    """Width of a text as `write` draws it [cm]."""
    from matplotlib.font_manager import FontProperties
    from matplotlib.textpath import text_to_path

    ours = isinstance(text, Formula)
    font = FontProperties(family=FIGURE_FONT, size=points)
    width, _, _ = text_to_path.get_text_width_height_descent(str(text) if ours else plain(text), font, ismath=ours)
    return float(width) / POINTS_PER_CM


def write(axes: Axes, x: float, y: float, text: str, **style: Any) -> Text:
    """Put text on axes: formulas of our own set, everything else letter by letter.

    Parameters
    ----------
    axes : Axes
    x, y : float
        Place, in the coordinates of the axes unless the style says otherwise.
    text : str
    **style
        Properties of the text.

    Returns
    -------
    drawn : Text
    """
    ours = isinstance(text, Formula)
    return axes.text(x, y, str(text) if ours else plain(text), parse_math=ours, **style)


NOTE_CM: Final = 0.27
"""Height of a line of notes [cm]."""


def note_lines(notes: Sequence[str], room: float) -> list[str]:
    """Notes in as few lines as hold them, in their order.

    Parameters
    ----------
    notes : sequence of str
    room : float
        Width of a line [cm].

    Returns
    -------
    lines : list of str
    """
    lines: list[str] = []
    for note in notes:
        longer = f"{lines[-1]}; {note}" if lines else note
        if lines and width_cm(longer, SMALL_POINTS) <= room:
            lines[-1] = longer
        else:
            lines.append(note)
    return lines


def write_notes(axes: Axes, lines: Sequence[str], look: Look) -> None:
    """Lines of notes at the lower edge, the first at 0.2 cm and the others below zero.

    Parameters
    ----------
    axes : Axes
        Of the paper, with `NOTE_CM` below zero for each line but the first.
    lines : sequence of str
    look : Look
    """
    for k, line in enumerate(lines):
        write(
            axes, 0.06, 0.2 - NOTE_CM * k, line, ha="left", va="center", fontsize=SMALL_POINTS, color=look.muted,
            gid="note",
        )  # fmt: skip
