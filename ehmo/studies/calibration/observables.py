"""Table of observables: what a set is fitted to, each with its source."""

from __future__ import annotations

import re
from collections.abc import Mapping
from pathlib import Path

from basis_params import ParameterFileError
from basis_params.faults import FaultList, Row, number, plain_text, read_text, shown, split_rows
from ehmo.errors import InputError
from ehmo.records.calibration import QUANTITIES, UNITS, Observable, Quantity

COLUMNS = ("species", "structure", "quantity", "of", "value", "sd", "unit", "source", "read_or_memory")
PROVENANCE = ("read", "memory", "derived")

_FORMS = {
    "Mayer order": (r"[A-Z][a-z]?\d+-[A-Z][a-z]?\d+", "a bond, as V1-O2"),
    "charge": (r"[A-Z][a-z]?\d+", "an atom, as V1"),
    "d-d band": (r"\d\S+( [1-9])?", "an upper term, as 2E, or 4T1g 2 for the second of its kind"),
    "10Dq": (r"", "nothing"),
    "charge-transfer band": (r"lowest( allowed)?|\S+ to \S+", "lowest allowed, lowest, or irreps, as t1 to e"),
    "length": (r"[A-Z][a-z]?\d+-[A-Z][a-z]?\d+|[a-z].*", "a kind of donor, as oxo, or a bond, as V1-O2"),
    "stretching wavenumber": (r"[a-z].* (in|out of) phase", "a kind of donor and a mode, as oxo in phase"),
}


def read_observables(path: Path, sds: Mapping[Quantity, float]) -> tuple[Observable, ...]:
    """Read a table of observables.

    Parameters
    ----------
    path : Path
        CSV file; lines that start with # before the header are remarks.
    sds : mapping of str to float
        Standard deviation of each quantity, for rows that state none.

    Returns
    -------
    observables : tuple of Observable

    Raises
    ------
    InputError
        With every fault and its line.
    """
    faults = FaultList(str(path))
    try:
        lines = read_text(path).splitlines()
        head = next((k for k, line in enumerate(lines) if line.strip() and not line.startswith("#")), len(lines))
        header, rows = split_rows("\n".join(lines[head:]), head + 1, faults)
        if header != COLUMNS:
            faults.add(head + 1, f"the header is {shown(','.join(header))}: write {','.join(COLUMNS)}")
            faults.raise_if_any()
        found = tuple(_observable(row, sds, faults) for row in rows)
        if not rows:
            faults.add(head + 1, "no rows under the header: add observables")
        faults.raise_if_any()
    except FileNotFoundError:
        raise InputError("no such table of observables", place=str(path), mend="check the path") from None
    except ParameterFileError as fault:
        raise InputError("; ".join(fault.faults), place=str(path), mend="mend the table") from None
    return found


def _observable(row: Row, sds: Mapping[Quantity, float], faults: FaultList) -> Observable:
    cells, line = row.cells, row.line
    quantity = next((known for known in QUANTITIES if known == cells["quantity"]), None)
    named = ("species", "structure", "source", *(("of",) if cells["of"] else ()))
    texts = {"of": ""} | {name: plain_text(cells[name], name, line, faults) for name in named}
    if quantity is None:
        faults.add(line, f"unknown quantity {shown(cells['quantity'])}: known are {', '.join(QUANTITIES)}")
        quantity = QUANTITIES[0]
    else:
        form, words = _FORMS[quantity]
        if not re.fullmatch(form, cells["of"]):
            faults.add(line, f"of is {shown(cells['of'])}: for {quantity} write {words}")
        if cells["unit"] != UNITS[quantity]:
            faults.add(line, f"unit is {shown(cells['unit'])}: {quantity} is in {UNITS[quantity] or 'no unit'}")
    if cells["read_or_memory"] not in PROVENANCE:
        faults.add(line, f"read_or_memory is {shown(cells['read_or_memory'])}: write {', '.join(PROVENANCE)}")
    if not cells["sd"] and quantity not in sds:
        faults.add(line, f"sd is empty and the specification states none: give one, or {quantity!r} under [sd]")
    sd = number(cells["sd"], "sd", line, faults) if cells["sd"] else sds.get(quantity, 1.0)
    if not sd > 0:
        faults.add(line, f"sd is {sd:g}: it must be above 0")
    return Observable(
        **texts,
        quantity=quantity,
        value=number(cells["value"], "value", line, faults),
        sd=sd,
        provenance=cells["read_or_memory"],
        line=line,
    )
