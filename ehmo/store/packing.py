"""Rows as they lie in the database: a compressed document and the cells of the columns."""

from __future__ import annotations

import json
import zlib
from collections.abc import Mapping
from dataclasses import dataclass, fields
from typing import Any

from ehmo.errors import StoreError
from ehmo.store.columns import BOND_COLUMNS, STRUCTURE_COLUMNS, Cell
from ehmo.store.records import Provenance, StoredRow

LARGEST_DOCUMENT = 1 << 28
"""Bytes that a compressed document may unfold to; a crystal of 10,000 atoms stays below."""

_PROVENANCE = tuple(field.name for field in fields(Provenance))


@dataclass(frozen=True, slots=True)
class PackedRow:
    """A row ready for the database. It can be made where the calculation ran, which spares the writer the work.

    Attributes
    ----------
    structure : mapping of str to cell
        Cells of the structure by column, the key among them.
    bonds : tuple of mapping
        Cells of each bond by column.
    document : bytes or None
        Full document, compressed.
    """

    structure: Mapping[str, Cell]
    bonds: tuple[Mapping[str, Cell], ...]
    document: bytes | None

    @property
    def key(self) -> str:
        """Key of the row."""
        return str(self.structure["key"])

    @property
    def status(self) -> str:
        """Whether it is done or failed."""
        return str(self.structure["status"])

    @property
    def started_utc(self) -> str:
        """Start of the calculation."""
        return str(self.structure["started_utc"])


def pack(row: StoredRow) -> PackedRow:
    """Row with its document compressed and the cells of its columns taken out."""
    kept = row.provenance
    structure: dict[str, Cell] = {
        "key": row.key,
        "status": row.status,
        "message": storable(row.message),
        **{name: getattr(kept, name) for name in _PROVENANCE},
        "tags": json.dumps([storable(tag) for tag in kept.tags], ensure_ascii=False),
    }
    structure |= {name: storable(value) for name, value in structure.items() if isinstance(value, str)}
    if row.document is None:
        return PackedRow(structure | {column.name: None for column in STRUCTURE_COLUMNS}, (), None)
    cells, bonds = cells_of(row.document)
    return PackedRow(structure | cells, bonds, compressed(row.document))


def cells_of(document: Mapping[str, Any]) -> tuple[dict[str, Cell], tuple[dict[str, Cell], ...]]:
    """Cells that a document gives: those of the structure, and those of each bond."""
    return (
        {column.name: _safe(column.cell(document)) for column in STRUCTURE_COLUMNS},
        tuple(
            {column.name: _safe(column.cell(document, bond)) for column in BOND_COLUMNS}
            for bond in document.get("bonds") or ()
        ),
    )


def _safe(cell: Cell) -> Cell:
    return storable(cell) if isinstance(cell, str) else cell


def storable(text: str) -> str:
    r"""Text that every database takes: null characters and halves of surrogate pairs are shown as escapes.

    Examples
    --------
    >>> storable("a\x00b")
    'a\\x00b'
    """
    return text.replace("\x00", "\\x00").encode("utf-8", "backslashreplace").decode("utf-8")


def compressed(document: Mapping[str, Any]) -> bytes:
    """Document as compressed JSON."""
    # Level 1 takes a quarter of the time of level 6 and a sixth more room.
    return zlib.compress(json.dumps(document, separators=(",", ":"), allow_nan=False).encode("ascii"), 1)


def unfolded(data: bytes, place: str) -> dict[str, Any]:
    """Document of its compressed JSON.

    Raises
    ------
    StoreError
        If the bytes are damaged or unfold beyond `LARGEST_DOCUMENT`.
    """
    reader = zlib.decompressobj()
    try:
        text = reader.decompress(data, LARGEST_DOCUMENT)
        if reader.unconsumed_tail or not reader.eof:
            raise ValueError("it is cut short, or too large")
        document = json.loads(text)
        if not isinstance(document, dict):
            raise ValueError("it holds no record")
    except (zlib.error, ValueError, RecursionError) as fault:
        raise StoreError(
            f"a full record cannot be read ({fault})", place=place, mend="the store is damaged: take a copy of it"
        ) from None
    return document


def row_of(cells: Mapping[str, Any], document: bytes | None, place: str) -> StoredRow:
    """Row of its cells and its compressed document."""
    taken = {name: cells[name] for name in _PROVENANCE}
    taken["tags"] = tuple(json.loads(taken["tags"]))
    whole = None if document is None else unfolded(document, f"{place}, {cells['key'][:12]}")
    return StoredRow(cells["key"], cells["status"], cells["message"], whole, Provenance(**taken))
