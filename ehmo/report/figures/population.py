"""Overlap population of a bond, orbital by orbital, against energy."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING, Final

import numpy as np

from ehmo.analysis.interaction import bond_interaction
from ehmo.records.electronic import NO_ELECTRON
from ehmo.records.interaction import OrbitalSet
from ehmo.records.report import BondReport
from ehmo.report.figures.canvas import COLUMN_CM, SMALL_POINTS, TEXT_POINTS, drawn, new_figure, paper_axes
from ehmo.report.figures.energy_axis import EnergyAxis, energy_axis
from ehmo.report.figures.interaction import chosen_bond, top_of_interest
from ehmo.report.figures.levels import LABEL_CM
from ehmo.report.figures.markup import NOTE_CM, chemical, irrep, joined, note_lines, part, write, write_notes
from ehmo.report.figures.markup import width_cm as width_of
from ehmo.report.figures.placement import spread_out
from ehmo.report.formula import complex_formula
from ehmo.report.look import LIGHT, Look

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

SHOWN: Final = 0.005
"""Overlap population of a full level, in one bond, from which it gets a bar [e]."""

MOST_LEVELS: Final = 45

_AXIS_CM, _TOP_CM, _BOTTOM_CM = 0.85, 1.3, 1.35
_SHORTEST_CM, _TALLEST_CM = 9.0, 22.0
_BAR_CM = 0.13


@dataclass(frozen=True, slots=True)
class _Bar:
    """One level of the fragment."""

    energy_eV: float
    population: float
    electrons: float
    capacity: float
    level: OrbitalSet

    @property
    def filled(self) -> bool:
        return self.electrons > NO_ELECTRON


@drawn
def overlap_population(
    report: BondReport, bond: int | None = None, *, look: Look = LIGHT, width_cm: float = COLUMN_CM
) -> Figure:
    """Bars of the overlap population that each level has in a bond when full, and their running sum.

    Bonding levels point right, antibonding ones left. Levels with electrons are filled, empty ones hollow. The line
    adds up what the electrons make of them, from the lowest level, and ends at the overlap population of the bond.
    With several bonds that are alike, all numbers are for one of them.

    Parameters
    ----------
    report : BondReport
    bond : int, optional
        Place of the bond in the report; by default the shortest one that may be multiple, else the shortest.
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
        If the report has no such bond.
    """
    place = chosen_bond(report, bond)
    found = bond_interaction(report, place)
    top = top_of_interest(report)
    every = [_bar(level, len(found.bonds)) for level in found.sets]
    bars = [bar for bar in every if abs(bar.population) >= SHOWN and (bar.energy_eV <= top or bar.filled)]
    bars = sorted(sorted(bars, key=lambda bar: -abs(bar.population))[:MOST_LEVELS], key=lambda bar: bar.energy_eV)
    height = float(np.clip(_TOP_CM + _BOTTOM_CM + 1.2 * LABEL_CM * len(bars), _SHORTEST_CM, _TALLEST_CM))
    scale = energy_axis([bar.energy_eV for bar in bars], _BOTTOM_CM + 0.15, height - _TOP_CM)
    notes = ["hollow: empty", "line: sum over the electrons"]
    if len(found.bonds) > 1:
        notes.append(f"one of {len(found.bonds)} bonds")
    notes = note_lines(notes, width_cm - 0.12)
    below = NOTE_CM * (len(notes) - 1)
    figure = new_figure(width_cm, height + below, layout=None)
    axes = paper_axes(figure, below)
    sums = _running_sum(every)
    labels = [_label(bar) for bar in bars]
    right = width_cm - 0.1 - max(width_of(label, SMALL_POINTS) for label in labels) - 0.35
    low = min([0.0, *(bar.population for bar in bars)])
    high = max([0.0, *(bar.population for bar in bars), *(value for _, value in sums)])
    unit = (right - _AXIS_CM - 0.3) / (high - low)
    zero = _AXIS_CM + 0.2 - low * unit
    _draw_frame(axes, scale, (zero, unit, low, high), look)
    wanted = [scale.height_cm(bar.energy_eV) for bar in bars]
    # Bars of nearly one energy stand one above the other.
    wanted = spread_out(wanted, [_BAR_CM + 0.03] * len(bars), _BOTTOM_CM, height - _TOP_CM + 0.1).tolist()
    _draw_bars(axes, bars, wanted, (zero, unit), look)
    _draw_sum(axes, sums, scale, (zero, unit), look)
    heights = spread_out(wanted, [LABEL_CM] * len(bars), _BOTTOM_CM - 0.1, height - _TOP_CM + 0.1)
    for bar, label, y, at in zip(bars, labels, wanted, heights, strict=True):
        colour = look.part(bar.level.symmetry) if bar.level.symmetry else look.ink
        axes.plot([right + 0.05, right + 0.3], [y, at], color=look.grid, lw=0.5, zorder=0)
        write(
            axes, right + 0.35, at, label, ha="left", va="center", fontsize=SMALL_POINTS, color=colour, gid="label set"
        )
    name = report.bond_label(report.coordination.bonds[place]).replace("-", "\N{EN DASH}")
    head = joined(chemical(complex_formula(report), report.fragment.charge), name)
    write(axes, 0.06, height - 0.3, head, ha="left", va="center", fontsize=TEXT_POINTS + 1, gid="label head")
    write_notes(axes, notes, look)
    return figure


def _bar(level: OrbitalSet, n_bonds: int) -> _Bar:
    """Level with its overlap population in one of the bonds, all of its orbitals full."""
    size = len(level.orbitals)
    return _Bar(level.energy_eV, size * level.overlap_population / n_bonds, level.alpha + level.beta, 2.0 * size, level)


def _label(bar: _Bar) -> str:
    return joined(irrep(bar.level.label), part(bar.level.part))


def _running_sum(bars: Sequence[_Bar]) -> list[tuple[float, float]]:
    """Energy and sum up to it, for every level with electrons."""
    sums, total = [], 0.0
    for bar in sorted(bars, key=lambda bar: bar.energy_eV):
        if bar.filled:
            total += bar.population * bar.electrons / bar.capacity
            sums.append((bar.energy_eV, total))
    return sums


def _draw_frame(axes: Axes, scale: EnergyAxis, across: tuple[float, float, float, float], look: Look) -> None:
    zero, unit, low, high = across
    ends, x = scale.ends_cm(), _AXIS_CM
    for bottom, top in ends:
        axes.plot([x, x], [bottom, top], color=look.ink, lw=0.6, solid_capstyle="butt")
        axes.plot([zero, zero], [bottom, top], color=look.muted, lw=0.5, zorder=1)
    for (_, below), (above, _) in pairwise(ends):
        for y in (below, above):
            axes.plot([x - 0.09, x + 0.09], [y - 0.04, y + 0.04], color=look.ink, lw=0.6)
    for value in scale.ticks_eV():
        y = scale.height_cm(value)
        axes.plot([x - 0.09, x], [y, y], color=look.ink, lw=0.6)
        text = f"{value:g}".replace("-", "\N{MINUS SIGN}")
        write(axes, x - 0.13, y, text, ha="right", va="center", fontsize=SMALL_POINTS, gid="tick")
    top = ends[-1, 1]
    write(
        axes, 0.06, top + 0.25, "energy/eV", ha="left", va="center", fontsize=SMALL_POINTS, color=look.muted,
        gid="label axis",
    )  # fmt: skip
    for at, word, side in ((zero - 0.1, "antibonding", "right"), (zero + 0.1, "bonding", "left")):
        room = at - 1.35 if side == "right" else axes.get_xlim()[1] - at
        if width_of(word, SMALL_POINTS) < room:
            write(
                axes, at, top + 0.25, word, ha=side, va="center", fontsize=SMALL_POINTS, color=look.muted,
                gid="label head",
            )  # fmt: skip
    y = _BOTTOM_CM - 0.15
    axes.plot([zero + low * unit, zero + high * unit], [y, y], color=look.ink, lw=0.6)
    step = next(s for s in (0.02, 0.05, 0.1, 0.2, 0.5, 1.0, 2.0) if s * unit > 0.75)
    for k in range(int(np.ceil(low / step - 1e-9)), int(np.floor(high / step + 1e-9)) + 1):
        x = zero + k * step * unit
        axes.plot([x, x], [y, y - 0.08], color=look.ink, lw=0.6)
        text = f"{k * step:g}".replace("-", "\N{MINUS SIGN}")
        write(axes, x, y - 0.23, text, ha="center", va="center", fontsize=SMALL_POINTS, gid="tick across")
    write(
        axes, max(zero, 2.0), y - 0.53, "overlap population/e", ha="center", va="center", fontsize=SMALL_POINTS,
        gid="label axis",
    )  # fmt: skip


def _draw_bars(
    axes: Axes, bars: Sequence[_Bar], heights: Sequence[float], across: tuple[float, float], look: Look
) -> None:
    zero, unit = across
    for bar, y in zip(bars, heights, strict=True):
        end = zero + bar.population * unit
        colour = look.part(bar.level.symmetry) if bar.level.symmetry else look.muted
        axes.fill_between(
            [zero, end], [y - _BAR_CM / 2] * 2, [y + _BAR_CM / 2] * 2, facecolor=colour if bar.filled else look.paper,
            edgecolor=colour, lw=0.7, zorder=3, gid="bar",
        )  # fmt: skip


def _draw_sum(
    axes: Axes, sums: Sequence[tuple[float, float]], scale: EnergyAxis, across: tuple[float, float], look: Look
) -> None:
    """Staircase of the sum, with its last value."""
    from matplotlib.patheffects import withStroke

    if not sums:
        return
    zero, unit = across
    xs, ys = [zero], [scale.ends_cm()[0, 0]]
    for energy, value in sums:
        y = scale.height_cm(energy)
        xs += [xs[-1], zero + value * unit]
        ys += [y, y]
    halo = withStroke(linewidth=2.0, foreground=look.paper)
    axes.plot(xs, ys, color=look.ink, lw=0.8, zorder=4, gid="sum", path_effects=[halo])
    write(
        axes, xs[-1], ys[-1] + 0.2, f"{sums[-1][1]:.2f}", ha="center", va="center", fontsize=SMALL_POINTS, zorder=6,
        gid="label sum", bbox={"facecolor": look.paper, "edgecolor": "none", "pad": 0.4},
    )  # fmt: skip
