"""Files to fragments; fragments to metals, bonds, ligands, donor kinds, local frames and electron counts.

What concerns crystals and databases is loaded on first use, so that plain molecules do not pay for it.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from ehmo.structure.electrons import assign_electrons
from ehmo.structure.files import MAX_ATOMS, MAX_BYTES, is_ase_database
from ehmo.structure.perceive import perceive
from ehmo.structure.readers import from_ase, is_crystal, read, read_frames

if TYPE_CHECKING:
    from ehmo.structure.ase_database import DatabaseRow, ase_database_numbers, ase_database_row, ase_database_rows
    from ehmo.structure.crystal import crystal_contents, read_crystals

__all__ = [
    "MAX_ATOMS",
    "MAX_BYTES",
    "DatabaseRow",
    "ase_database_numbers",
    "ase_database_row",
    "ase_database_rows",
    "assign_electrons",
    "crystal_contents",
    "from_ase",
    "is_ase_database",
    "is_crystal",
    "perceive",
    "read",
    "read_crystals",
    "read_frames",
]


def __getattr__(name: str) -> Any:
    if name in ("DatabaseRow", "ase_database_numbers", "ase_database_row", "ase_database_rows"):
        from ehmo.structure import ase_database

        return getattr(ase_database, name)
    if name in ("crystal_contents", "read_crystals"):
        from ehmo.structure import crystal

        return getattr(crystal, name)
    raise AttributeError(f"module 'ehmo.structure' has no attribute {name!r}")
