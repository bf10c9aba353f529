"""Structures of a store as an ASE database."""

from __future__ import annotations

import sqlite3
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ehmo.report.export.selection import DoneRows, Exported, Selection
from ehmo.report.export.tables import record_document
from ehmo.store import Store, StoredRow
from ehmo.store.columns import Cell, cell_vectors, listed_atoms
from ehmo.store.packing import pack

if TYPE_CHECKING:
    from ase import Atoms

_NAMES = {"charge": "total_charge"}
"""Columns whose names ase.db keeps for its own."""
_LEFT_OUT = frozenset({"formula", "tags", "status", "message"})
"""Columns that ase.db has itself, or that say nothing there."""


def write_ase_database(store: Store, selection: Selection, target: Path) -> Exported:
    """One row of an ASE database per structure: columns as key-value pairs, the full record as data."""
    from ase.db import connect

    rows = DoneRows(store, selection)
    target.unlink(missing_ok=True)  # ase.db asks what it finds for its version
    try:
        with connect(target, type="db", use_lock_file=False) as database:
            for row in rows:
                atoms = _atoms(dict(row.document or {}))
                database.write(atoms, key_value_pairs=_pairs(row), data={"ehmo": record_document(row)})
    except sqlite3.Error as fault:
        raise OSError(str(fault)) from fault
    return rows.exported


def _atoms(document: Mapping[str, Any]) -> Atoms:
    """Atoms with the Mulliken charges and spin populations as results."""
    from ase import Atoms
    from ase.calculators.singlepoint import SinglePointCalculator

    listed, cell = listed_atoms(document), cell_vectors(document)
    atoms = Atoms(
        [atom["symbol"] for atom in listed],
        [atom["position_A"] for atom in listed],
        cell=cell,
        pbc=cell is not None,
    )
    numbers = {
        name: [atom[field] or 0.0 for atom in document["atoms"]]
        for name, field in {"charges": "mulliken_charge", "magmoms": "spin_population"}.items()
    }
    atoms.set_initial_charges(numbers["charges"])  # what ase.db takes the total charge from
    atoms.calc = SinglePointCalculator(atoms, **numbers)
    atoms.calc.name = "ehmo"
    return atoms


def _pairs(row: StoredRow) -> dict[str, Cell]:
    """Columns that have a value; text that reads as a number or a truth value stays in the data, as ase.db asks."""
    return {
        _NAMES.get(name, name): value
        for name, value in pack(row).structure.items()
        if name not in _LEFT_OUT and value is not None and not (isinstance(value, str) and _reads_as_number(value))
    }


def _reads_as_number(text: str) -> bool:
    try:
        float(text)
    except ValueError:
        return text in ("True", "False")
    return True
