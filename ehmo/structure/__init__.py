"""Files to fragments; fragments to metals, bonds, ligands, donor kinds, local frames and electron counts.

What concerns crystals is loaded on first use, so that plain molecules do not pay for it.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from ehmo.structure.electrons import assign_electrons
from ehmo.structure.files import MAX_ATOMS, MAX_BYTES
from ehmo.structure.perceive import perceive
from ehmo.structure.readers import from_ase, is_crystal, read, read_frames

if TYPE_CHECKING:
    from ehmo.structure.crystal import crystal_contents, read_crystals

__all__ = [
    "MAX_ATOMS",
    "MAX_BYTES",
    "assign_electrons",
    "crystal_contents",
    "from_ase",
    "is_crystal",
    "perceive",
    "read",
    "read_crystals",
    "read_frames",
]


def __getattr__(name: str) -> Any:
    if name in ("crystal_contents", "read_crystals"):
        from ehmo.structure import crystal

        return getattr(crystal, name)
    raise AttributeError(f"module 'ehmo.structure' has no attribute {name!r}")
