"""A scan back from its JSON document."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

from ehmo.errors import InputError
from ehmo.records.scan import Scan, ScanMinimum, ScannedMode, ScanPlan
from ehmo.report.scan_document import SCAN_SCHEMA, point_from_document


def read_scan(path: str | Path, *, max_bytes: int = 100_000_000) -> Scan:
    """Scan from a file that ``ehmo scan --json`` wrote.

    Parameters
    ----------
    path : str or Path
    max_bytes : int
        Size allowed.

    Returns
    -------
    scan : Scan

    Raises
    ------
    InputError
        If the file cannot be read, is larger, or holds no scan with points.
    """
    place = str(path)
    try:
        size = Path(path).stat().st_size
        if size > max_bytes:
            raise InputError(
                f"the file has {size} bytes, over the limit of {max_bytes}", place=place, mend="raise --max-bytes"
            )
        text = Path(path).read_text(encoding="utf-8")
    except (OSError, ValueError) as fault:
        reason = getattr(fault, "strerror", None) or "it is no text"
        raise InputError(f"cannot be read ({reason})", place=place, mend="give a file that ehmo scan wrote") from None
    try:
        document = json.loads(text)
        if document["schema"] != SCAN_SCHEMA:
            raise ValueError("schema")
        scan = scan_from_document(document)
    except (ValueError, KeyError, TypeError, IndexError, AttributeError, RecursionError):
        raise InputError("no scan", place=place, mend="give a file that ehmo scan --json wrote") from None
    if not any(not point.fault for point in scan.points):
        raise InputError("the scan has no points", place=place, mend="run it to its end")
    return scan


def scan_from_document(document: dict[str, Any]) -> Scan:
    """Scan from its document.

    Parameters
    ----------
    document : dict
        As `ehmo.report.scan_document.scan_document` makes it.

    Returns
    -------
    scan : Scan

    Raises
    ------
    ValueError, KeyError, TypeError
        If it is none.
    """
    points = tuple(point_from_document(point) for point in document["points"])
    coordinate = document["coordinate"]
    if coordinate not in ("length", "angle"):
        raise ValueError(coordinate)
    return Scan(
        plan=ScanPlan(
            coordinate,
            tuple(map(int, document["atoms"])),
            tuple(map(int, document["moved"])),
            tuple(point.value for point in points),
            tuple(map(str, document["notes"])),
            bool(document["relaxed"]),
        ),
        labels=tuple(map(str, document["atom_labels"])),
        bond_labels=tuple(map(str, document["bond_labels"])),
        scanned_bond=None if document["scanned_bond"] is None else int(document["scanned_bond"]),
        parameter_set=str(document["parameter_set"]),
        charge_model=str(document["charge_model"]),
        charge=int(document["charge"]),
        unpaired_electrons=int(document["unpaired_electrons"]),
        points=points,
        crossings=tuple(map(str, document["crossings"])),
        withheld=tuple(map(str, document["withheld"])),
        minimum=None if document["minimum"] is None else _minimum(document["minimum"]),
        parameter_sha256=str(document["parameter_sha256"]),
        constants=tuple(document["constants"].items()),
    )


def _minimum(found: dict[str, Any]) -> ScanMinimum:
    return ScanMinimum(
        float(found["length_A"]),
        float(found["energy_eV"]),
        float(found["force_constant_N_per_m"]),
        tuple(map(float, found["fitted_lengths_A"])),
        float(found["fit_rms_eV"]),
        tuple(
            ScannedMode(
                float(mode["wavenumber_per_cm"]),
                float(mode["reduced_mass_u"]),
                float(mode["share"]),
                tuple((str(part["bond"]), float(part["part"])) for part in mode["stretches"]),
            )
            for mode in found["modes"]
        ),
        tuple((str(one["atom"]), int(one["mass_number"])) for one in found["isotopes"]),
    )
