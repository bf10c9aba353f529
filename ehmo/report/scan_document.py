"""A scan as a JSON document, back from it, and as CSV."""

from __future__ import annotations

import csv
import io
import json
import math
from typing import Any

import numpy as np

from ehmo import __version__
from ehmo.errors import InputError
from ehmo.records.scan import Scan, ScanMinimum, ScannedBond, ScannedLevel, ScanPoint
from ehmo.report.document import harmless

SCAN_SCHEMA = "ehmo scan 1"
"""Name and version of the document; the version rises when a field changes its meaning."""


def scan_text_json(scan: Scan) -> str:
    """JSON text of a scan."""
    return harmless(json.dumps(scan_document(scan), indent=1, ensure_ascii=False, allow_nan=False)) + "\n"


def scan_document(scan: Scan) -> dict[str, Any]:
    """Scan as plain data: dictionaries, lists, numbers and text.

    Parameters
    ----------
    scan : Scan

    Returns
    -------
    document : dict
        Ready for `json.dumps`.
    """
    return {
        "schema": SCAN_SCHEMA,
        "program_version": __version__,
        "coordinate": scan.plan.coordinate,
        "unit": "A" if scan.plan.coordinate == "length" else "degree",
        "atoms": list(scan.plan.atoms),
        "moved": list(scan.plan.moved),
        "atom_labels": list(scan.labels),
        "bond_labels": list(scan.bond_labels),
        "scanned_bond": scan.scanned_bond,
        "parameter_set": scan.parameter_set,
        "parameter_sha256": scan.parameter_sha256,
        "constants": dict(scan.constants),
        "charge_model": scan.charge_model,
        "charge": scan.charge,
        "unpaired_electrons": scan.unpaired_electrons,
        "points": [_point(point) for point in scan.points],
        "relaxed": scan.plan.relaxed,
        "minimum": None if scan.minimum is None else _minimum(scan.minimum),
        "crossings": list(scan.crossings),
        "withheld": list(scan.withheld),
        "notes": list(scan.plan.notes),
    }


def _minimum(minimum: ScanMinimum) -> dict[str, Any]:
    return {
        "length_A": minimum.length_A,
        "energy_eV": minimum.energy_eV,
        "force_constant_N_per_m": minimum.force_constant_N_per_m,
        "fitted_lengths_A": list(minimum.fitted),
        "fit_rms_eV": minimum.fit_rms_eV,
        "modes": [
            {
                "wavenumber_per_cm": mode.wavenumber_per_cm,
                "reduced_mass_u": mode.reduced_mass_u,
                "share": mode.share,
                "stretches": [{"bond": label, "part": part} for label, part in mode.stretches],
            }
            for mode in minimum.modes
        ],
        "isotopes": [{"atom": name, "mass_number": number} for name, number in minimum.isotopes],
    }


def _point(point: ScanPoint) -> dict[str, Any]:
    return {
        "value": point.value,
        "fault": point.fault or None,
        "energy_eV": point.energy_eV,
        "smearing_eV": point.smearing_eV,
        "positions_A": None if point.positions_A is None else point.positions_A.tolist(),
        "iterations": point.iterations,
        "ground_term": point.ground_term or None,
        "bonds": [
            {
                "length_A": bond.length_A,
                "overlap_population": bond.overlap_population,
                "mayer": bond.mayer,
                "wiberg": bond.wiberg,
                "formal_order": bond.formal_order,
                "sigma_weight": bond.sigma,
                "pi_weight": bond.pi,
                "delta_weight": bond.delta,
            }
            for bond in point.bonds
        ],
        "mulliken_charges": point.charges.tolist(),
        "ladder": [
            {
                "function": level.function,
                "irrep": level.irrep or None,
                "energy_eV": level.energy_eV,
                "electrons": level.electrons,
                "metal_share": level.metal_share,
            }
            for level in point.levels
        ],
        "bands": [{"upper_term": term, "wavenumber_per_cm": energy} for term, energy in point.bands_per_cm],
        "orbital_energies_eV": point.energies_eV.tolist(),
        "orbital_occupations": point.occupations.tolist(),
        "orbital_irreps": list(point.irreps),
        "followed": point.followed.tolist(),
        "warnings": list(point.warnings),
    }


def points_done(text: str, place: str, scan: Scan) -> tuple[ScanPoint, ...]:
    """Points of an earlier run of the same scan.

    Parameters
    ----------
    text : str
        JSON document.
    place : str
        File, for the message.
    scan : Scan
        The scan to be continued, without points.

    Returns
    -------
    points : tuple of ScanPoint

    Raises
    ------
    InputError
        If the text is no scan, or one of something else.
    """
    try:
        document = json.loads(text)
        same = {key: document[key] for key in _IDENTITY}
        points = tuple(point_from_document(point) for point in document["points"])
    except (ValueError, KeyError, TypeError, IndexError) as error:
        raise InputError(
            f"no scan to continue ({type(error).__name__})", place=place, mend="give another --json file"
        ) from None
    wanted = {key: value for key, value in scan_document(scan).items() if key in _IDENTITY}
    if same != wanted:
        differing = ", ".join(key for key in _IDENTITY if same[key] != wanted[key])
        raise InputError(
            f"the scan in it is another one (it differs in {differing})", place=place, mend="give another --json file"
        )
    return points


_IDENTITY = (
    "schema",
    "program_version",
    "coordinate",
    "atoms",
    "moved",
    "atom_labels",
    "bond_labels",
    "parameter_set",
    "parameter_sha256",
    "constants",
    "charge_model",
    "charge",
    "unpaired_electrons",
    "relaxed",
)


def point_from_document(point: dict[str, Any]) -> ScanPoint:
    """Point of a scan from its part of the document.

    Raises
    ------
    ValueError, KeyError, TypeError
        If it is none.
    """
    return ScanPoint(
        value=float(point["value"]),
        fault=point["fault"] or "",
        energies_eV=np.array(point["orbital_energies_eV"], dtype=np.float64),
        occupations=np.array(point["orbital_occupations"], dtype=np.float64),
        irreps=tuple(point["orbital_irreps"]),
        followed=np.array(point["followed"], dtype=np.intp),
        charges=np.array(point["mulliken_charges"], dtype=np.float64),
        bonds=tuple(
            ScannedBond(
                bond["length_A"],
                bond["overlap_population"],
                bond["mayer"],
                bond["wiberg"],
                bond["formal_order"],
                bond["sigma_weight"],
                bond["pi_weight"],
                bond["delta_weight"],
            )
            for bond in point["bonds"]
        ),
        levels=tuple(
            ScannedLevel(
                level["function"], level["irrep"] or "", level["energy_eV"], level["electrons"], level["metal_share"]
            )
            for level in point["ladder"]
        ),
        ground_term=point["ground_term"] or "",
        bands_per_cm=tuple((band["upper_term"], band["wavenumber_per_cm"]) for band in point["bands"]),
        iterations=int(point["iterations"]),
        warnings=tuple(point["warnings"]),
        energy_eV=None if point["energy_eV"] is None else float(point["energy_eV"]),
        smearing_eV=float(point["smearing_eV"]),
        positions_A=None if point["positions_A"] is None else np.array(point["positions_A"], dtype=np.float64),
    )


def scan_csv(scan: Scan) -> str:
    """One row per point: the coordinate, every bond, the charges and the ladder.

    Parameters
    ----------
    scan : Scan

    Returns
    -------
    text : str
        Text that a spreadsheet might take for a formula is quoted with an apostrophe.
    """
    n_levels = max((len(point.levels) for point in scan.points), default=0)
    unit = "A" if scan.plan.coordinate == "length" else "degree"
    heading = [f"{scan.plan.coordinate}_{unit}", "fault", "ground_term", "energy_eV"]
    for label in scan.bond_labels:
        heading += [f"{label} {name}" for name in ("length_A", "overlap_population", "mayer", "wiberg", "formal_order")]
        heading += [f"{label} {symmetry}_weight" for symmetry in ("sigma", "pi", "delta")]
    heading += [f"{label} charge_e" for label in scan.labels]
    for place in range(1, n_levels + 1):
        heading += [f"level {place} {name}" for name in ("function", "irrep", "energy_eV", "electrons")]
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(heading)
    for point in scan.points:
        cells: list[Any] = [f"{point.value:.6f}", inert(point.fault), inert(point.ground_term), point.energy_eV]
        for bond in point.bonds or ():
            cells += [
                bond.length_A,
                bond.overlap_population,
                bond.mayer,
                bond.wiberg,
                bond.formal_order,
                bond.sigma,
                bond.pi,
                bond.delta,
            ]
        cells += point.charges.tolist()
        for level in point.levels:
            cells += [level.function, level.irrep, level.energy_eV, level.electrons]
        cells = [_number(cell) if isinstance(cell, float) else "" if cell is None else cell for cell in cells]
        writer.writerow(cells + [""] * (len(heading) - len(cells)))
    return out.getvalue()


def _number(value: float) -> str:
    return f"{value:.6g}" if math.isfinite(value) else ""


def inert(text: str) -> str:
    """Text that no spreadsheet takes for a formula.

    Examples
    --------
    >>> inert("=1+1"), inert("2B2")
    ("'=1+1", '2B2')
    """
    return f"'{text}" if text[:1] in ("=", "+", "-", "@", "\t", "\r") else text
