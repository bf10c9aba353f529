"""A scan as text for a terminal."""

from __future__ import annotations

import re
import textwrap

from ehmo.errors import visible
from ehmo.records.scan import Scan, ScannedMode, ScanPoint
from ehmo.records.table import aligned
from ehmo.report.cautions import CAUTIONS
from ehmo.report.text import sentence_lines
from ehmo.units import PER_CM_PER_EV

WIDTH = 100


def scan_text(scan: Scan, source: str) -> str:
    """Whole scan as text.

    Parameters
    ----------
    scan : Scan
    source : str
        File it started from (hostile text: shown visibly).

    Returns
    -------
    text : str
    """
    labels = scan.labels
    named = "-".join(labels[atom] for atom in scan.plan.atoms)
    sections = [
        [
            f"{visible(source)}: scan of the {scan.plan.coordinate} {named}, {len(scan.points)} points",
            f"Charge {scan.charge:+d}, {scan.unpaired_electrons} unpaired, set {visible(scan.parameter_set)}, "
            f"{scan.charge_model} charges",
        ],
        _bonds(scan),
        _energy(scan),
        _ladder(scan),
        sentence_lines("Crossings", scan.crossings) if scan.crossings else [],
        sentence_lines("Withheld", scan.withheld) if scan.withheld else [],
        sentence_lines("Assumed", scan.plan.notes),
        _doubts(scan),
        sentence_lines("Cautions", CAUTIONS),
    ]
    return "\n\n".join("\n".join(section) for section in sections if section) + "\n"


def _coordinate(scan: Scan) -> tuple[str, int]:
    return ("length/Å", 3) if scan.plan.coordinate == "length" else ("angle/degree", 1)


def _bonds(scan: Scan) -> list[str]:
    """Numbers of the scanned bond, or of the strongest multiple bond, against the coordinate."""
    place = scan.scanned_bond
    if place is None:
        first = next((point for point in scan.points if not point.fault), None)
        if first is None:
            return []
        place = max(range(len(first.bonds)), key=lambda k: first.bonds[k].mayer)
    label = scan.bond_labels[place]
    metal, donor = (scan.labels.index(name) for name in label.split("-"))
    name, digits = _coordinate(scan)
    heading = [name, "overlap pop.", "Mayer", "Wiberg", "formal", "sigma", "pi"]
    rows = [[*heading, f"q({scan.labels[metal]})/e", f"q({scan.labels[donor]})/e", "ground term", "first bands/cm-1"]]
    for point in scan.points:
        if point.fault:
            rows.append([f"{point.value:.{digits}f}", *["-"] * 9, ""])
            continue
        bond = point.bonds[place]
        rows.append(
            [
                f"{point.value:.{digits}f}",
                f"{bond.overlap_population:.2f}",
                f"{bond.mayer:.2f}",
                f"{bond.wiberg:.2f}",
                "?" if bond.formal_order is None else f"{bond.formal_order:.3g}",
                f"{bond.sigma:.2f}",
                f"{bond.pi:.2f}",
                f"{point.charges[metal]:+.2f}",
                f"{point.charges[donor]:+.2f}",
                point.ground_term or "-",
                ", ".join(f"{term} {energy:.0f}" for term, energy in point.bands_per_cm[:2]),
            ]
        )
    return [f"Bond {label}", *aligned(rows, numeric=range(9), indent="  ")]


def _energy(scan: Scan) -> list[str]:
    """Energies above the lowest point, and the minimum with its modes."""
    known = [(point.value, point.energy_eV) for point in scan.points if point.energy_eV is not None]
    if not known:
        return []
    name, digits = _coordinate(scan)
    lowest = min(energy for _, energy in known)
    rows = [[name, "energy/eV"]]
    rows += [[f"{value:.{digits}f}", f"{energy - lowest:.3f}"] for value, energy in known]
    lines = [f"Energy above the lowest point, which lies {lowest:+.2f} eV from the separated neutral atoms"]
    return [*lines, *aligned(rows, numeric=range(2), indent="  "), *_minimum(scan)]


def _minimum(scan: Scan) -> list[str]:
    minimum, named = scan.minimum, "-".join(scan.labels[atom] for atom in scan.plan.atoms)
    if minimum is None:
        return []
    isotopes = ", ".join(f"{name}={number}" for name, number in minimum.isotopes)
    lines = [
        "",
        f"Minimum of {named}: {minimum.length_A:.4f} Å, force constant {minimum.force_constant_N_per_m:.0f} N/m "
        f"({minimum.force_constant_N_per_m / 100:.2f} mdyn/Å)",
        f"  quartic through {len(minimum.fitted)} points from {minimum.fitted[0]:.3f} to {minimum.fitted[-1]:.3f} Å, "
        f"rms {minimum.fit_rms_eV:.1e} eV",
    ]
    if minimum.modes:
        rows = [["stretching mode/cm-1", "reduced mass/u", f"part of {named}", "together with"]]
        rows += [
            [
                f"{mode.wavenumber_per_cm:.1f}",
                f"{mode.reduced_mass_u:.3f}",
                f"{100 * mode.share:.0f} %",
                _company(mode, named),
            ]
            for mode in minimum.modes
        ]
        masses = f"isotopes {isotopes}" if isotopes else "standard atomic weights"
        lines += aligned(rows, numeric=range(3), indent="  ")
        lines.append(f"  harmonic, with every angle held; {masses}")
    return lines


def _company(mode: ScannedMode, named: str) -> str:
    """Other bonds of a mode, with their phase."""
    own = max(abs(part) for label, part in mode.stretches if label == named)
    words = [
        f"{label} {'in phase' if part > 0 else 'out of phase'}"
        for label, part in mode.stretches
        if label != named and abs(part) > 0.3 * own
    ]
    return ", ".join(words) or "-"


def _ladder(scan: Scan) -> list[str]:
    """Levels above the lowest one, each under its leading function."""
    with_levels = [point for point in scan.points if point.levels]
    if not with_levels:
        return []
    functions = [level.function for level in with_levels[0].levels]
    if any(sorted(level.function for level in point.levels) != sorted(functions) for point in with_levels):
        functions = []
    name, digits = _coordinate(scan)
    titles = [_titled(with_levels, function) for function in functions]
    titles = titles or [f"level {k + 1}" for k in range(len(with_levels[0].levels))]
    rows = [[name, *titles]]
    rows += [[f"{point.value:.{digits}f}", *_levels(point, functions)] for point in with_levels]
    return ["Ladder, cm-1 above the lowest level", *aligned(rows, numeric=range(len(rows[0])), indent="  ")]


def _titled(points: list[ScanPoint], function: str) -> str:
    """Function with its irrep, where that is the same all along the scan."""
    irreps = {level.irrep for point in points for level in point.levels if level.function == function}
    return f"{function} ({irreps.pop()})" if len(irreps) == 1 and "" not in irreps else function


def _levels(point: ScanPoint, functions: list[str]) -> list[str]:
    lowest = point.levels[0].energy_eV
    above = [(level.function, (level.energy_eV - lowest) * PER_CM_PER_EV) for level in point.levels]
    if functions:
        by_function = dict(above)
        return [f"{by_function[function]:.0f}" for function in functions]
    return [f"{energy:.0f}" for _, energy in above]


def _doubts(scan: Scan) -> list[str]:
    """Points without a result, and warnings with the range where they stand."""
    said = [f"no result at {point.value:g}: {point.fault}" for point in scan.points if point.fault]
    # Warnings that differ in their numbers alone are one: the first is quoted.
    ranges: dict[str, tuple[str, list[float]]] = {}
    for point in scan.points:
        for warning in point.warnings:
            ranges.setdefault(re.sub(r"\d[\d.]*", "#", warning), (warning, []))[1].append(point.value)
    for warning, values in ranges.values():
        where = f"at {values[0]:g}" if len(values) == 1 else f"from {values[0]:g} to {values[-1]:g}"
        said.append(f"{where}: {warning}")
    return sentence_lines("To doubt", said) if said else []


def progress_line(point: ScanPoint, done: int, total: int) -> str:
    """Short word on one point, for the error stream."""
    state = visible(textwrap.shorten(point.fault, 60)) if point.fault else f"{point.iterations} iterations"
    return f"{done}/{total} at {point.value:g}: {state}"
