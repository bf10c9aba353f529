"""Ladder of a metal, the terms it gives, and observed bands beside them, on one scale."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Final

import numpy as np

from ehmo.errors import InputError
from ehmo.records.ligand_field import Ladder
from ehmo.records.multiplets import Term
from ehmo.records.report import BondReport
from ehmo.records.site import MetalSite
from ehmo.report.figures.canvas import COLUMN_CM, SMALL_POINTS, TEXT_POINTS, drawn, new_figure, paper_axes
from ehmo.report.figures.levels import ARROW_CM, DASH_CM, GAP_CM, LABEL_CM, draw_electrons, draw_set, set_width
from ehmo.report.figures.markup import (
    NOTE_CM,
    chemical,
    function,
    irrep,
    joined,
    note_lines,
    term,
    write,
    write_notes,
)
from ehmo.report.figures.markup import width_cm as width_of
from ehmo.report.figures.placement import side_by_side, spread_out
from ehmo.report.formula import complex_formula
from ehmo.report.look import LIGHT, Look
from ehmo.units import PER_CM_PER_EV

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

MOST_TERMS: Final = 32
"""Terms that get a label; those of the ground term's multiplicity come first, then the lowest."""

THOUSAND: Final = 1000.0

_TOP_CM, _BOTTOM_CM = 1.27, 0.75
_SHORTEST_CM, _TALLEST_CM = 8.0, 18.0
_SAME_LABEL_CM = 0.12  # levels of one irrep within this height share a label
_SAME_TERM = 1e-3  # 10^3 cm^-1
_NARROW_CM = 1.0  # with less room for the gaps, terms are named without their energies
_AXIS_CM, _EV_AXIS_CM = 0.8, 0.65
_TERM_LABEL_CM, _BAND_LABEL_CM = 0.82, 0.14


@dataclass(frozen=True, slots=True)
class _Mark:
    """A horizontal mark with its label, heights in 10^3 cm^-1."""

    height: float
    label: str
    bare: str
    strong: bool = True
    labelled: bool = True


@dataclass(frozen=True, slots=True)
class _Scale:
    """10^3 cm^-1 to centimetres on paper."""

    low: float
    high: float
    height: float

    def at(self, value: float) -> float:
        span = self.height - _TOP_CM - _BOTTOM_CM
        return _BOTTOM_CM + (value - self.low) / (self.high - self.low) * span


@drawn
def ladder_figure(
    report: BondReport, metal: int | None = None, *, look: Look = LIGHT, width_cm: float = COLUMN_CM
) -> Figure:
    """Levels of the ladder with their electrons, computed terms, and observed bands if some were given.

    All columns share one scale in 10^3 cm^-1: levels above the lowest level, terms and bands above the ground term
    of the spin that the fragment has. Terms of that spin are drawn strong, others thin. A grey bar behind a level is
    twice its standard deviation, where the report has a spread. Dotted lines join observed bands to the terms that
    they are assigned to.

    Parameters
    ----------
    report : BondReport
    metal : int, optional
        Atom index; by default the first metal with a ladder.
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
        If the metal has no ladder.
    """
    site, ladder = _site(report, metal)
    heights = [(level.energy_eV - ladder.levels[0].energy_eV) * PER_CM_PER_EV / THOUSAND for level in ladder.levels]
    observed = _observed(report) if len(report.sites) == 1 else []
    bands = [value for pair in observed for value in pair[:2]]
    terms = _terms(report, max([heights[-1], *bands]) * 1.08)
    shown = [mark for mark in terms if mark.labelled]
    height = float(np.clip(_TOP_CM + _BOTTOM_CM + 1.15 * len(shown) * LABEL_CM, _SHORTEST_CM, _TALLEST_CM))
    low = min([0.0, *(mark.height for mark in terms)])
    high = max([heights[-1], *(mark.height for mark in terms), *bands])
    high = max(high, low + 1.0)
    margin = 0.04 * (high - low)
    scale = _Scale(low - margin, high + margin, height)
    notes = note_lines(_notes(report, terms), width_cm - 0.12)
    below = NOTE_CM * (len(notes) - 1)
    figure = new_figure(width_cm, height + below, layout=None)
    axes = paper_axes(figure, below)
    _draw_axis(axes, scale, width_cm, look)
    write(
        axes, 0.06, height - 0.3, chemical(complex_formula(report), report.fragment.charge), ha="left", va="center",
        fontsize=TEXT_POINTS + 1, gid="label head",
    )  # fmt: skip
    levels = _Levels.of(report, ladder, [scale.at(value) for value in heights])
    if width_cm - _AXIS_CM - _EV_AXIS_CM - levels.width - _terms_width(terms) - _observed_width(observed) < _NARROW_CM:
        terms = [replace(mark, label=mark.bare) for mark in terms]
    columns = _columns(width_cm, [levels.width, _terms_width(terms), _observed_width(observed)])
    _heading(axes, scale, columns[0], f"{report.fragment.labels[site.metal]} {ladder.shell} levels", look)
    _draw_levels(axes, levels, _deviations(report, site), scale, columns[0], look)
    write_notes(axes, notes, look)
    label_heights = _draw_terms(axes, terms, scale, columns[1], look) if terms else {}
    if observed:
        start = columns[1] + _terms_width(terms) + 0.05
        _draw_observed(axes, observed, scale, (start, label_heights), columns[2], look)
    return figure


def _site(report: BondReport, metal: int | None) -> tuple[MetalSite, Ladder]:
    sites = [site for site in report.sites if metal is None or site.metal == metal]
    for site in sites:
        if site.ladder is not None:
            return site, site.ladder
    reason = next((site.ladder_withheld for site in sites if site.ladder_withheld), "no such metal")
    raise InputError(f"there is no ladder to draw: {reason}", place=report.fragment.source, mend="draw another figure")


def _terms(report: BondReport, top: float) -> list[_Mark]:
    """Terms up to a height, above the ground term of the fragment's spin."""
    found, ground = report.spectroscopy.terms, report.spectroscopy.ground_term
    if found is None:
        return []
    own = next((t for t in found.terms if t.label == ground), found.terms[0])

    def above(one: Term) -> float:
        return (one.energy_per_cm - own.energy_per_cm) / THOUSAND

    listed = [t for t in found.terms if above(t) <= top]
    ranked = sorted(listed, key=lambda t: (t.multiplicity != own.multiplicity, above(t)))
    labelled = {id(t) for t in ranked[:MOST_TERMS]}
    marks = []
    for one in listed:
        strong, name = one.multiplicity == own.multiplicity, term(one.label)
        text = joined(name, _thousands(THOUSAND * above(one))) if strong and one is not own else name
        marks.append(_Mark(above(one), text, name, strong, id(one) in labelled))
    return marks


def _observed(report: BondReport) -> list[tuple[float, float, str]]:
    """Observed band, the term it is assigned to before the fit [10^3 cm^-1], and its label."""
    fit = report.spectroscopy.fit
    if fit is None:
        return []
    return [
        (a.observed_per_cm / THOUSAND, a.computed_per_cm / THOUSAND, _thousands(a.observed_per_cm))
        for a in sorted(fit.assignments, key=lambda a: a.observed_per_cm)
    ]


def _thousands(value: float) -> str:
    """Whole number with its thousands set off."""
    return f"{value:,.0f}".replace("-", "\N{MINUS SIGN}")


def _draw_axis(axes: Axes, scale: _Scale, width: float, look: Look) -> None:
    """Wavenumbers left, electronvolts right."""
    low, high = _BOTTOM_CM, scale.height - _TOP_CM
    for x, side, unit, per_unit in (
        (_AXIS_CM, -1, "10³ cm⁻¹", 1.0),
        (width - _EV_AXIS_CM, 1, "eV", PER_CM_PER_EV / THOUSAND),
    ):
        axes.plot([x, x], [low, high], color=look.ink if side < 0 else look.muted, lw=0.6, solid_capstyle="butt")
        for value in _ticks(scale.low / per_unit, scale.high / per_unit, (high - low) / 0.7):
            y = scale.at(value * per_unit)
            axes.plot([x, x + side * 0.08], [y, y], color=look.ink if side < 0 else look.muted, lw=0.6)
            text = f"{value:g}".replace("-", "\N{MINUS SIGN}")
            write(
                axes, x + side * 0.12, y, text, ha="right" if side < 0 else "left", va="center",
                fontsize=SMALL_POINTS, color=look.ink if side < 0 else look.muted, gid="tick",
            )  # fmt: skip
        write(
            axes, 0.06 if side < 0 else width - 0.06, scale.height - 0.98, unit, ha="left" if side < 0 else "right",
            va="center", fontsize=SMALL_POINTS, color=look.muted, gid="label axis",
        )  # fmt: skip


def _ticks(low: float, high: float, most: float) -> list[float]:
    """Round values between two ends, not more than so many."""
    steps = [m * 10.0**e for e in range(-3, 4) for m in (1, 2, 5)]
    step = next(s for s in steps if (high - low) / s <= most)
    return [round(step * k, 6) for k in range(int(np.ceil(low / step)), int(np.floor(high / step)) + 1)]


def _heading(axes: Axes, scale: _Scale, x: float, text: str, look: Look) -> None:
    write(
        axes, x, scale.height - 0.68, text, ha="left", va="center", fontsize=SMALL_POINTS, color=look.muted,
        gid="label head",
    )  # fmt: skip


def _notes(report: BondReport, terms: Sequence[_Mark]) -> list[str]:
    notes = ["%: on the metal"]
    if report.spread is not None:
        notes.append("grey: \N{PLUS-MINUS SIGN} one standard deviation")
    if not all(mark.strong for mark in terms):
        notes.append("thin: terms of other spin")
    return notes


def _columns(width: float, widths: Sequence[float]) -> list[float]:
    """Left ends of the columns, the room that is left shared between them."""
    room = width - _AXIS_CM - _EV_AXIS_CM - sum(widths)
    gap = max(room / (1 + sum(w > 0 for w in widths)), 0.05)
    lefts, x = [], _AXIS_CM + gap
    for own in widths:
        lefts.append(x)
        x += own + (gap if own else 0.0)
    return lefts


def _terms_width(terms: Sequence[_Mark]) -> float:
    return max((_TERM_LABEL_CM + width_of(mark.label, SMALL_POINTS) for mark in terms if mark.labelled), default=0.0)


def _observed_width(observed: Sequence[tuple[float, float, str]]) -> float:
    return max((_BAND_LABEL_CM + width_of(text, SMALL_POINTS) for _, _, text in observed), default=0.0)


@dataclass(frozen=True, slots=True, eq=False)
class _Levels:
    """Where the levels of the ladder and their labels go, from the left end of the column [cm]."""

    electrons: tuple[float, ...]
    heights: tuple[float, ...]
    lefts: tuple[float, ...]
    rows: tuple[tuple[int, ...], ...]
    labels: tuple[str, ...]
    label_x: float

    @classmethod
    def of(cls, report: BondReport, ladder: Ladder, heights: Sequence[float]) -> _Levels:
        """Levels of one height side by side, one label for those of an irrep."""
        step = DASH_CM + GAP_CM
        found = side_by_side(heights, [step] * len(heights), 2.2 * ARROW_CM, step / 2, 4 * step)
        centres = np.nan_to_num(found)
        lefts = centres - centres.min()
        rows = _labelled_together(report, ladder, heights)
        labels = tuple(_level_label(report, ladder, row) for row in rows)
        electrons = tuple(level.electrons for level in ladder.levels)
        return cls(electrons, tuple(heights), tuple(lefts.tolist()), rows, labels, float(lefts.max()) + DASH_CM + 0.3)

    @property
    def width(self) -> float:
        return self.label_x + max(width_of(label, SMALL_POINTS) for label in self.labels)


def _deviations(report: BondReport, site: MetalSite) -> list[float]:
    """Standard deviation of each level above the lowest [10^3 cm^-1]; empty without a spread."""
    return [own.above_lowest_per_cm / THOUSAND for own in report.level_spreads(site)]


def _draw_levels(
    axes: Axes, levels: _Levels, deviations: Sequence[float], scale: _Scale, left: float, look: Look
) -> None:
    for k, (electrons, y) in enumerate(zip(levels.electrons, levels.heights, strict=True)):
        x = left + levels.lefts[k]
        if deviations and k:
            half = deviations[k] * (scale.at(1.0) - scale.at(0.0))
            top, bottom = min(y + half, scale.height - _TOP_CM), max(y - half, _BOTTOM_CM)
            axes.fill_between([x, x + DASH_CM], [bottom] * 2, [top] * 2, color=look.grid, lw=0, zorder=1)
        draw_set(axes, 1, x, y, look.metal)
        draw_electrons(axes, min(electrons, 1.0), max(electrons - 1.0, 0.0), x, y, look)
    wanted = [float(np.mean([levels.heights[k] for k in row])) for row in levels.rows]
    tops = spread_out(wanted, [LABEL_CM] * len(wanted), _BOTTOM_CM - 0.15, scale.height - _TOP_CM + 0.15)
    x = left + levels.label_x
    for row, y, at, label in zip(levels.rows, wanted, tops, levels.labels, strict=True):
        end = left + max(levels.lefts[k] for k in row) + set_width(1)
        axes.plot([end + 0.03, x - 0.05], [y, at], color=look.grid, lw=0.5, zorder=0)
        write(axes, x, at, label, ha="left", va="center", fontsize=SMALL_POINTS, gid="label level", zorder=6)


def _irrep_of(report: BondReport, ladder: Ladder, k: int) -> str:
    """Irrep of a level: of its orbital, or of its functions where several metals share the orbitals."""
    level = ladder.levels[k]
    if level.orbital is None or report.irreps is None:
        return level.irrep
    return report.irreps.labels[level.orbital]


def _labelled_together(report: BondReport, ladder: Ladder, heights: Sequence[float]) -> tuple[tuple[int, ...], ...]:
    """Levels of one irrep at one height."""
    rows: list[list[int]] = []
    for k, y in enumerate(heights):
        own = _irrep_of(report, ladder, k)
        if rows and own and own == _irrep_of(report, ladder, rows[-1][0]) and y - heights[rows[-1][0]] < _SAME_LABEL_CM:
            rows[-1].append(k)
        else:
            rows.append([k])
    return tuple(map(tuple, rows))


def _level_label(report: BondReport, ladder: Ladder, row: Sequence[int]) -> str:
    """Irrep, leading functions of a d level, and metal share of a row."""
    levels = [ladder.levels[k] for k in row]
    name = irrep(_irrep_of(report, ladder, row[0]))
    few = not name or (ladder.angular_momentum < 3 and len(row) < 3)
    functions = [function(label) for label in dict.fromkeys(level.function for level in levels)] if few else []
    share = f"{100 * np.mean([level.metal_share for level in levels]):.0f} %"
    return joined(name, *functions, share)


def _draw_terms(axes: Axes, terms: Sequence[_Mark], scale: _Scale, left: float, look: Look) -> dict[float, float]:
    """Marks and labels; returns where the label of each energy stands."""
    _heading(axes, scale, left, "terms", look)
    places = [scale.at(mark.height) for mark in terms]
    labelled = [k for k, mark in enumerate(terms) if mark.labelled]
    tops = spread_out(
        [places[k] for k in labelled], [LABEL_CM] * len(labelled), _BOTTOM_CM - 0.15, scale.height - _TOP_CM + 0.15
    )
    for mark, y in zip(terms, places, strict=True):
        colour, width = (look.ink, 1.6) if mark.strong else (look.muted, 0.7)
        axes.plot([left, left + 0.55], [y, y], color=colour, lw=width, solid_capstyle="butt", zorder=4)
    for k, at in zip(labelled, tops, strict=True):
        mark, y = terms[k], places[k]
        axes.plot([left + 0.58, left + _TERM_LABEL_CM - 0.04], [y, at], color=look.grid, lw=0.5, zorder=0)
        write(
            axes, left + _TERM_LABEL_CM, at, mark.label, ha="left", va="center", fontsize=SMALL_POINTS,
            color=look.ink if mark.strong else look.muted, gid="label term",
        )  # fmt: skip
    return {terms[k].height: float(at) for k, at in zip(labelled, tops, strict=True)}


def _draw_observed(
    axes: Axes,
    observed: Sequence[tuple[float, float, str]],
    scale: _Scale,
    labels: tuple[float, dict[float, float]],
    left: float,
    look: Look,
) -> None:
    """Observed bands, each joined to the label of its term."""
    _heading(axes, scale, left, "observed", look)
    places = [scale.at(value) for value, _, _ in observed]
    tops = spread_out(places, [LABEL_CM] * len(places), _BOTTOM_CM, scale.height - _TOP_CM)
    start, heights = labels
    for (_, computed, text), y, at in zip(observed, places, tops, strict=True):
        axes.plot([left], [y], marker="D", ms=3.2, mfc=look.paper, mec=look.positive, mew=1.0, ls="none", zorder=5)
        nearest = min(heights, key=lambda value: abs(value - computed), default=computed)
        near = heights[nearest] if abs(nearest - computed) < _SAME_TERM else scale.at(computed)
        axes.plot([start, left - 0.12], [near, y], color=look.positive, lw=0.7, ls=(0, (1, 2)), zorder=2)
        write(
            axes, left + _BAND_LABEL_CM, at, text, ha="left", va="center", fontsize=SMALL_POINTS, gid="label observed"
        )
