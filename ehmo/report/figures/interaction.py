"""Interaction diagram: metal levels left, orbitals of the fragment in the middle, ligands of the bond right."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING, Final

import numpy as np

from ehmo.analysis.interaction import bond_interaction
from ehmo.errors import InputError
from ehmo.records.interaction import Interaction, OrbitalSet, PartLevel
from ehmo.records.report import BondReport
from ehmo.report.figures.canvas import COLUMN_CM, SMALL_POINTS, TEXT_POINTS, dashes, drawn, new_figure, paper_axes
from ehmo.report.figures.energy_axis import EnergyAxis, energy_axis
from ehmo.report.figures.levels import ARROW_CM, DASH_CM, GAP_CM, LABEL_CM, draw_electrons, draw_set, set_width
from ehmo.report.figures.markup import chemical, irrep, joined, part, write
from ehmo.report.figures.markup import width_cm as width_of
from ehmo.report.figures.placement import side_by_side, spread_out
from ehmo.report.formula import complex_formula
from ehmo.report.look import LIGHT, Look

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

MOST_SETS: Final = 60
"""Levels of the fragment that are drawn with electrons and label; the others are ticks."""

OWN_SHARE: Final = 0.05
"""Share on the metal and the donors of the bond below which a level is drawn as a tick."""

DONOR_SHARE: Final = 0.15
"""Share of the donor atoms from which a level of the ligands is drawn."""

LINE_SHARE: Final = 0.08
"""Contribution from which a level of a part and a level of the fragment are joined by a line."""

_PART_OF_LARGEST = 0.5  # lines are drawn from this part of the largest contribution, where that is less
_TICKS_CM = 0.42  # right edge that the ticks of the other ligands take
_ABOVE_EV = 1.0  # what is drawn above the highest level of interest
_TOP_CM, _BOTTOM_CM = 0.95, 1.15
_SHORTEST_CM, _TALLEST_CM = 9.0, 22.0


@dataclass(frozen=True, slots=True, eq=False)
class _Layout:
    """Where everything goes [cm]."""

    width: float
    height: float
    scale: EnergyAxis
    shown: tuple[int, ...]
    heights: tuple[float, ...]
    centres: tuple[float, ...]
    label_heights: tuple[float, ...]
    ticks: tuple[int, ...]
    above: int
    ligand_x: float

    @property
    def columns(self) -> tuple[float, float, float, float, float]:
        """Middle of metal levels and orbitals, left end of their labels, middle of ligand levels and of ticks."""
        w = self.width
        return 0.235 * w, 0.50 * w, 0.66 * w, self.ligand_x, w - 0.2


@drawn
def interaction_diagram(
    report: BondReport, bond: int | None = None, *, look: Look = LIGHT, width_cm: float = COLUMN_CM
) -> Figure:
    """Diagram of how the orbitals of the fragment arise from the metal and the ligands of one bond.

    Lines join levels to the orbitals they contribute to, the thicker the more; their colour and dashes tell sigma, pi
    and delta. Orbitals are coloured by what holds most of them, and carry electrons, irrep and bond part. Levels that
    belong to the other ligands stand as ticks at the right edge. Stretches without other levels are shortened.

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
    found = bond_interaction(report, chosen_bond(report, bond))
    layout = _laid_out(found, top_of_interest(report), width_cm)
    figure = new_figure(width_cm, layout.height, layout=None)
    axes = paper_axes(figure)
    _draw_axis(axes, layout, look)
    _draw_lines(axes, found, layout, look)
    _draw_sets(axes, found, layout, look)
    _draw_parts(axes, found, layout, look)
    _draw_words(axes, report, found, layout, look)
    return figure


def chosen_bond(report: BondReport, bond: int | None) -> int:
    """Place of the bond of a figure: the one asked for, else that of `default_bond`; an error if there is none."""
    place = default_bond(report) if bond is None else bond
    if not 0 <= place < len(report.orders):
        raise InputError(f"there is no bond number {place}", mend=f"give 0 to {len(report.orders) - 1}")
    return place


def default_bond(report: BondReport) -> int:
    """Place of the shortest bond that may be multiple, else of the shortest."""
    bonds = report.coordination.bonds
    return min(range(len(bonds)), key=lambda k: (not bonds[k].may_be_multiple, bonds[k].length_A))


def top_of_interest(report: BondReport) -> float:
    """Energy up to which levels matter: the ladder, or a few levels above the filled ones [eV]."""
    state = report.state
    tops = [level.energy_eV for site in report.sites if site.ladder is not None for level in site.ladder.levels]
    if state.lumo is not None:
        tops.append(float(state.energies_eV[min(state.lumo + 2, len(state.energies_eV) - 1)]))
    return max([*tops, float(state.energies_eV[state.homo])]) + _ABOVE_EV


def _laid_out(found: Interaction, top_eV: float, width_cm: float) -> _Layout:
    below = [k for k, s in enumerate(found.sets) if s.energy_eV <= top_eV]
    own = [k for k in below if _own_share(found.sets[k]) >= OWN_SHARE]
    ranked = sorted(own, key=lambda k: -_own_share(found.sets[k]))
    shown = tuple(sorted(ranked[:MOST_SETS]))
    ticks = tuple(k for k in below if k not in shown)
    energies = [found.sets[k].energy_eV for k in shown]
    energies += [level.energy_eV for level in found.metal_levels if level.energy_eV <= top_eV]
    energies += [s.energy_eV for s in found.ligand_levels if s.energy_eV <= top_eV and s.donor_share >= DONOR_SHARE]
    drawn_sets = [found.sets[k] for k in shown]
    height = float(np.clip(_TOP_CM + _BOTTOM_CM + 1.25 * len(shown) * LABEL_CM, _SHORTEST_CM, _TALLEST_CM))
    while True:
        scale = energy_axis(energies, _BOTTOM_CM + 0.15, height - _TOP_CM - 0.15)
        heights = [scale.height_cm(level.energy_eV) for level in drawn_sets]
        widths = [set_width(len(level.orbitals)) + 0.12 for level in drawn_sets]
        centres = side_by_side(heights, widths, 2.4 * ARROW_CM, (DASH_CM + GAP_CM) / 2, 0.15 * width_cm)
        if height >= _TALLEST_CM or not np.isnan(centres).any():
            break
        # Crowded levels get more paper before they are laid over one another.
        height = min(1.15 * height, _TALLEST_CM)
    labels = spread_out(heights, [LABEL_CM] * len(shown), _BOTTOM_CM, height - _TOP_CM)
    return _Layout(
        width_cm,
        height,
        scale,
        shown,
        tuple(heights),
        tuple(np.where(np.isnan(centres), 0.0, centres).tolist()),
        tuple(labels.tolist()),
        ticks,
        len(found.sets) - len(below),
        _ligand_place(found, scale, width_cm),
    )


def _ligand_place(found: Interaction, scale: EnergyAxis, width_cm: float) -> float:
    """Middle of the ligand levels, such that their labels end before the ticks [cm]."""
    inside = [level for level in found.ligand_levels if _is_drawn(scale, level)]
    heights = [scale.height_cm(level.energy_eV) for level in inside]
    widest = max((_group_width([inside[k] for k in rows]) for rows in _by_height(heights)), default=0.0)
    label = max((width_of(_part_label(level, 1), SMALL_POINTS) for level in inside), default=0.0)
    return min(0.845 * width_cm, width_cm - _TICKS_CM - label - 0.1 - widest / 2)


def _own_share(level: OrbitalSet) -> float:
    return level.metal_share + level.donor_share


def _draw_axis(axes: Axes, layout: _Layout, look: Look) -> None:
    x, ends = 0.85, layout.scale.ends_cm()
    for low, high in ends:
        axes.plot([x, x], [low, high], color=look.ink, lw=0.6, solid_capstyle="butt")
    for (_, below), (above, _) in pairwise(ends):
        for y in (below, above):
            axes.plot([x - 0.09, x + 0.09], [y - 0.04, y + 0.04], color=look.ink, lw=0.6)
    for value in layout.scale.ticks_eV():
        y = layout.scale.height_cm(value)
        axes.plot([x - 0.09, x], [y, y], color=look.ink, lw=0.6)
        text = f"{value:g}".replace("-", "\N{MINUS SIGN}")
        write(axes, x - 0.13, y, text, ha="right", va="center", fontsize=SMALL_POINTS, gid="tick")
    write(
        axes,
        0.06,
        layout.height - 0.5,
        "energy/eV",
        ha="left",
        va="center",
        fontsize=SMALL_POINTS,
        color=look.muted,
        gid="label axis",
    )


def _draw_lines(axes: Axes, found: Interaction, layout: _Layout, look: Look) -> None:
    metal_x, middle, _, ligand_x, _ = layout.columns
    least = _least_line(found, layout)
    for k, y, centre in zip(layout.shown, layout.heights, layout.centres, strict=True):
        level = found.sets[k]
        half = set_width(len(level.orbitals)) / 2
        for levels, shares, x, side in (
            (found.metal_levels, found.metal_contributions[k], metal_x, -1),
            (found.ligand_levels, found.ligand_contributions[k], ligand_x, 1),
        ):
            for own, share in zip(levels, shares, strict=True):
                if share < least or not _drawn(layout, own):
                    continue
                symmetry = own.symmetry or level.symmetry
                axes.plot(
                    [x - side * (_part_width(own) / 2 + 0.05), middle + centre + side * (half + 0.05)],
                    [layout.scale.height_cm(own.energy_eV), y],
                    color=look.part(symmetry) if symmetry else look.muted,
                    ls=dashes(symmetry) if symmetry else "-",
                    lw=0.3 + 1.2 * float(share),
                    alpha=0.8,
                    zorder=1,
                    solid_capstyle="butt",
                )


def _least_line(found: Interaction, layout: _Layout) -> float:
    """Contribution from which a line is drawn: less where a large fragment spreads every level over many orbitals."""
    shown = list(layout.shown)
    largest = max(
        float(shares[shown].max(initial=0.0)) for shares in (found.metal_contributions, found.ligand_contributions)
    )
    return min(LINE_SHARE, _PART_OF_LARGEST * largest)


def _drawn(layout: _Layout, level: PartLevel) -> bool:
    return _is_drawn(layout.scale, level)


def _is_drawn(scale: EnergyAxis, level: PartLevel) -> bool:
    ours = not level.symmetry or level.donor_share >= DONOR_SHARE
    return bool(ours and level.energy_eV <= scale.stretches_eV[-1, 1])


def _part_width(level: PartLevel) -> float:
    return _group_width([level])


def _group_width(levels: Sequence[PartLevel]) -> float:
    """Width of levels at one height, drawn as one row of dashes [cm]."""
    return min(sum(level.degeneracy for level in levels), 7) * 0.13 + 0.12


def _draw_sets(axes: Axes, found: Interaction, layout: _Layout, look: Look) -> None:
    _, middle, label_x, _, rest_x = layout.columns
    places = zip(layout.shown, layout.heights, layout.centres, layout.label_heights, strict=True)
    for k, y, centre, label_y in places:
        level = found.sets[k]
        colour = look.origins[int(np.argmax(_shares(level)))]
        left = middle + centre - set_width(len(level.orbitals)) / 2
        names = [f"orbital {orbital}" for orbital in level.orbitals]
        draw_set(axes, len(level.orbitals), left, y, colour, names)
        draw_electrons(axes, level.alpha, level.beta, left, y, look)
        right = left + set_width(len(level.orbitals))
        axes.plot([right + 0.03, label_x - 0.06], [y, label_y], color=look.grid, lw=0.5, zorder=0)
        text = joined(irrep(level.label), part(level.part))
        colour = look.part(level.symmetry) if level.symmetry else look.ink
        write(
            axes, label_x, label_y, text, ha="left", va="center", fontsize=TEXT_POINTS, color=colour, zorder=6,
            gid="label set", bbox={"facecolor": look.paper, "edgecolor": "none", "pad": 0.2},
        )  # fmt: skip
    for k in layout.ticks:
        energy = found.sets[k].energy_eV
        if not layout.scale.holds(energy):
            continue
        y = layout.scale.height_cm(energy)
        axes.plot([rest_x - 0.12, rest_x + 0.12], [y, y], color=look.other, lw=0.5, solid_capstyle="butt")


def _shares(level: OrbitalSet) -> tuple[float, float, float]:
    return level.metal_share, level.ligand_share, 1.0 - level.metal_share - level.ligand_share


def _draw_parts(axes: Axes, found: Interaction, layout: _Layout, look: Look) -> None:
    metal_x, _, _, ligand_x, _ = layout.columns
    for levels, x, side, colour in (
        (found.metal_levels, metal_x, -1, look.metal),
        (found.ligand_levels, ligand_x, 1, look.donor),
    ):
        inside = [level for level in levels if _drawn(layout, level)]
        heights = [layout.scale.height_cm(level.energy_eV) for level in inside]
        grouped = _by_height(heights)
        for rows in grouped:
            _draw_part_level(axes, [inside[k] for k in rows], heights[rows[0]], x, colour)
        wanted = [heights[rows[0]] for rows in grouped]
        sizes = [LABEL_CM * len(rows) for rows in grouped]
        tops = spread_out(wanted, sizes, _BOTTOM_CM, layout.height - _TOP_CM) + np.array(sizes) / 2
        widest = max((_group_width([inside[k] for k in rows]) for rows in grouped), default=0.0) / 2
        for rows, top, y in zip(grouped, tops, wanted, strict=True):
            for n, k in enumerate(reversed(rows)):
                height = top - (n + 0.5) * LABEL_CM
                if abs(height - y) > LABEL_CM / 2:
                    start, end = x + side * _group_width([inside[j] for j in rows]) / 2, x + side * (widest + 0.08)
                    axes.plot([start, end], [y, height], color=look.grid, lw=0.5, zorder=0)
                write(
                    axes, x + side * (widest + 0.1), height, _part_label(inside[k], side), va="center",
                    ha="left" if side > 0 else "right", fontsize=SMALL_POINTS, color=look.ink, gid="label part",
                )  # fmt: skip
        if side < 0:
            _draw_metal_irreps(axes, inside, heights, x)


def _draw_metal_irreps(axes: Axes, levels: Sequence[PartLevel], heights: Sequence[float], x: float) -> None:
    """Irreps of each shell under its level, where the next level leaves room."""
    for k, (level, y) in enumerate(zip(levels, heights, strict=True)):
        if level.irreps and (k == 0 or y - heights[k - 1] > 2 * LABEL_CM):
            text = joined(*(irrep(name) for name in dict.fromkeys(level.irreps)))
            write(axes, x, y - 0.15, text, ha="center", va="top", fontsize=SMALL_POINTS, gid="label irreps", zorder=3)


def _by_height(heights: Sequence[float]) -> list[list[int]]:
    """Levels at one height, as they come from a lone atom."""
    groups: list[list[int]] = []
    for k, height in enumerate(heights):
        if groups and height - heights[groups[-1][0]] < 0.05:
            groups[-1].append(k)
        else:
            groups.append([k])
    return groups


def _draw_part_level(axes: Axes, levels: Sequence[PartLevel], y: float, x: float, colour: str) -> None:
    count = min(sum(level.degeneracy for level in levels), 7)
    width = _group_width(levels)
    edges = np.linspace(x - width / 2, x + width / 2, count + 1)
    for low, high in pairwise(edges):
        axes.plot([low + 0.02, high - 0.02], [y, y], color=colour, lw=1.8, solid_capstyle="butt", zorder=4)


def _part_label(level: PartLevel, side: int) -> str:
    """Shell of a metal level; shell, bond part and irreps of a level of the ligands."""
    if side < 0:
        return level.label
    symbols = [irrep(name) for name in dict.fromkeys(level.irreps)]
    return joined(level.label, part(level.symmetry) if level.symmetry else "", *symbols)


def _draw_words(axes: Axes, report: BondReport, found: Interaction, layout: _Layout, look: Look) -> None:
    metal_x, middle, _, _, _ = layout.columns
    labels, bonds, top = report.fragment.labels, report.coordination.bonds, layout.height - 0.3
    donor = bonds[found.bonds[0]]
    ligands = f"{donor.kind} {labels[donor.donor]}" if len(found.bonds) == 1 else f"{len(found.bonds)} {donor.kind}"
    heads: tuple[tuple[float, str, str], ...] = (
        (metal_x, labels[found.metal], "center"),
        (middle, chemical(complex_formula(report), report.fragment.charge), "center"),
        (layout.width - 0.15, ligands, "right"),
    )
    for x, text, align in heads:
        write(axes, x, top, text, ha=align, va="center", fontsize=TEXT_POINTS + 1, gid="label head")
    _draw_key(axes, found, layout, look)


def _draw_key(axes: Axes, found: Interaction, layout: _Layout, look: Look) -> None:
    """Key of lines and colours under the diagram."""
    used = {level.symmetry for level in found.ligand_levels} | {found.sets[k].symmetry for k in layout.shown}
    entries: list[tuple[str, str, object]] = [
        (f"{part(name)} to the bond", look.part(name), dashes(name))
        for name in ("sigma", "pi", "delta")
        if name in used
    ]
    x, y = 0.25, 0.72
    for text, colour, style in entries:
        axes.plot([x, x + 0.55], [y, y], color=colour, lw=1.2, ls=style)
        write(axes, x + 0.65, y, text, ha="left", va="center", fontsize=SMALL_POINTS, gid="label key")
        x += 2.3
    x, y = 0.25, 0.32
    for text, colour in zip(("metal", "ligand of the bond", "others (ticks: theirs alone)"), look.origins, strict=True):
        axes.plot([x, x + 0.3], [y, y], color=colour, lw=1.8, solid_capstyle="butt")
        write(axes, x + 0.4, y, text, ha="left", va="center", fontsize=SMALL_POINTS, gid="label key")
        x += 0.7 + 0.105 * len(text)
    if layout.above:
        write(
            axes, layout.width - 0.1, 0.72, f"{layout.above} higher levels not drawn", ha="right", va="center",
            fontsize=SMALL_POINTS, color=look.muted, gid="label key",
        )  # fmt: skip
