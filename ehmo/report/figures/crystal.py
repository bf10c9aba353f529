"""Bands of a crystal, its density of states and its overlap population, on one energy axis."""

from __future__ import annotations

import re
from collections.abc import Sequence
from itertools import pairwise
from typing import TYPE_CHECKING, Final

import numpy as np

from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray
from ehmo.records.crystal_electronic import BandPath
from ehmo.records.crystal_report import CrystalReport
from ehmo.report.figures.canvas import COLUMN_CM, SMALL_POINTS, TEXT_POINTS, axes_at, drawn, new_figure, paper_axes
from ehmo.report.figures.markup import chemical, joined, write
from ehmo.report.figures.markup import width_cm as width_of
from ehmo.report.figures.placement import spread_out
from ehmo.report.look import LIGHT, Look

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

DEEPEST_EV: Final = 12.0
HIGHEST_EV: Final = 7.0
"""Ends of the window below the highest filled and above the lowest empty level [eV]."""

BROKEN_EV: Final = 2.0
"""The window ends at a gap in the filled bands that is wider [eV]."""

_LEFT_CM, _RIGHT_CM, _BOTTOM_CM, _TOP_CM, _PANEL_CM, _BETWEEN_CM = 1.0, 0.2, 1.5, 0.85, 6.2, 0.25
_LEGIBLE_CM = 0.12  # between names of special points
_PIECE = re.compile(r"([A-Z][a-z]?)(\d*)")
_STYLES = ("-", (0, (4, 1.5)), (0, (1, 1.2)))


@drawn
def band_figure(
    report: CrystalReport,
    window_eV: tuple[float, float] | None = None,
    *,
    look: Look = LIGHT,
    width_cm: float = COLUMN_CM,
) -> Figure:
    """Bands along the path (if the report has one), density of states by elements, and overlap population.

    Energies count from the highest filled level, or from the Fermi level of a metal. The density is that of both spins
    per calculated cell: shaded the whole, lines the metals, their donors and the rest. The overlap population is that
    of all metal-donor bonds of the cell, bonding to the right.

    Parameters
    ----------
    report : CrystalReport
    window_eV : tuple of float, optional
        Lowest and highest energy from that zero; by default the filled bands down to a gap, and empty ones [eV].
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
        If the window is none.
    """
    zero = _zero(report)
    low, high = window_eV if window_eV is not None else _window(report, zero)
    if not (np.isfinite([low, high]).all() and low < high):
        raise InputError(f"{low:g} to {high:g} eV is no window of energies", mend="give the lower end first")
    height = _BOTTOM_CM + _PANEL_CM + _TOP_CM
    figure = new_figure(width_cm, height, layout=None)
    paper = paper_axes(figure)
    path = report.bonding.path
    shares = (0.48, 0.30, 0.22) if path is not None else (0.0, 0.56, 0.44)
    room = width_cm - _LEFT_CM - _RIGHT_CM - _BETWEEN_CM * (sum(share > 0 for share in shares) - 1)
    left, panels = _LEFT_CM, []
    for share in shares:
        if share:
            panels.append(axes_at(figure, left, _BOTTOM_CM, share * room, _PANEL_CM))
            left += share * room + _BETWEEN_CM
    for k, axes in enumerate(panels):
        axes.set_ylim(low, high)
        axes.axhline(0.0, color=look.muted, lw=0.6, ls=(0, (1, 2)), zorder=1)
        axes.tick_params(labelleft=k == 0)
    panels[0].set_ylabel("energy/eV", labelpad=1)
    if path is not None:
        _draw_path(paper, panels[0], path, zero, shares[0] * room, look)
    _draw_density(panels[-2], report, zero, (low, high), look)
    _draw_overlap(panels[-1], report, zero, (low, high), look)
    _draw_words(paper, report, height, look)
    return figure


def _zero(report: CrystalReport) -> float:
    """Highest filled level, or the Fermi level of a metal [eV]."""
    bonding = report.bonding
    return bonding.gap.valence_eV if bonding.gap is not None else float(bonding.state.filling.fermi_eV.max())


def _window(report: CrystalReport, zero: float) -> tuple[float, float]:
    """Filled bands down to the next wide gap, and empty ones, from the zero [eV]."""
    levels = np.sort(report.bonding.state.energies_eV.ravel()) - zero
    filled = levels[levels <= 1e-6]
    gaps = np.flatnonzero(np.diff(filled) > BROKEN_EV)
    lowest = float(filled[gaps[-1] + 1]) if len(gaps) else float(filled[0])
    bottom = 0.0 if report.bonding.gap is None else report.bonding.gap.gap_eV
    highest = min(float(levels[-1]), bottom + HIGHEST_EV)
    return max(lowest, -DEEPEST_EV) - 0.6, highest + 0.4


def _draw_path(paper: Axes, axes: Axes, path: BandPath, zero: float, width: float, look: Look) -> None:
    """Bands between special points, with a gap in the lines at a jump."""
    x = path.distances
    stops = sorted(k for k, _ in path.labels)
    jumps = [k for k in stops if k + 1 in stops and abs(x[k + 1] - x[k]) < 1e-9]
    edges = [0, *(k + 1 for k in jumps), len(x)]
    for start, end in pairwise(edges):
        axes.plot(x[start:end], path.energies_eV[start:end] - zero, color=look.ink, lw=0.7, zorder=3)
    axes.set_xlim(x[0], x[-1])
    axes.set_xticks([])
    names: dict[float, list[str]] = {}
    for k, name in sorted(path.labels):
        names.setdefault(round(float(x[k]), 9), []).append(_special(name))
    for place in names:
        axes.axvline(place, color=look.grid, lw=0.6, zorder=0)
    texts = ["|".join(dict.fromkeys(own)) for own in names.values()]
    scale = width / float(x[-1] - x[0])
    wanted = [_LEFT_CM + (place - float(x[0])) * scale for place in names]
    sizes = [width_of(text, SMALL_POINTS) + _LEGIBLE_CM for text in texts]
    low, high = _LEFT_CM - 0.3, _LEFT_CM + width + 0.2
    if sum(sizes) <= high - low:
        rows = [(texts, wanted, sizes, 0.2)]
    else:  # every other name on a second line
        rows = [(texts[k::2], wanted[k::2], sizes[k::2], 0.2 + 0.27 * k) for k in (0, 1)]
    for own, places, widths, below in rows:
        if sum(widths) > high - low:
            continue
        for text, at in zip(own, spread_out(places, widths, low, high), strict=True):
            write(paper, at, _BOTTOM_CM - below, text, ha="center", va="center", fontsize=SMALL_POINTS, gid="point")


def _special(name: str) -> str:
    """Name of a special point: G is written with its Greek letter."""
    return name.replace("G", "\N{GREEK CAPITAL LETTER GAMMA}") if name[:1] == "G" else name


def _elements(report: CrystalReport) -> tuple[list[str], list[str], list[str]]:
    """Symbols of metals, their donors and the rest, of the atoms with functions."""
    bonding = report.bonding
    metals = dict.fromkeys(report.symbols[bond.metal] for bond in bonding.bonds)
    donors = dict.fromkeys(report.symbols[bond.donor] for bond in bonding.bonds)
    own = dict.fromkeys(report.symbols[int(atom)] for atom in bonding.atoms)
    return (
        list(metals),
        [symbol for symbol in donors if symbol not in metals],
        [symbol for symbol in own if symbol not in metals and symbol not in donors],
    )


def _draw_density(axes: Axes, report: CrystalReport, zero: float, window: tuple[float, float], look: Look) -> None:
    curve, basis, atoms = report.density, report.bonding.basis, report.bonding.atoms
    energies = curve.energies_eV - zero
    inside = (energies >= window[0]) & (energies <= window[1])
    energies, values = energies[inside], curve.values[:, inside]
    total = values.sum(axis=0)
    axes.fill_betweenx(energies, 0, total, color=look.shade, lw=0, zorder=1, gid="total")
    axes.plot(total, energies, color=look.muted, lw=0.5, zorder=2)
    symbols = np.array([report.symbols[int(atoms[place])] for place in basis.shell_atom])
    for group, colour, style in zip(_elements(report), look.origins, _STYLES, strict=True):
        if group:
            own: FloatArray = values[np.isin(symbols, group)].sum(axis=0)
            axes.plot(own, energies, color=colour, lw=1.0, ls=style, zorder=3, gid="density")
    axes.set_xlim(0, 1.05 * float(total.max(initial=1e-6)))
    axes.set_xticks([])
    axes.set_xlabel("states", labelpad=4)


def _draw_overlap(axes: Axes, report: CrystalReport, zero: float, window: tuple[float, float], look: Look) -> None:
    curve = report.overlap_population
    counts = np.array([report.bonds_per_cell(unit) for unit in report.units], dtype=np.float64)
    energies = curve.energies_eV - zero
    inside = (energies >= window[0]) & (energies <= window[1])
    energies, values = energies[inside], counts @ curve.values[:, inside]
    axes.fill_betweenx(energies, 0, np.maximum(values, 0), color=look.positive, lw=0, zorder=2, gid="bonding")
    axes.fill_betweenx(energies, 0, np.minimum(values, 0), color=look.negative, lw=0, zorder=2, gid="antibonding")
    axes.plot(values, energies, color=look.ink, lw=0.5, zorder=3)
    axes.axvline(0, color=look.muted, lw=0.5, zorder=1)
    reach = 1.08 * float(np.abs(values).max(initial=1e-6))
    axes.set_xlim(-reach, reach)
    axes.set_xticks([])
    axes.set_xlabel("\N{MINUS SIGN}  overlap  +", labelpad=4)


def _metals_first(formula: str, metals: Sequence[str]) -> str:
    """Formula such as ``V2O5`` from one in Hill order; other text as it is."""
    pieces = _PIECE.findall(formula)
    if "".join(symbol + count for symbol, count in pieces) != formula:
        return formula
    ordered = sorted(pieces, key=lambda piece: piece[0] not in metals)
    return "".join(symbol + count for symbol, count in ordered)


def _draw_words(paper: Axes, report: CrystalReport, height: float, look: Look) -> None:
    word, _, formula = (report.networks[0] if report.networks else report.formula).rpartition(" ")
    head = joined(chemical(_metals_first(formula, _elements(report)[0])), word)
    gap = report.bonding.gap
    if gap is None:
        said = "metal: zero at the Fermi level"
    else:
        said = f"gap {gap.gap_eV:.2f} eV, {'direct' if gap.is_direct else 'indirect'}"
    write(paper, 0.06, height - 0.35, head, ha="left", va="center", fontsize=TEXT_POINTS + 1, gid="label head")
    right = float(paper.get_xlim()[1]) - 0.1
    write(
        paper, right, height - 0.35, said, ha="right", va="center", fontsize=SMALL_POINTS, color=look.muted,
        gid="label head",
    )  # fmt: skip
    x = 0.06
    write(paper, x, 0.22, "states of", ha="left", va="center", fontsize=SMALL_POINTS, color=look.muted, gid="key")
    x += width_of("states of", SMALL_POINTS) + 0.2
    for group, colour, style in zip(_elements(report), look.origins, _STYLES, strict=True):
        if not group:
            continue
        text = ", ".join(group[:6]) + (" ..." if len(group) > 6 else "")
        paper.plot([x, x + 0.5], [0.22, 0.22], color=colour, lw=1.2, ls=style)
        write(paper, x + 0.58, 0.22, text, ha="left", va="center", fontsize=SMALL_POINTS, gid="key")
        x += 0.58 + width_of(text, SMALL_POINTS) + 0.3
    paper.fill_between([x, x + 0.5], [0.15] * 2, [0.29] * 2, color=look.shade, ec=look.muted, lw=0.5)
    write(paper, x + 0.58, 0.22, "all", ha="left", va="center", fontsize=SMALL_POINTS, gid="key")
