"""A scan: channels and order of a bond, levels, and energy where there is one."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING, Final

import numpy as np

from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray
from ehmo.records.scan import Scan, ScannedLevel, ScanPoint
from ehmo.report.figures.canvas import (
    COLUMN_CM,
    SMALL_POINTS,
    axes_at,
    dashes,
    drawn,
    new_figure,
    paper_axes,
    plain,
)
from ehmo.report.figures.levels import LABEL_CM
from ehmo.report.figures.markup import function, irrep, joined, part, write
from ehmo.report.figures.markup import width_cm as width_of
from ehmo.report.figures.placement import spread_out
from ehmo.report.look import LIGHT, Look

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

TRACE: Final = 0.02
"""Weight that the channels of a symmetry must reach somewhere to be drawn."""

_LEFT_CM, _BOTTOM_CM, _TOP_CM, _BETWEEN_CM = 1.15, 1.0, 0.75, 0.3
_PANEL_CM = {"channels": 3.4, "levels": 4.6, "energy": 2.8}
_BELOW_EV, _ABOVE_EV = 2.5, 0.8  # other orbitals that are drawn about the levels of the ladder
_FRONTIER_EV = 5.0
_ALIKE_EV = 0.02
_MOVED = 0.2  # electrons that must leave an orbital between two points for a rule


@dataclass(frozen=True, slots=True, eq=False)
class _Line:
    """A quantity along the scan; NaN where a point has none."""

    values: FloatArray
    label: str
    colour: str
    style: object = "-"
    width: float = 1.2
    group: str = ""


@drawn
def scan_figure(scan: Scan, bond: int | None = None, *, look: Look = LIGHT, width_cm: float = COLUMN_CM) -> Figure:
    """Panels over one another: channels with the Mayer order, levels, and the energy of a calibrated set.

    Channel weights are summed by symmetry. Strong lines among the levels are those of the ladder, followed by their
    irrep (else by their leading function); thin ones are other orbitals, followed by their character. Dotted rules
    stand where the filling changes.

    Parameters
    ----------
    scan : Scan
    bond : int, optional
        Place of the bond in the first panel; by default the scanned one, or the first.
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
        If the scan has fewer than two points, or no such bond.
    """
    points = [point for point in scan.points if not point.fault]
    if len(points) < 2:
        raise InputError("the scan has fewer than two points", mend="run it to its end")
    place = bond if bond is not None else (scan.scanned_bond or 0)
    if not 0 <= place < len(points[0].bonds):
        raise InputError(f"there is no bond number {place}", mend=f"give 0 to {len(points[0].bonds) - 1}")
    ladder = _ladder_lines(points, look)
    panels: list[tuple[str, str, list[_Line]]] = [("channels", "weight, order", _channel_lines(points, place, look))]
    panels.append(("levels", "energy/eV", ladder))
    if any(point.energy_eV is not None for point in points):
        panels.append(("energy", "energy/eV", [_energy_line(points, look)]))
    height = _BOTTOM_CM + _TOP_CM + sum(_PANEL_CM[name] for name, _, _ in panels) + _BETWEEN_CM * (len(panels) - 1)
    figure = new_figure(width_cm, height, layout=None)
    paper = paper_axes(figure)
    labels = [_shared(members) for _, _, lines in panels for _, members in _grouped(lines)]
    right = max(width_of(label, SMALL_POINTS) for label in labels) + 0.35
    x = np.array([point.value for point in points])
    changes = _changes(points)
    bottom = height - _TOP_CM
    for name, title, lines in panels:
        bottom -= _PANEL_CM[name]
        axes = axes_at(figure, _LEFT_CM, bottom, width_cm - _LEFT_CM - right, _PANEL_CM[name])
        last = name == panels[-1][0]
        _draw_panel(axes, x, lines, _other_orbitals(points, ladder) if name == "levels" else [], look)
        for change in changes:
            axes.axvline(change, color=look.muted, lw=0.6, ls=(0, (1, 2)), zorder=1)
        axes.set_ylabel(title)
        axes.yaxis.set_label_coords(-0.85 / (width_cm - _LEFT_CM - right), 0.5)
        axes.tick_params(labelbottom=last)
        if name == "energy" and scan.minimum is not None:
            _draw_minimum(axes, scan, look)
        _draw_labels(paper, axes, lines, (bottom, _PANEL_CM[name], width_cm - right), look)
        bottom -= _BETWEEN_CM
    axes.set_xlabel(plain(_coordinate(scan)), labelpad=2)
    head = scan.bond_labels[place].replace("-", "\N{EN DASH}")
    write(
        paper, _LEFT_CM, height - 0.35, f"channels of {head}; {scan.parameter_set}, {scan.charge_model} charges",
        ha="left", va="center", fontsize=SMALL_POINTS, color=look.muted, gid="label head",
    )  # fmt: skip
    return figure


def _coordinate(scan: Scan) -> str:
    names = "\N{EN DASH}".join(scan.labels[atom] for atom in scan.plan.atoms)
    return f"{names}/Å" if scan.plan.coordinate == "length" else f"{names}/°"


def _channel_lines(points: Sequence[ScanPoint], place: int, look: Look) -> list[_Line]:
    own = [point.bonds[place] for point in points]
    lines = [_Line(np.array([bond.mayer for bond in own]), "Mayer", look.ink, width=1.5)]
    for name in ("sigma", "pi", "delta"):
        values = np.array([getattr(bond, name) for bond in own])
        if values.max() >= TRACE:
            lines.append(_Line(values, f"{part(name)} weight", look.part(name), dashes(name)))
    return lines


def _energy_line(points: Sequence[ScanPoint], look: Look) -> _Line:
    values = np.array([np.nan if point.energy_eV is None else point.energy_eV for point in points])
    return _Line(values, "energy", look.ink)


def _ladder_lines(points: Sequence[ScanPoint], look: Look) -> list[_Line]:
    """One line per level, each level known at every point by the same name."""
    count = max(len(point.levels) for point in points)
    if not count:
        return []
    whole = [point for point in points if len(point.levels) == count]
    names = next((own for own in (_by_irrep, _by_function) if _lasting([own(p.levels) for p in whole])), _by_rank)
    energies = [
        dict(zip(names(point.levels), (level.energy_eV for level in point.levels), strict=True))
        if len(point.levels) == count
        else {}
        for point in points
    ]
    last = whole[-1].levels
    return [
        _Line(
            np.array([known.get(name, np.nan) for known in energies]),
            function(level.function),
            look.metal,
            width=1.3,
            group=irrep(level.irrep),
        )
        for name, level in zip(names(last), last, strict=True)
    ]


def _by_irrep(levels: Sequence[ScannedLevel]) -> list[tuple[str, int]]:
    """Irrep and place within it: levels of one irrep do not cross."""
    own = [level.irrep for level in levels]
    return [(name, own[:k].count(name)) for k, name in enumerate(own)]


def _by_function(levels: Sequence[ScannedLevel]) -> list[tuple[str, int]]:
    own = [level.function for level in levels]
    return [(name, own[:k].count(name)) for k, name in enumerate(own)]


def _by_rank(levels: Sequence[ScannedLevel]) -> list[tuple[str, int]]:
    return [("", k) for k in range(len(levels))]


def _lasting(names: Sequence[Sequence[tuple[str, int]]]) -> bool:
    """Whether every point has the same names, and none of them is blank."""
    return all(set(own) == set(names[0]) for own in names) and all(name for name, _ in names[0])


def _other_orbitals(points: Sequence[ScanPoint], ladder: Sequence[_Line]) -> list[FloatArray]:
    """Energies of orbitals near the ladder (or near the highest filled one), each followed along the scan."""
    n_mo = len(points[0].energies_eV)
    alike = [point for point in points if len(point.followed) == n_mo]
    if len(alike) != len(points):
        return []
    every = np.array([point.energies_eV[point.followed] for point in points]).T
    if ladder:
        levels = np.array([line.values for line in ladder])
        low, high = np.nanmin(levels) - _BELOW_EV, np.nanmax(levels) + _ABOVE_EV
    else:
        filled = max(float(point.energies_eV[point.occupations > 0.5].max()) for point in points)
        low, high = filled - _FRONTIER_EV, filled + _FRONTIER_EV
    near = ((every > low) & (every < high)).any(axis=1)
    return [np.where((row > low) & (row < high), row, np.nan) for row in every[near]]


def _changes(points: Sequence[ScanPoint]) -> list[float]:
    """Values half-way between points whose followed orbitals are filled differently."""
    found = []
    for one, other in pairwise(points):
        if len(one.followed) != len(other.followed):
            continue
        before, after = one.occupations[one.followed], other.occupations[other.followed]
        if np.abs(before - after).max() > _MOVED:
            found.append((one.value + other.value) / 2)
    return found


def _draw_panel(axes: Axes, x: FloatArray, lines: Sequence[_Line], others: Sequence[FloatArray], look: Look) -> None:
    for row in others:
        axes.plot(x, row, color=look.grid, lw=0.7, zorder=2, gid="orbital")
    for line in lines:
        axes.plot(x, line.values, color=line.colour, lw=line.width, ls=line.style, zorder=4, gid="line")
    axes.set_xlim(x[0], x[-1])
    values = np.concatenate([*(line.values for line in lines), *others])
    low, high = float(np.nanmin(values)), float(np.nanmax(values))
    if lines and lines[0].label == "Mayer":
        low = min(low, 0.0)
    margin = 0.04 * max(high - low, 1e-3)
    axes.set_ylim(low - (0 if low == 0 else margin), high + margin)


def _draw_minimum(axes: Axes, scan: Scan, look: Look) -> None:
    minimum = scan.minimum
    if minimum is not None:
        axes.plot(
            [minimum.length_A], [minimum.energy_eV], marker="D", ms=3.4, mfc=look.paper, mec=look.positive, mew=1.0,
            ls="none", zorder=6,
        )  # fmt: skip


def _draw_labels(
    paper: Axes, axes: Axes, lines: Sequence[_Line], place: tuple[float, float, float], look: Look
) -> None:
    """Names right of the panel at the ends of their lines; lines that end together share one."""
    bottom, size, left = place
    low, high = axes.get_ylim()

    def at(value: float) -> float:
        return bottom + (value - low) / (high - low) * size

    groups = _grouped(lines)
    wanted = [at(value) for value, _ in groups]
    heights = spread_out(wanted, [LABEL_CM] * len(groups), bottom - 0.1, bottom + size + 0.1)
    for (_, members), y, height in zip(groups, wanted, heights, strict=True):
        paper.plot([left + 0.04, left + 0.2], [y, height], color=look.grid, lw=0.5)
        write(
            paper, left + 0.25, height, _shared(members), ha="left", va="center", fontsize=SMALL_POINTS,
            color=members[0].colour, gid="label line",
        )  # fmt: skip


def _shared(members: Sequence[_Line]) -> str:
    """Label of lines that end together, the irrep of those in a row said once."""
    words: list[str] = []
    for k, line in enumerate(members):
        new = line.group and (k == 0 or line.group != members[k - 1].group)
        words += [line.group, line.label] if new else [line.label]
    return joined(*words)


def _grouped(lines: Sequence[_Line]) -> list[tuple[float, list[_Line]]]:
    """Lines by the height of their ends; levels that end together are one group."""
    ends = [(float(line.values[np.flatnonzero(np.isfinite(line.values))[-1]]), line) for line in lines]
    groups: list[tuple[float, list[_Line]]] = []
    for value, line in sorted(ends, key=lambda end: end[0]):
        if groups and line.group and line.group == groups[-1][1][-1].group and value - groups[-1][0] < _ALIKE_EV:
            groups[-1][1].append(line)
        else:
            groups.append((value, [line]))
    return groups
