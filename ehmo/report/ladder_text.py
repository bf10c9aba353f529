"""Ladder, terms, bands and magnetism as text for a terminal."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence

import numpy as np

from ehmo.records.bands import Band
from ehmo.records.ligand_field import LadderLevel, LigandFieldParameters
from ehmo.records.multiplets import GTensor, Magnetism, Terms
from ehmo.records.report import BondReport
from ehmo.records.site import MetalSite, ShellConstants, Spectroscopy
from ehmo.records.table import aligned
from ehmo.records.wording import with_deviation
from ehmo.units import PER_CM_PER_EV

WIDTH = 100
PURE = 0.995
"""Share of an irrep from which it goes without saying."""

_LISTED_BANDS = 24
_SHORT_BANDS = 4
_SPECTRUM_PER_CM = 60_000.0
_FORBIDDEN_STRENGTH = 1e-7  # rounding of a strength that symmetry makes zero
_VISIBLE_STRENGTH = 0.01
_AXIAL = 0.005

LADDER_NUMBERS = tuple(range(2, 8))
TERM_NUMBERS = (1, 4)
BAND_NUMBERS = (0, 4, 7)
"""Columns of `ladder_rows`, `term_rows` and `band_rows` that hold numbers."""


def orbital_irrep(report: BondReport, orbital: int) -> str:
    """Irrep of an orbital, with its share where the structure is distorted."""
    irreps = report.orbital_irreps
    if irreps is None or not irreps.labels[orbital]:
        return "-"
    return _with_share(irreps.labels[orbital], float(irreps.label_shares[orbital]))


def _with_share(irrep: str, share: float) -> str:
    return irrep + ("" if share >= PURE else f" {100 * share:.0f} %")


def ladder_lines(report: BondReport, site: MetalSite) -> list[str]:
    """Levels of one metal, and the ligand-field parameters that they give."""
    ladder = site.ladder
    if ladder is None:
        return []
    lines = [
        *textwrap.wrap(ladder_heading(report, site), WIDTH, subsequent_indent="  "),
        *aligned(ladder_rows(report, site), numeric=LADDER_NUMBERS, indent="  "),
    ]
    if site.parameters is not None:
        for sentence in parameter_sentences(site.parameters):
            lines += textwrap.wrap(sentence, WIDTH, initial_indent="  ", subsequent_indent="    ")
    return lines


def ladder_heading(report: BondReport, site: MetalSite) -> str:
    """Metal, shell, group and how the levels were chosen."""
    name, ladder = report.fragment.labels[site.metal], site.ladder
    if ladder is None:
        return f"Ladder of {name}: {site.ladder_withheld}"
    return f"Ladder of {name} ({ladder.shell}, group {site.symmetry.group.name}; {ladder.selection})"


def ladder_rows(report: BondReport, site: MetalSite) -> list[list[str]]:
    """Heading, and one row for each level, topmost first; empty without a ladder."""
    ladder = site.ladder
    if ladder is None:
        return []
    rows = [
        ["level", "mostly", "energy/eV", "above lowest/cm-1", "electrons", "metal/%", "donors/%", "overlap pop.", ""]
    ]
    lowest = ladder.levels[0].energy_eV
    spreads = report.level_spreads(site)
    for place, level in reversed(list(enumerate(ladder.levels))):
        own = spreads[place] if spreads else None
        # Levels that several metals share are no orbitals: their functions tell the irrep.
        own_label = _with_share(level.irrep, level.irrep_share) or "-"
        label = own_label if level.orbital is None else orbital_irrep(report, level.orbital)
        rows.append(
            [
                label,
                f"{level.function} {100 * level.function_share:.0f} %",
                with_deviation(f"{level.energy_eV:.2f}", None if own is None else own.energy_eV, 2),
                with_deviation(
                    f"{(level.energy_eV - lowest) * PER_CM_PER_EV:.0f}",
                    own.above_lowest_per_cm if own is not None and place else None,
                    0,
                ),
                f"{round(level.electrons, 2):g}",
                f"{100 * level.metal_share:.0f}",
                f"{100 * level.donor_share:.0f}",
                f"{level.overlap_population:+z.2f}",
                _inversion(level),
            ]
        )
    return rows


def _inversion(level: LadderLevel) -> str:
    return f"inverted: its bonding partner has {100 * level.partner_share:.0f} %" if level.inverted else ""


def parameter_sentences(parameters: LigandFieldParameters) -> list[str]:
    """Crystal-field and angular-overlap parameters, and what the geometry leaves open."""
    lines = []
    if parameters.crystal_field_per_cm:
        said = ", ".join(f"{name} {value:.0f}" for name, value in parameters.crystal_field_per_cm.items())
        lines.append(f"Crystal field/cm-1: {said}")
    by_kind: dict[str, list[str]] = {}
    for item in parameters.angular_overlap:
        value = "undetermined" if item.value_eV is None else f"{item.value_eV * PER_CM_PER_EV:.0f}"
        by_kind.setdefault(item.kind, []).append(f"e_{item.symmetry} {value}")
    said = "; ".join(f"{kind} {', '.join(values)}" for kind, values in by_kind.items())
    lines.append(f"Angular overlap/cm-1: {said}; misfit {parameters.rms_per_cm:.0f}")
    return [*lines, *(f"Not determined by this geometry: {combination}" for combination in parameters.undetermined)]


def short_spectrum_lines(report: BondReport) -> list[str]:
    """Ground term and the first bands in a few lines."""
    text = spectrum_in_words(report)
    return [*textwrap.wrap(text, WIDTH, subsequent_indent="  "), "  (in full: ehmo ladder FILE)"] if text else []


def spectrum_in_words(report: BondReport) -> str:
    """Ground term, first bands, moment and g in a sentence; empty if there are none."""
    spectrum = report.spectroscopy
    if not spectrum.ground_term and not spectrum.bands:
        return ""
    said = f"Ground term {spectrum.ground_term}" if spectrum.ground_term else "Bands"
    within = [band for band in spectrum.bands if band.kind != "charge transfer" and band.spin_allowed][:_SHORT_BANDS]
    allowed = [band for band in spectrum.bands if band.kind == "charge transfer" and band.dipole_allowed]
    strong = [band for band in allowed if (band.oscillator_strength or 0.0) >= _VISIBLE_STRENGTH]
    transfer = (strong or allowed)[:2]
    parts = [f"{band.upper_term} {band.wavenumber_per_cm:.0f}{_allowed(band)}" for band in within]
    parts += [f"{band.direction} {band.wavenumber_per_cm:.0f} ({band.transition})" for band in transfer]
    text = said + (f"; bands/cm-1: {', '.join(parts)}" if parts else "")
    if spectrum.magnetism is not None:
        text += f"; moment {spectrum.magnetism.effective_moment:.2f} at {spectrum.magnetism.temperature_K:.0f} K"
        if spectrum.magnetism.g_tensor is not None:
            text += f"; {_g_in_words(spectrum.magnetism.g_tensor)}"
    return text


def _allowed(band: Band) -> str:
    return f" ({band.polarisation})" if band.dipole_allowed else " (forbidden)"


def ladder_text(report: BondReport) -> str:
    """Ladder, terms, bands and magnetism in full.

    Parameters
    ----------
    report : BondReport
        Result of a calculation.

    Returns
    -------
    text : str
        Sections from the ladder on; the heading of the report is left to the caller.
    """
    spectrum = report.spectroscopy
    sections = [
        *(ladder_lines(report, site) for site in report.distinct_sites()),
        _constants_lines(spectrum.constants),
        _terms_lines(spectrum),
        _band_lines(spectrum.bands, None if report.spread is None else report.spread.bands_per_cm),
        _magnetism_lines(spectrum),
        _fit_lines(spectrum),
        _withheld_lines(report),
    ]
    return "\n\n".join("\n".join(section) for section in sections if section) + "\n"


def _constants_lines(constants: ShellConstants | None) -> list[str]:
    return [] if constants is None else textwrap.wrap(constants_in_words(constants), WIDTH, subsequent_indent="  ")


def constants_in_words(constants: ShellConstants) -> str:
    """Free-ion constants, their reductions and sources."""
    values = [
        f"{name} {value:.0f}"
        for name, value in (
            ("B", constants.racah_B_per_cm),
            ("C", constants.racah_C_per_cm),
            ("F2", constants.F2_per_cm),
            ("F4", constants.F4_per_cm),
            ("F6", constants.F6_per_cm),
            ("zeta", constants.zeta_per_cm),
        )
        if value is not None
    ]
    repulsion = f"repulsion reduced by {constants.repulsion_factor:.2f}, " if constants.repulsion_factor < 1 else ""
    return (
        f"Constants of {constants.ion}/cm-1: {', '.join(values) or 'none tabulated'}; {repulsion}orbital momentum "
        f"reduced by {constants.momentum_factor:.2f} on the average (metal shares); "
        f"sources {', '.join(constants.sources) or 'none'}"
    )


def _terms_lines(spectrum: Spectroscopy) -> list[str]:
    if spectrum.terms is None:
        return [f"Ground term {spectrum.ground_term}"] if spectrum.ground_term else []
    terms = spectrum.terms
    allowed = " or ".join(terms.by_symmetry)
    lines = [
        f"Ground term {spectrum.ground_term} in {terms.group}; the leading configuration of the lowest term, "
        f"{terms.ground.configuration_text}, alone allows {allowed}"
    ]
    rows, rest = term_rows(terms)
    more = [f"  and {rest} higher terms"] if rest else []
    return [*lines, *aligned(rows, numeric=TERM_NUMBERS, indent="  "), *more]


def term_rows(terms: Terms) -> tuple[list[list[str]], int]:
    """Heading and one row for each of the lower terms, and the number of those left out."""
    rows = [["term", "energy/cm-1", "parent", "configuration", "weight/%", ""]]
    shown = [term for term in terms.terms if term.energy_per_cm < _SPECTRUM_PER_CM][:_LISTED_BANDS]
    rows += [
        [
            term.label,
            f"{term.energy_per_cm:.0f}",
            f"{term.parent} {100 * term.parent_share:.0f} %",
            term.configuration_text,
            f"{100 * term.configuration_share:.0f}",
            "" if term.share >= PURE else f"irrep {100 * term.share:.0f} %",
        ]
        for term in shown
    ]
    return rows, len(terms.terms) - len(shown)


def _band_lines(bands: Sequence[Band], deviations: Sequence[float | None] | None) -> list[str]:
    if not bands:
        return []
    rows, rest = band_rows(bands, deviations)
    more = [f"  and {rest} more, in the JSON"] if rest else []
    return [bands_heading(bands), *aligned(rows, numeric=BAND_NUMBERS, indent="  "), *more]


def bands_heading(bands: Sequence[Band]) -> str:
    """Heading of a table of bands, which says how to read the kinds."""
    transfer = any(band.kind == "charge transfer" for band in bands)
    return (
        "Bands" + " (of charge transfer: direction, and the part of the electron that moves onto the metal)" * transfer
    )


def band_rows(bands: Sequence[Band], deviations: Sequence[float | None] | None) -> tuple[list[list[str]], int]:
    """Heading and one row for each of the more important bands, and the number of those left out."""
    rows = [["band/cm-1", "kind", "upper term", "transition", "factor", "spin", "dipole", "strength"]]
    every = zip(bands, deviations or [None] * len(bands), strict=True)
    shown = [(band, deviation) for band, deviation in every if band.wavenumber_per_cm < _SPECTRUM_PER_CM]
    # Spin-allowed bands first in line when there is no room for all.
    within = [pair for pair in shown if pair[0].kind != "charge transfer"]
    kept = sorted(within, key=lambda pair: (not pair[0].spin_allowed, pair[0].wavenumber_per_cm))[:_LISTED_BANDS]
    kept.sort(key=lambda pair: pair[0].wavenumber_per_cm)
    kept += [pair for pair in shown if pair[0].kind == "charge transfer"][: _LISTED_BANDS // 2]
    rows += [
        [
            with_deviation(f"{band.wavenumber_per_cm:.0f}", deviation, 0),
            _kind(band),
            band.upper_term or "-",
            band.transition,
            str(band.degeneracy),
            "allowed" if band.spin_allowed else "forbidden",
            band.polarisation or ("allowed" if band.dipole_allowed else "forbidden"),
            _strength(band),
        ]
        for band, deviation in kept
    ]
    return rows, len(bands) - len(kept)


def _kind(band: Band) -> str:
    """Kind of a band; of charge transfer the direction and how much of the electron reaches the metal."""
    if band.direction is None or band.to_metal is None:
        return band.kind
    return f"{band.direction} {100 * band.to_metal:+z.0f} %"


def _strength(band: Band) -> str:
    strength = band.oscillator_strength
    return "-" if strength is None or strength < _FORBIDDEN_STRENGTH else f"{strength:.1e}"


def _magnetism_lines(spectrum: Spectroscopy) -> list[str]:
    magnetism = spectrum.magnetism
    if magnetism is None:
        return []
    return ["Magnetism", *(f"  {sentence}" for sentence in magnetism_sentences(spectrum, magnetism))]


def magnetism_sentences(spectrum: Spectroscopy, magnetism: Magnetism) -> list[str]:
    """Moment, zero-field splitting and g."""
    lines = [
        f"moment {magnetism.effective_moment:.2f} Bohr magnetons at {magnetism.temperature_K:.0f} K "
        f"(spin only {magnetism.spin_only_moment:.2f})",
        *_splitting_lines(magnetism),
    ]
    if magnetism.g_tensor is not None:
        lines.append(f"{_g_in_words(magnetism.g_tensor)}")
    for name, tensor in (("g", magnetism.g_tensor), ("g of the lowest doublet", magnetism.doublet_g_tensor)):
        if tensor is not None and (name == "g" or tensor is not magnetism.g_tensor):
            axes = "; ".join(_numbers(axis, 2) for axis in tensor.axes)
            lines.append(f"{name} {_numbers(tensor.values, 3)} (spin {tensor.effective_spin:g}; local axes {axes})")
    if spectrum.first_order_g is not None:
        parallel, perpendicular = spectrum.first_order_g
        lines.append(f"g by first-order formulas: parallel {parallel:.3f}, perpendicular {perpendicular:.3f}")
    lines.append("Ligand spin-orbit coupling and charge-transfer states are left out of g and D.")
    return lines


def _g_in_words(tensor: GTensor) -> str:
    """Values along the local axes: parallel and perpendicular to z where x and y agree."""
    x, y, z = (tensor.along(axis) for axis in np.eye(3))
    diagonal = np.allclose(sorted((x, y, z)), tensor.values, atol=2e-3)
    if diagonal and abs(x - y) < _AXIAL:
        return f"g parallel to z {z:.3f}, perpendicular {(x + y) / 2:.3f}"
    if diagonal:
        return f"g along local x {x:.3f}, y {y:.3f}, z {z:.3f}"
    return f"g {_numbers(tensor.values, 3)}"


def _splitting_lines(magnetism: Magnetism) -> list[str]:
    splitting = magnetism.zero_field_splitting
    if splitting is None:
        return []
    return [
        f"zero-field splitting D {splitting.D_per_cm:.2f}, E {splitting.E_per_cm:.2f} cm-1 (spin {splitting.spin:g})"
    ]


def _fit_lines(spectrum: Spectroscopy) -> list[str]:
    fit = spectrum.fit
    if fit is None:
        return []
    g = None if spectrum.fitted_magnetism is None else spectrum.fitted_magnetism.g_tensor
    assigned = [["observed/cm-1", "upper term", "computed/cm-1", "fitted/cm-1"]]
    assigned += [
        [f"{a.observed_per_cm:.0f}", a.upper_term, f"{a.computed_per_cm:.0f}", f"{a.fitted_per_cm:.0f}"]
        for a in fit.assignments
    ]
    moved = [["parameter", "computed/cm-1", "fitted/cm-1", "width/cm-1", ""]]
    moved += [
        [
            p.name,
            f"{p.computed_per_cm:.0f}",
            f"{p.fitted_per_cm:.0f}",
            f"{p.width_per_cm:.0f}",
            "" if p.determined else "not determined by these bands",
        ]
        for p in fit.parameters
    ]
    return [
        "Observed bands, assigned to the terms named, else in the order of energy to the spin-allowed ones",
        *aligned(assigned, numeric=(0, 2, 3), indent="  "),
        "Ligand field fitted to them, damped towards the computed one (levels above the lowest)",
        *aligned(moved, numeric=(1, 2, 3), indent="  "),
        *(f"  left open: {combination}" for combination in fit.undetermined),
        *([f"  with the fitted field {_g_in_words(g)}"] if g is not None else []),
    ]


def _withheld_lines(report: BondReport) -> list[str]:
    lines = ["Withheld"]
    for reason in withheld_reasons(report):
        lines += textwrap.wrap(reason, WIDTH, initial_indent="  - ", subsequent_indent="    ")
    return lines if len(lines) > 1 else []


def withheld_reasons(report: BondReport) -> list[str]:
    """What of ladder, terms, bands and magnetism is missing, and why."""
    spectrum = report.spectroscopy
    reasons = [*spectrum.withheld]
    reasons += [f"ladder: {site.ladder_withheld}" for site in report.sites if site.ladder_withheld]
    if spectrum.magnetism is not None:
        reasons += spectrum.magnetism.withheld
    return list(dict.fromkeys(reasons))


def _numbers(values: np.ndarray, digits: int) -> str:
    return " ".join(f"{value:z.{digits}f}" for value in values)
