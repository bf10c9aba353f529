"""Tables of a store as CSV and JSON, and its full records as JSON."""

from __future__ import annotations

import json
from collections.abc import Iterator
from dataclasses import asdict
from pathlib import Path
from typing import Any

from ehmo import __version__
from ehmo.errors import visible
from ehmo.report.export.selection import Exported, Selection
from ehmo.store import Store, StoredRow
from ehmo.store.columns import Cell, Column

SCHEMA = "ehmo export 1"
"""Name and version of the JSON form; the version rises when a field changes its meaning."""

_FORMULA_STARTS = tuple("=+-@\uff1d\uff0b\uff0d\uff20")
"""What spreadsheets take for the start of a formula, in both widths."""


def write_csv(store: Store, selection: Selection, target: Path) -> Exported:
    """Table as CSV (RFC 4180): text quoted, what is missing empty."""
    count = 0
    with target.open("w", encoding="utf-8", newline="") as file:
        file.write(",".join(column.name for column in selection.columns) + "\r\n")
        for cells in selected_cells(store, selection):
            file.write(",".join(map(csv_cell, cells)) + "\r\n")
            count += 1
    return Exported(count)


def csv_cell(cell: Cell) -> str:
    r"""One cell of a CSV file.

    Text is quoted, its control characters are shown, and an apostrophe goes before what a spreadsheet would take for
    a formula.

    Examples
    --------
    >>> csv_cell("=1+1"), csv_cell(-1), csv_cell(None), csv_cell('a "b" c')
    ('"\'=1+1"', '-1', '', '"a ""b"" c"')
    """
    if cell is None:
        return ""
    if not isinstance(cell, str):
        return repr(cell)
    text = visible(cell)
    guard = "'" if text.lstrip().startswith(_FORMULA_STARTS) else ""
    return '"' + guard + text.replace('"', '""') + '"'


def write_json(store: Store, selection: Selection, target: Path) -> Exported:
    """Table, or full records, as one JSON object whose rows are one per line."""
    count = 0
    head = facts(store, selection) | {"columns": [_column_document(column) for column in selection.columns]}
    with target.open("w", encoding="ascii") as file:
        file.write(json.dumps(head)[:-1] + ', "rows": [')
        for row in _json_rows(store, selection):
            file.write((",\n" if count else "\n") + json.dumps(row, allow_nan=False))
            count += 1
        file.write("\n]}\n")
    return Exported(count)


def selected_cells(store: Store, selection: Selection) -> Iterator[tuple[Cell, ...]]:
    """Cells of the rows and columns selected."""
    names = [column.name for column in selection.columns]
    return store.cells(selection.rows, selection.where, names)


def _json_rows(store: Store, selection: Selection) -> Iterator[dict[str, Any]]:
    if selection.rows == "records":
        return map(record_document, store.rows(selection.where))
    names = [column.name for column in selection.columns]
    return (dict(zip(names, cells, strict=True)) for cells in selected_cells(store, selection))


def record_document(row: StoredRow) -> dict[str, Any]:
    """Full record of a row as plain data."""
    return {
        "key": row.key,
        "status": row.status,
        "message": row.message,
        "provenance": asdict(row.provenance),
        "document": row.document,
    }


def facts(store: Store, selection: Selection) -> dict[str, Any]:
    """What an export says of itself."""
    return {
        "schema": SCHEMA,
        "program_version": __version__,
        "store": store.name,
        "rows_are": selection.rows,
        "where": None if selection.where is None else selection.where.text,
    }


def _column_document(column: Column) -> dict[str, str]:
    return {"name": column.name, "kind": column.kind, "unit": column.unit, "meaning": column.meaning}
