"""Electronic spectrum: bands as sticks and under an envelope, observed ones marked."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Final

import numpy as np

from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray
from ehmo.records.bands import Band
from ehmo.records.report import BondReport
from ehmo.report.figures.canvas import COLUMN_CM, SMALL_POINTS, TEXT_POINTS, axes_at, drawn, new_figure, paper_axes
from ehmo.report.figures.markup import NOTE_CM, chemical, irrep, joined, note_lines, term, write, write_notes
from ehmo.report.figures.markup import width_cm as width_of
from ehmo.report.figures.placement import spread_out
from ehmo.report.formula import complex_formula
from ehmo.report.look import LIGHT, Look
from ehmo.units import STRENGTH_PER_ABSORPTIVITY

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

WIDTH_PER_CM: Final = 3000.0
"""Full width of a band at half its height, as the envelope has it [cm^-1]."""

LAST_PER_CM: Final = 60_000.0
"""End of the spectrum: beyond it no solvent is clear [cm^-1]."""

THOUSAND: Final = 1000.0
MOST_NAMES: Final = 12

_STRONG = 0.01  # oscillator strength from which a charge-transfer band is named
_LEFT_CM, _RIGHT_CM, _BOTTOM_CM, _PLOT_CM, _ABOVE_CM = 1.15, 0.2, 1.2, 4.6, 0.85
_LINE_CM = 0.29
_AREA = (np.pi / (4 * np.log(2))) ** 0.5  # of a Gaussian of unit height and unit width at half of it


@drawn
def spectrum_figure(
    report: BondReport,
    observed_per_cm: Sequence[float] = (),
    *,
    look: Look = LIGHT,
    width_cm: float = COLUMN_CM,
    band_width_per_cm: float = WIDTH_PER_CM,
) -> Figure:
    """Computed bands as sticks and as a sum of Gaussians, on a logarithmic scale of the molar absorptivity.

    A stick ends at the absorptivity at the top of its own Gaussian. Bands within the shell that no dipole allows have
    no computed intensity: they stand as hollow circles on the axis, spin-forbidden ones as ticks. Diamonds mark
    observed bands.

    Parameters
    ----------
    report : BondReport
    observed_per_cm : sequence of float
        Observed bands besides those that the report was fitted to [cm^-1].
    look : Look
        Colours.
    width_cm : float
        Of the figure [cm].
    band_width_per_cm : float
        Full width at half height of the Gaussians [cm^-1].

    Returns
    -------
    figure : Figure

    Raises
    ------
    InputError
        If the report has no bands.
    """
    bands = [band for band in report.spectroscopy.bands if 0 < band.wavenumber_per_cm <= LAST_PER_CM]
    if not bands:
        reason = "; ".join(report.spectroscopy.withheld) or f"it has none below {LAST_PER_CM:.0f} cm-1"
        raise InputError(
            f"there are no bands to draw: {reason}", place=report.fragment.source, mend="draw another figure"
        )
    fit = report.spectroscopy.fit
    observed = sorted({*observed_per_cm, *(a.observed_per_cm for a in (fit.assignments if fit else ()))})
    named = _named(bands)
    names_cm = max(width_of(_name(band), SMALL_POINTS) for band in named) + 0.25 if named else 0.2
    height = _BOTTOM_CM + _PLOT_CM + _ABOVE_CM + names_cm
    notes = note_lines(_notes(bands, bool(observed), band_width_per_cm), width_cm - 0.12)
    below = NOTE_CM * (len(notes) - 1)
    figure = new_figure(width_cm, height + below, layout=None)
    paper = paper_axes(figure, below)
    plot_cm = width_cm - _LEFT_CM - _RIGHT_CM
    axes = axes_at(figure, _LEFT_CM, _BOTTOM_CM + below, plot_cm, _PLOT_CM)
    last = _last(bands, named, observed)
    peaks = _peaks(bands, band_width_per_cm)
    _draw_bands(axes, bands, peaks, last, band_width_per_cm, look)
    _draw_observed(axes, observed, look)
    _draw_names(paper, named, last, plot_cm, look)
    write(
        paper, 0.06, height - 0.3, chemical(complex_formula(report), report.fragment.charge), ha="left", va="center",
        fontsize=TEXT_POINTS + 1, gid="label head",
    )  # fmt: skip
    write_notes(paper, notes, look)
    return figure


def absorptivity(strength: float, width_per_cm: float) -> float:
    """Molar absorptivity at the top of a Gaussian band [L mol^-1 cm^-1].

    Parameters
    ----------
    strength : float
        Oscillator strength.
    width_per_cm : float
        Full width at half height [cm^-1].

    Returns
    -------
    peak : float
    """
    return float(strength / (STRENGTH_PER_ABSORPTIVITY * width_per_cm * _AREA))


def _peaks(bands: Sequence[Band], width: float) -> FloatArray:
    return np.array([absorptivity(band.oscillator_strength or 0.0, width) for band in bands])


def _named(bands: Sequence[Band]) -> list[Band]:
    """Bands with a name: spin-allowed ones within the shell, then the strongest charge transfers."""
    within = [band for band in bands if band.kind != "charge transfer" and band.spin_allowed]
    strong = [band for band in bands if band.kind == "charge transfer" and (band.oscillator_strength or 0.0) >= _STRONG]
    strong.sort(key=lambda band: -(band.oscillator_strength or 0.0))
    chosen = [*within, *strong][:MOST_NAMES]
    return sorted(chosen, key=lambda band: band.wavenumber_per_cm)


def _name(band: Band) -> str:
    """Upper term of a band within the shell, else the two orbitals."""
    if band.kind != "charge transfer":
        return term(band.upper_term) if band.upper_term else band.transition
    ends = [end.split() for end in band.transition.split(" to ")]
    if len(ends) != 2 or not all(len(end) == 2 for end in ends):
        return band.transition
    return joined(ends[0][0], irrep(ends[0][1]), "\N{RIGHTWARDS ARROW}", ends[1][0], irrep(ends[1][1]))


def _last(bands: Sequence[Band], named: Sequence[Band], observed: Sequence[float]) -> float:
    """End of the axis [10^3 cm^-1]."""
    highest = max([*(band.wavenumber_per_cm for band in (named or bands)), *observed]) / THOUSAND
    return float(min(LAST_PER_CM / THOUSAND, 5 * np.ceil(1.06 * highest / 5)))


def _draw_bands(axes: Axes, bands: Sequence[Band], peaks: FloatArray, last: float, width: float, look: Look) -> None:
    """Sticks, envelope, and the marks of bands without an intensity, with the axes."""
    axes.set_xlim(0, last)
    axes.set_xlabel("wavenumber/10³ cm⁻¹", labelpad=2)
    bright = [(band.wavenumber_per_cm / THOUSAND, peak) for band, peak in zip(bands, peaks, strict=True) if peak > 0.1]
    lowest = 0.1 if any(peak < 1 for _, peak in bright) else 1.0
    axes.set_yscale("log")
    axes.set_ylim(lowest, max(10 ** np.ceil(np.log10(max([1.0, *(peak for _, peak in bright)]) * 1.6)), 10 * lowest))
    if bright:
        axes.set_ylabel("molar absorptivity/L mol⁻¹ cm⁻¹", labelpad=2)
        axes.yaxis.set_major_formatter(_power)
        grid = np.linspace(0, last, 1201)
        places, heights = np.array(bright).T
        spread = (grid[:, None] - places) / (width / THOUSAND)
        curve = (heights * np.exp(-4 * np.log(2) * spread**2)).sum(axis=1)
        axes.fill_between(grid, lowest, np.maximum(curve, lowest), color=look.shade, lw=0, zorder=1, gid="envelope")
        axes.plot(grid, np.maximum(curve, lowest), color=look.muted, lw=0.8, zorder=2, gid="envelope")
    else:
        axes.set_yticks([])
        axes.spines["left"].set_visible(False)
    axes.minorticks_off()
    foot = axes.get_xaxis_transform()
    for band, peak in zip(bands, peaks, strict=True):
        x = band.wavenumber_per_cm / THOUSAND
        colour = look.donor if band.kind == "charge transfer" else look.metal
        if peak > lowest:
            style = (0, (4, 1.2)) if band.kind == "charge transfer" else "-"
            axes.plot(
                [x, x], [lowest, peak], color=colour, lw=1.3, ls=style, solid_capstyle="butt", zorder=4, gid="stick"
            )
        elif not band.spin_allowed:
            axes.plot([x, x], [0, 0.025], transform=foot, color=look.muted, lw=0.6, zorder=3, gid="spin-forbidden")
        elif band.kind != "charge transfer":
            axes.plot(
                [x], [0], transform=foot, marker="o", ms=4, mfc=look.paper, mec=colour, mew=1.1, ls="none", zorder=6,
                clip_on=False, gid="no intensity",
            )  # fmt: skip


def _power(value: float, _: object) -> str:
    digits = str(round(np.log10(value))).translate(str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻"))
    return f"10{digits}"


def _draw_observed(axes: Axes, observed: Sequence[float], look: Look) -> None:
    foot = axes.get_xaxis_transform()
    for value in observed:
        x = value / THOUSAND
        axes.plot([x, x], [0.06, 1], transform=foot, color=look.positive, lw=0.7, ls=(0, (1, 2)), zorder=3)
        axes.plot(
            [x], [0.06], transform=foot, marker="D", ms=3.4, mfc=look.paper, mec=look.positive, mew=1.0, ls="none",
            zorder=7, gid="observed",
        )  # fmt: skip


def _draw_names(paper: Axes, named: Sequence[Band], last: float, plot_cm: float, look: Look) -> None:
    """Names above the plot, upright, each led down to its band."""
    places = [_LEFT_CM + band.wavenumber_per_cm / THOUSAND / last * plot_cm for band in named]
    base = _BOTTOM_CM + _PLOT_CM + 0.35
    centres = spread_out(places, [_LINE_CM] * len(places), _LEFT_CM - 0.2, _LEFT_CM + plot_cm + _RIGHT_CM)
    for band, x, at in zip(named, places, centres, strict=True):
        paper.plot([x, x, at], [_BOTTOM_CM, base - 0.3, base - 0.03], color=look.grid, lw=0.5, zorder=-1)
        write(
            paper, at, base, _name(band), ha="center", va="bottom", rotation=90, fontsize=SMALL_POINTS,
            color=look.ink, gid="label band",
        )  # fmt: skip


def _notes(bands: Sequence[Band], observed: bool, width: float) -> list[str]:
    """What the marks mean."""
    notes = []
    if any((band.oscillator_strength or 0.0) > 0 for band in bands):
        notes.append(f"Gaussians of {width:,.0f} cm\N{SUPERSCRIPT MINUS}\N{SUPERSCRIPT ONE}")
    if any(band.kind == "charge transfer" for band in bands):
        notes.append("broken: charge transfer")
    if any(band.kind != "charge transfer" and band.spin_allowed for band in bands):
        notes.append("circle: no intensity computed")
    if any(not band.spin_allowed for band in bands):
        notes.append("tick: spin-forbidden")
    if observed:
        notes.append("diamond: observed")
    return notes
