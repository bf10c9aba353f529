"""Formats of an export, told by the suffix of the file."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from ehmo.errors import InputError
from ehmo.report.export.ase_database import write_ase_database
from ehmo.report.export.parquet import write_parquet
from ehmo.report.export.selection import Exported, Rows, Selection
from ehmo.report.export.tables import write_csv, write_json
from ehmo.report.export.xyz import write_xyz
from ehmo.store import Store


@dataclass(frozen=True, slots=True)
class Format:
    """A format.

    Attributes
    ----------
    name : str
    rows : tuple of Rows
        What its rows can be, the usual first.
    write : callable
        Writes what is selected of a store to a path.
    """

    name: str
    rows: tuple[Rows, ...]
    write: Callable[[Store, Selection, Path], Exported]


FORMATS = {
    ".csv": Format("CSV", ("bonds", "structures"), write_csv),
    ".parquet": Format("Parquet", ("bonds", "structures"), write_parquet),
    ".json": Format("JSON", ("bonds", "structures", "records"), write_json),
    ".xyz": Format("extended XYZ", ("records",), write_xyz),
    ".db": Format("an ASE database", ("records",), write_ase_database),
}
"""Formats by suffix."""


def export_format(path: str) -> Format:
    """Format of a file name.

    Raises
    ------
    InputError
        If its suffix is none of `FORMATS`.
    """
    found = FORMATS.get(Path(path).suffix.lower())
    if found is None:
        raise InputError(
            f"no format has the suffix {Path(path).suffix!r}", place=path, mend=f"use {', '.join(FORMATS)}"
        )
    return found
