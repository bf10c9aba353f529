"""Manifests: a CSV file with one structure file to a row, its charge, spin and tags."""

from __future__ import annotations

import csv
import re
from collections.abc import Iterator, Mapping
from pathlib import Path

from ehmo.batch.tree import SourceFile, outside
from ehmo.errors import InputError
from ehmo.structure.files import shown

COLUMNS = ("path", "charge", "unpaired", "tags")

_WHOLE = re.compile(r"[+-]?\d{1,4}")
_LONGEST_CELL = 100_000


def is_manifest(path: Path) -> bool:
    """Whether a file is a manifest, by its suffix."""
    return path.suffix.lower() == ".csv"


def manifest_files(path: Path, *, allow_outside: bool = False) -> Iterator[SourceFile]:
    """Files that a manifest lists.

    Parameters
    ----------
    path : Path
        CSV with the column ``path`` and, in any order, ``charge``, ``unpaired`` and ``tags`` (separated by semicolons).
        Paths count from the folder of the manifest.
    allow_outside : bool
        Allow paths that lead out of that folder.

    Yields
    ------
    file : SourceFile
        Rows that cannot be used come with their fault.

    Raises
    ------
    InputError
        If the file cannot be read, or its columns are not those.
    """
    csv.field_size_limit(_LONGEST_CELL)
    try:
        with path.open(encoding="utf-8-sig", errors="replace", newline="") as file:
            rows = csv.reader(file)
            names = _names(next(rows, []), path)
            for cells in rows:
                if any(cell.strip() for cell in cells):
                    yield _file(names, cells, path, rows.line_num, allow_outside=allow_outside)
    except (OSError, csv.Error) as fault:
        reason = fault.strerror if isinstance(fault, OSError) else str(fault)
        raise InputError(
            f"the manifest cannot be read ({shown(reason)})", place=shown(path, 200), mend="give a CSV file"
        ) from None


def _names(cells: list[str], path: Path) -> list[str]:
    names = [cell.strip().lower() for cell in cells]
    unknown = [name for name in names if name not in COLUMNS]
    if unknown or "path" not in names or len(set(names)) < len(names):
        wrong = f"unknown column {shown(unknown[0], 30)!r}" if unknown else "no column path, or a column twice"
        raise InputError(
            wrong, place=f"{shown(path, 200)}, line 1", mend="start with a line such as path,charge,unpaired,tags"
        )
    return names


def _file(names: list[str], cells: list[str], path: Path, line: int, *, allow_outside: bool) -> SourceFile:
    place = f"{path}, line {line}"
    if len(cells) != len(names):
        return SourceFile(place, fault=f"{len(cells)} cells, the manifest has {len(names)} columns\ncorrect the line")
    row = dict(zip(names, (cell.strip() for cell in cells), strict=True))
    if not row["path"]:
        return SourceFile(place, fault="no path\ngive one, or take out the line")
    target = path.parent / row["path"]
    tags = tuple(tag.strip() for tag in row.get("tags", "").split(";") if tag.strip())
    try:
        charge, unpaired = _number(row, "charge"), _number(row, "unpaired")
    except ValueError as fault:
        return SourceFile(place, tags=tags, fault=f"{fault}\nwrite a whole number, or leave it empty")
    if unpaired is not None and unpaired < 0:
        return SourceFile(place, tags=tags, fault="unpaired electrons cannot be negative\ngive 0 or more")
    leads_out = "" if allow_outside else outside(target, path.parent)
    return SourceFile(str(target), charge, unpaired, tags, leads_out)


def _number(row: Mapping[str, str], name: str) -> int | None:
    text = row.get(name, "")
    if not text:
        return None
    if not _WHOLE.fullmatch(text):
        raise ValueError(f"{name} {shown(text, 20)!r} is no whole number")
    return int(text)
