"""Many bonds at once: order against length by metal and kind, those off the trend named."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import PurePath
from typing import TYPE_CHECKING, Final

import numpy as np

from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray
from ehmo.records.report import BondReport
from ehmo.records.store_summary import Trend
from ehmo.report.figures.canvas import (
    DOUBLE_COLUMN_CM,
    SMALL_POINTS,
    TEXT_POINTS,
    axes_at,
    drawn,
    new_figure,
    paper_axes,
    plain,
)
from ehmo.report.figures.markup import width_cm as width_of
from ehmo.report.figures.markup import write
from ehmo.report.look import LIGHT, Look
from ehmo.store.distributions import FENCE, LEAST_BONDS, LEAST_RANGES, beyond_quartiles
from ehmo.store.trends import order_trend

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

MOST_PANELS: Final = 12
MOST_NAMED: Final = 12
"""Metals with a panel of their own, and bonds off the trend that are named."""

_MANY_POINTS = 2000  # drawn as a picture within the figure beyond
_PANEL_CM, _GAP_CM, _LEFT_CM, _BOTTOM_CM, _TOP_CM = 2.7, 0.3, 1.05, 1.05, 0.75
_WANTED_PANEL_CM = 3.4
_MOST_ROWS = 5
_LINE_CM = 0.31
_MARKERS = ("o", "s", "^", "D")


@dataclass(frozen=True, slots=True)
class PlottedBond:
    """One bond of many.

    Attributes
    ----------
    metal : str
        Symbol.
    kind : str
        Kind of the donor.
    length_A : float
    mayer : float
    source, label : str
        Structure and bond in it (hostile text: shown letter by letter).
    """

    metal: str
    kind: str
    length_A: float
    mayer: float
    source: str
    label: str


@dataclass(frozen=True, slots=True)
class OffTrend:
    """A bond off the trend of its like.

    Attributes
    ----------
    bond : PlottedBond
    distance : float
        Of its Mayer order from the trend.
    """

    bond: PlottedBond
    distance: float


def bonds_of(reports: Iterable[BondReport]) -> list[PlottedBond]:
    """Distinct bonds of some reports."""
    found = []
    for report in reports:
        source = PurePath(report.fragment.source).name or report.fragment.formula
        for place in report.distinct_bonds():
            bond = report.coordination.bonds[place]
            found.append(
                PlottedBond(
                    report.fragment.symbols[bond.metal],
                    str(bond.kind),
                    bond.length_A,
                    report.orders[place].mayer,
                    source,
                    report.bond_label(bond),
                )
            )
    return found


def off_trend(bonds: Sequence[PlottedBond]) -> list[OffTrend]:
    """Bonds far off the order-length line of their metal and kind, by the rule of the summary of a store.

    Parameters
    ----------
    bonds : sequence of PlottedBond

    Returns
    -------
    off : list of OffTrend
        Farthest from the line first; of those that are alike in a structure the first.
    """
    found: dict[tuple[str, str, str, float, float], OffTrend] = {}
    for members in _groups(bonds).values():
        line = _trend(members)
        if line is None:
            continue
        lengths, orders = _arrays(members)
        distances = orders - line.at(lengths)
        far = beyond_quartiles(distances, LEAST_RANGES["mayer"]) > FENCE
        for k in np.flatnonzero(far):
            bond = members[k]
            like = (bond.source, bond.metal, bond.kind, round(bond.length_A, 2), round(bond.mayer, 2))
            found.setdefault(like, OffTrend(bond, float(distances[k])))
    return sorted(found.values(), key=lambda off: (-abs(off.distance), off.bond.source, off.bond.label))


def _groups(bonds: Sequence[PlottedBond]) -> dict[tuple[str, str], list[PlottedBond]]:
    """Bonds of one metal and kind."""
    groups: dict[tuple[str, str], list[PlottedBond]] = {}
    for bond in bonds:
        groups.setdefault((bond.metal, bond.kind), []).append(bond)
    return groups


def _arrays(bonds: Sequence[PlottedBond]) -> tuple[FloatArray, FloatArray]:
    return np.array([bond.length_A for bond in bonds]), np.array([bond.mayer for bond in bonds])


def _trend(bonds: Sequence[PlottedBond]) -> Trend | None:
    """Line of the bonds of one metal and kind; None for too few."""
    return order_trend(*_arrays(bonds)) if len(bonds) >= LEAST_BONDS else None


@drawn
def overview_figure(bonds: Sequence[PlottedBond], *, look: Look = LIGHT, width_cm: float = DOUBLE_COLUMN_CM) -> Figure:
    """Mayer order against length, one panel for each metal, one mark for each kind of donor.

    Lines and numbered bonds are those of the summary of a store: resistant lines, and bonds far off them. Their names
    stand under the panels.

    Parameters
    ----------
    bonds : sequence of PlottedBond
    look : Look
        Colours.
    width_cm : float
        [cm]

    Returns
    -------
    figure : Figure

    Raises
    ------
    InputError
        If there are no bonds with an order.
    """
    usable = [bond for bond in bonds if np.isfinite(bond.length_A) and np.isfinite(bond.mayer)]
    if not usable:
        raise InputError("there are no bonds to draw", mend="give a store with finished calculations")
    across = max(1, int((width_cm - _LEFT_CM) / _WANTED_PANEL_CM))
    most = min(MOST_PANELS, _MOST_ROWS * across)
    metals = [metal for metal, _ in Counter(bond.metal for bond in usable).most_common(most)]
    kinds = [kind for kind, _ in Counter(bond.kind for bond in usable).most_common(len(_MARKERS))]
    named = [off for off in off_trend(usable) if off.bond.metal in metals][:MOST_NAMED]
    columns = min(len(metals), across)
    rows = -(-len(metals) // columns)
    key = _key_lines(kinds, any(bond.kind not in kinds for bond in usable), width_cm)
    foot = _BOTTOM_CM + _LINE_CM * (len(key) + len(named)) + 0.35
    height = foot + rows * _PANEL_CM + (rows - 1) * _GAP_CM + _TOP_CM
    figure = new_figure(width_cm, height, layout=None)
    paper = paper_axes(figure)
    paper.set_zorder(5)
    panel = (width_cm - _LEFT_CM - 0.2 - (columns - 1) * _GAP_CM) / columns
    limits = _limits(usable)
    for k, metal in enumerate(metals):
        row, column = divmod(k, columns)
        left = _LEFT_CM + column * (panel + _GAP_CM)
        bottom = height - _TOP_CM - (row + 1) * _PANEL_CM - row * _GAP_CM
        axes = axes_at(figure, left, bottom, panel, _PANEL_CM)
        axes.set_xlim(*limits[0])
        axes.set_ylim(*limits[1])
        axes.locator_params(nbins=4)
        axes.tick_params(labelleft=column == 0, labelbottom=k + columns >= len(metals))
        own = [bond for bond in usable if bond.metal == metal]
        _draw_bonds(axes, own, kinds, look)
        offs = {n: off for n, off in enumerate(named, 1) if off.bond.metal == metal}
        _draw_numbers(paper, offs, (left, bottom, panel), limits, look)
        write(
            paper, left + panel - 0.08, bottom + _PANEL_CM - 0.17, f"{metal}, {len(own)}", ha="right", va="center",
            fontsize=SMALL_POINTS, gid="label metal",
        )  # fmt: skip
    _draw_words(paper, usable, metals, (foot, height, width_cm), look)
    _draw_key(paper, key, foot - _BOTTOM_CM - 0.05, look)
    for n, off in enumerate(named, 1):
        y = foot - _BOTTOM_CM - 0.05 - _LINE_CM * (len(key) + n - 1)
        distance = f"{off.distance:+.2f}".replace("-", "\N{MINUS SIGN}")
        tail = f" {plain(off.bond.label)}, {off.bond.kind}, {off.bond.length_A:.3f} Å, {distance} from the trend"
        name = _fitted(plain(off.bond.source), width_cm - 0.5 - width_of(tail, SMALL_POINTS))
        write(paper, 0.32, y, str(n), ha="right", va="center", fontsize=SMALL_POINTS, gid="named")
        write(paper, 0.42, y, name + tail, ha="left", va="center", fontsize=SMALL_POINTS, gid="named")
    return figure


def _limits(bonds: Sequence[PlottedBond]) -> tuple[tuple[float, float], tuple[float, float]]:
    lengths, orders = _arrays(bonds)
    across, up = max(float(np.ptp(lengths)), 0.1), max(float(np.ptp(orders)), 0.3)
    return (
        (float(lengths.min()) - 0.06 * across, float(lengths.max()) + 0.06 * across),
        (min(0.0, float(orders.min()) - 0.05 * up), float(orders.max()) + 0.2 * up),
    )


def _style(kind: str, kinds: Sequence[str], look: Look) -> tuple[str, str]:
    """Marker and colour of a kind; a point for those without a mark of their own."""
    if kind not in kinds:
        return ".", look.muted
    place = list(kinds).index(kind)
    return _MARKERS[place], look.series[place]


def _draw_bonds(axes: Axes, bonds: Sequence[PlottedBond], kinds: Sequence[str], look: Look) -> None:
    for (_, kind), members in _groups(bonds).items():
        marker, colour = _style(kind, kinds, look)
        lengths, orders = _arrays(members)
        axes.plot(
            lengths, orders, marker=marker, ms=2.4 if kind in kinds else 2.8, mfc="none" if kind in kinds else colour,
            mec=colour, mew=0.6, ls="none", zorder=3, gid="bonds", rasterized=len(bonds) > _MANY_POINTS,
        )  # fmt: skip
        line = _trend(members)
        if line is not None:
            first, last = np.quantile(lengths, (0.05, 0.95))  # not out to an outlier
            at = np.linspace(first, last, 25)
            axes.plot(at, line.at(at), color=colour, lw=0.8, alpha=0.8, zorder=2, gid="trend")


def _draw_numbers(
    paper: Axes,
    offs: dict[int, OffTrend],
    place: tuple[float, float, float],
    limits: tuple[tuple[float, float], tuple[float, float]],
    look: Look,
) -> None:
    """Numbers beside the bonds off their trend, none over another."""
    left, bottom, width = place
    (x0, x1), (y0, y1) = limits
    taken: list[tuple[float, float]] = []
    for n, off in offs.items():
        x = left + (off.bond.length_A - x0) / (x1 - x0) * width
        y = bottom + (off.bond.mayer - y0) / (y1 - y0) * _PANEL_CM
        for k in range(64):
            turn, reach = np.pi / 4 * (k % 8), 0.2 + 0.14 * (k // 8)
            at = (x + 1.3 * reach * np.cos(turn), y + reach * np.sin(turn))
            inside = left + 0.1 < at[0] < left + width - 0.1 and bottom + 0.1 < at[1] < bottom + _PANEL_CM - 0.4
            if inside and all(abs(at[0] - a) > 0.3 or abs(at[1] - b) > 0.22 for a, b in taken):
                break
        taken.append(at)
        paper.plot([x, at[0]], [y, at[1]], color=look.ink, lw=0.4, zorder=5)
        write(
            paper, *at, str(n), ha="center", va="center", fontsize=SMALL_POINTS - 0.5, zorder=6, gid="number",
            bbox={"facecolor": look.paper, "edgecolor": "none", "pad": 0.3},
        )  # fmt: skip


def _key_lines(kinds: Sequence[str], others: bool, width: float) -> list[list[tuple[str, float]]]:
    """Entries of the key, line by line, with the place of each [cm]."""
    lines: list[list[tuple[str, float]]] = [[]]
    x = 0.06
    for text in (*kinds, *(("other kinds",) if others else ())):
        size = 0.3 + width_of(text, SMALL_POINTS) + 0.35
        if lines[-1] and x + size > width:
            lines.append([])
            x = 0.06
        lines[-1].append((text, x))
        x += size
    return lines


def _draw_key(paper: Axes, lines: Sequence[Sequence[tuple[str, float]]], top: float, look: Look) -> None:
    kinds = [text for line in lines for text, _ in line if text != "other kinds"]
    for row, line in enumerate(lines):
        for text, x in line:
            marker, colour = _style(text, kinds, look)
            y = top - row * _LINE_CM
            paper.plot(
                [x + 0.1], [y], marker=marker, ms=3, mfc="none" if text in kinds else colour, mec=colour, mew=0.8,
                ls="none",
            )  # fmt: skip
            write(paper, x + 0.28, y, text, ha="left", va="center", fontsize=SMALL_POINTS, gid="key")


def _draw_words(
    paper: Axes, bonds: Sequence[PlottedBond], metals: Sequence[str], sizes: tuple[float, float, float], look: Look
) -> None:
    foot, height, width = sizes
    drawn_bonds = sum(bond.metal in metals for bond in bonds)
    head = f"{drawn_bonds:,} bonds of {len(metals)} metal{'s' if len(metals) > 1 else ''}"
    if drawn_bonds < len(bonds):
        head += f"; {len(bonds) - drawn_bonds:,} of other metals not drawn"
    write(
        paper, 0.06, height - 0.35, head, ha="left", va="center", fontsize=SMALL_POINTS, color=look.muted,
        gid="label head",
    )  # fmt: skip
    write(
        paper, (_LEFT_CM + width) / 2, foot - 0.72, "length/Å", ha="center", va="center", fontsize=TEXT_POINTS,
        gid="label axis",
    )  # fmt: skip
    write(
        paper, 0.2, (foot + height - _TOP_CM) / 2, "Mayer order", ha="center", va="center", rotation=90,
        fontsize=TEXT_POINTS, gid="label axis",
    )  # fmt: skip


def _fitted(text: str, room: float) -> str:
    """Text, its middle left out where it is longer than the room [cm]."""
    full = width_of(text, SMALL_POINTS)
    if full <= room:
        return text
    for kept in range(int(len(text) * room / full) + 2, 2, -1):
        head = kept // 2
        short = f"{text[:head]}...{text[len(text) - (kept - head) :]}"
        if width_of(short, SMALL_POINTS) <= room:
            return short
    return "..."
