"""Channels of each bond as bars, with their standard deviations."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

from ehmo.records.bonding import BondChannel
from ehmo.records.report import BondReport
from ehmo.records.wording import FULL_CHANNEL, PARTIAL_CHANNEL, with_deviation
from ehmo.report.figures.canvas import COLUMN_CM, SMALL_POINTS, TEXT_POINTS, drawn, new_figure, paper_axes
from ehmo.report.figures.levels import LABEL_CM
from ehmo.report.figures.markup import NOTE_CM, chemical, note_lines, part, write, write_notes
from ehmo.report.figures.markup import width_cm as width_of
from ehmo.report.formula import complex_formula
from ehmo.report.look import LIGHT, Look

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

LISTED_CHANNEL: Final = 0.05
"""Weight from which a channel gets a bar."""

ALIKE: Final = 0.01
"""Bonds of one kind whose lengths [angstrom] and weights differ by less share a row."""

_BAR_CM, _STEP_CM = 0.17, 0.27
_BETWEEN_CM = 0.16
_TOP_CM, _BOTTOM_CM = 1.05, 0.95
_TALLEST_CM = 23.0
_VALUE_CM = 0.62  # room right of the longest bar for its number


@dataclass(frozen=True, slots=True)
class _Row:
    """Bonds that are alike, shown by the first."""

    place: int
    count: int
    channels: tuple[BondChannel, ...]
    name: str
    kind: str
    numbers: tuple[str, str]
    deviations: tuple[float, ...]

    @property
    def height(self) -> float:
        return max(len(self.channels) * _STEP_CM, 2 * LABEL_CM) + _BETWEEN_CM


@drawn
def channel_bars(report: BondReport, *, look: Look = LIGHT, width_cm: float = COLUMN_CM) -> Figure:
    """Sigma, pi and delta channels of every bond as bars, whose lengths are their weights.

    Bonds of one kind that are alike share a row. Thin lines at the ends of bars are one standard deviation to either
    side, where the report has a spread. Rules stand at the weights from which a channel counts as partial or full.

    Parameters
    ----------
    report : BondReport
    look : Look
        Colours.
    width_cm : float
        [cm]

    Returns
    -------
    figure : Figure
    """
    rows = _rows(report)
    room, kept = _TALLEST_CM - _TOP_CM - _BOTTOM_CM, 0
    while kept < len(rows) and room >= rows[kept].height:
        room -= rows[kept].height
        kept += 1
    left_out = sum(row.count for row in rows[kept:])
    rows = rows[:kept]
    height = _TOP_CM + _BOTTOM_CM + sum(row.height for row in rows)
    notes = note_lines(_notes(report, left_out), width_cm - 0.12)
    below = NOTE_CM * (len(notes) - 1)
    figure = new_figure(width_cm, height + below, layout=None)
    axes = paper_axes(figure, below)
    mayer = [width_of(row.numbers[0], SMALL_POINTS) for row in rows]
    formal_x = width_cm - 0.1
    mayer_x = formal_x - max(0.75, *(width_of(row.numbers[1], SMALL_POINTS) for row in rows)) - 0.15
    names = [width_of(text, SMALL_POINTS) for row in rows for text in (row.name, row.kind)]
    start = 0.06 + max(names) + 0.4
    end = mayer_x - max(0.7, *mayer) - _VALUE_CM
    heaviest = max((channel.weight for row in rows for channel in row.channels), default=1.0)
    scale = (end - start) / max(1.0, heaviest)
    _draw_frame(axes, start, scale, height, look)
    write(
        axes, 0.06, height - 0.3, chemical(complex_formula(report), report.fragment.charge), ha="left", va="center",
        fontsize=TEXT_POINTS + 1, gid="label head",
    )  # fmt: skip
    for x, text in ((mayer_x, "Mayer"), (formal_x, "formal")):
        write(
            axes, x, height - 0.78, text, ha="right", va="center", fontsize=SMALL_POINTS, color=look.muted,
            gid="label head",
        )  # fmt: skip
    y = height - _TOP_CM
    for row in rows:
        _draw_row(axes, row, y, (start, scale), (mayer_x, formal_x), look)
        y -= row.height
        if row is not rows[-1]:
            axes.plot([0.06, width_cm - 0.06], [y, y], color=look.grid, lw=0.5, zorder=0)
    write_notes(axes, notes, look)
    return figure


def _notes(report: BondReport, left_out: int) -> list[str]:
    notes = ["bar: weight of the channel"]
    if report.spread is not None:
        notes.append("line: \N{PLUS-MINUS SIGN} one standard deviation")
    if left_out:
        notes.append(f"{left_out} further bonds not drawn")
    return notes


def _rows(report: BondReport) -> list[_Row]:
    """Distinct bonds in the order of the report, those alike together."""
    groups: list[list[int]] = []
    for place in report.distinct_bonds():
        found = next((group for group in groups if _alike(report, group[0], place)), None)
        if found is None:
            groups.append([place])
        else:
            found.append(place)
    return [_row(report, group) for group in groups]


def _listed(report: BondReport, place: int) -> tuple[BondChannel, ...]:
    return tuple(channel for channel in report.orders[place].channels if channel.weight >= LISTED_CHANNEL)


def _alike(report: BondReport, one: int, other: int) -> bool:
    a, b = (report.coordination.bonds[k] for k in (one, other))
    symbols = report.fragment.symbols
    if (a.metal, a.kind, symbols[a.donor]) != (b.metal, b.kind, symbols[b.donor]):
        return False
    first, second = _listed(report, one), _listed(report, other)
    return (
        abs(a.length_A - b.length_A) < ALIKE
        and abs(report.orders[one].mayer - report.orders[other].mayer) < ALIKE
        and [channel.type for channel in first] == [channel.type for channel in second]
        and all(abs(x.weight - y.weight) < ALIKE for x, y in zip(first, second, strict=True))
    )


def _row(report: BondReport, places: Sequence[int]) -> _Row:
    place = places[0]
    bond, order, formal = report.coordination.bonds[place], report.orders[place], report.formal_orders[place]
    own = None if report.spread is None else report.spread.bonds[place]
    channels = _listed(report, place)
    name = report.bond_label(bond).replace("-", "\N{EN DASH}")
    crystal = report.fragment.crystal
    if crystal is None and len(places) > 1:
        name += f"  ({len(places)} alike)"
    return _Row(
        place,
        len(places),
        channels,
        name,
        f"{bond.kind}, {bond.length_A:.3f} Å",
        (
            with_deviation(f"{order.mayer:.2f}", None if own is None else own.mayer, 2),
            "?" if formal is None else str(formal.order),
        ),
        () if own is None else own.channel_weights[: len(channels)],
    )


def _draw_frame(axes: Axes, start: float, scale: float, height: float, look: Look) -> None:
    """Axis of the weights, and the rules from which a channel counts."""
    low, high = _BOTTOM_CM - 0.05, height - _TOP_CM
    axes.plot([start, start], [low, high], color=look.ink, lw=0.6, zorder=3)
    for value, word in ((PARTIAL_CHANNEL, "partial"), (FULL_CHANNEL, "full")):
        x = start + value * scale
        axes.plot([x, x], [low, high + 0.1], color=look.muted, lw=0.5, ls=(0, (1, 2)), zorder=1)
        write(
            axes, x, high + 0.27, word, ha="center", va="center", fontsize=SMALL_POINTS, color=look.muted,
            gid="label head",
        )  # fmt: skip
    axes.plot([start, start + scale], [low, low], color=look.ink, lw=0.6)
    for value in (0.0, PARTIAL_CHANNEL, FULL_CHANNEL, 1.0):
        x = start + value * scale
        axes.plot([x, x], [low, low - 0.08], color=look.ink, lw=0.6)
        write(axes, x, low - 0.24, f"{value:g}", ha="center", va="center", fontsize=SMALL_POINTS, gid="tick")


def _draw_row(
    axes: Axes, row: _Row, top: float, bars: tuple[float, float], columns: tuple[float, float], look: Look
) -> None:
    start, scale = bars
    middle = top - row.height / 2
    for text, y, colour in ((row.name, middle + LABEL_CM / 2, look.ink), (row.kind, middle - LABEL_CM / 2, look.muted)):
        write(axes, 0.06, y, text, ha="left", va="center", fontsize=SMALL_POINTS, color=colour, gid="label bond")
    for x, text in zip(columns, row.numbers, strict=True):
        write(axes, x, middle, text, ha="right", va="center", fontsize=SMALL_POINTS, gid="label number")
    first = middle + (len(row.channels) - 1) * _STEP_CM / 2
    for k, channel in enumerate(row.channels):
        y, end, colour = first - k * _STEP_CM, start + channel.weight * scale, look.part(channel.type)
        axes.fill_between(
            [start, end], [y - _BAR_CM / 2] * 2, [y + _BAR_CM / 2] * 2, color=colour, lw=0, zorder=2, gid="bar"
        )
        write(
            axes, start - 0.08, y, part(channel.type), ha="right", va="center", fontsize=SMALL_POINTS, color=colour,
            gid="label channel",
        )  # fmt: skip
        far = end
        if row.deviations:
            half = row.deviations[k] * scale
            far = end + half
            axes.plot([end - half, far], [y, y], color=look.ink, lw=0.8, zorder=4, gid="deviation")
            for x in (end - half, far):
                axes.plot([x, x], [y - 0.05, y + 0.05], color=look.ink, lw=0.8, zorder=4)
        write(
            axes, far + 0.07, y, f"{channel.weight:.2f}", ha="left", va="center", fontsize=SMALL_POINTS, zorder=5,
            gid="label weight", bbox={"facecolor": look.paper, "edgecolor": "none", "pad": 0.2},
        )  # fmt: skip
