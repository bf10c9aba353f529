"""Structure files for the batch tests."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

from tests.geometries import SPECIES, Species
from tests.structure.cif_text import cif, tetraoxo

SMALL = ("VOCl3", "CrO4 2-", "MnO4 -", "[VOCl4]2-", "[MoOCl4]-", "OsO4")
"""Ions of a few atoms that take milliseconds."""


def xyz_text(species: Species | str, *, stretched: float = 1.0) -> str:
    """One frame with charge and spin in its comment; another length makes another structure."""
    one = SPECIES[species] if isinstance(species, str) else species
    rows = [
        f"{symbol} {x:.6f} {y:.6f} {z:.6f}"
        for symbol, (x, y, z) in zip(one.symbols, one.positions_A * stretched, strict=True)
    ]
    head = f"{one.name.replace(' ', '_')} charge={one.charge} unpaired={one.unpaired_electrons}"
    return "\n".join([str(len(rows)), head, *rows]) + "\n"


def many_frames(count: int, names: Sequence[str] = SMALL) -> str:
    """Frames that all differ."""
    return "".join(xyz_text(names[k % len(names)], stretched=1.0 + 1e-4 * k) for k in range(count))


def put(folder: Path, name: str, text: str | bytes) -> Path:
    """File in a folder, made with its parents."""
    path = folder / name
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_bytes(text.encode() if isinstance(text, str) else text)
    return path


def chromate_cif(name: str = "chromate", metal: str = "Cr") -> str:
    """Block with a potassium salt of a tetraoxo ion."""
    return cif([*tetraoxo(metal), "K1 K 0.6 0.6 0.6", "K2 K 0.1 0.6 0.6"], name=name)


def rutile_cif() -> str:
    """TiO2, a framework (lengths of Abrahams and Bernstein 1971; memory)."""
    metals = ["Ti1 Ti 0 0 0", "Ti2 Ti 0.5 0.5 0.5"]
    oxygens = ["O1 O 0.305 0.305 0", "O2 O 0.695 0.695 0", "O3 O 0.195 0.805 0.5", "O4 O 0.805 0.195 0.5"]
    return cif([*metals, *oxygens], cell=(4.594, 4.594, 2.959, 90, 90, 90), name="rutile")
