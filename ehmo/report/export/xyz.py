"""Structures of a store as extended XYZ."""

from __future__ import annotations

from pathlib import Path

from ehmo.errors import visible
from ehmo.report.export.selection import DoneRows, Exported, Selection
from ehmo.store import Store, StoredRow
from ehmo.store.columns import Cell, cell_vectors, listed_atoms
from ehmo.store.packing import cells_of

_PROPERTIES = "species:S:1:pos:R:3:mulliken_charge:R:1:spin_population:R:1"


def write_xyz(store: Store, selection: Selection, target: Path) -> Exported:
    """One frame of extended XYZ per structure, with charges and spin populations of its atoms."""
    rows = DoneRows(store, selection)
    with target.open("w", encoding="utf-8", newline="\n") as file:
        for row in rows:
            file.write(xyz_frame(row))
    return rows.exported


def xyz_frame(row: StoredRow) -> str:
    """Frame of extended XYZ of a done row.

    Parameters
    ----------
    row : StoredRow

    Returns
    -------
    frame : str
    """
    document = dict(row.document or {})
    atoms, cell = listed_atoms(document), cell_vectors(document)
    words = [f"Properties={_PROPERTIES}", 'pbc="F F F"' if cell is None else 'pbc="T T T"']
    if cell is not None:
        words.append(f'Lattice="{" ".join(f"{number:.8f}" for vector in cell for number in vector)}"')
    structure, _ = cells_of(document)
    stated: dict[str, Cell] = {"charge": structure["charge"], "unpaired": structure["unpaired_electrons"]}
    words += [f"{name}={value}" for name, value in stated.items() if value is not None]
    kept = row.provenance
    texts = {"key": row.key, "parameter_set": kept.parameter_set, "source": kept.source, "entry": kept.entry}
    words += [f'{name}="{_within_quotes(text)}"' for name, text in texts.items() if text]
    lines = [str(len(atoms)), " ".join(words)]
    for atom, numbers in zip(atoms, document["atoms"], strict=True):
        x, y, z = atom["position_A"]
        charge, spin = numbers["mulliken_charge"] or 0.0, numbers["spin_population"] or 0.0
        lines.append(f"{atom['symbol']:2} {x:14.8f} {y:14.8f} {z:14.8f} {charge:10.6f} {spin:10.6f}")
    return "\n".join(lines) + "\n"


def _within_quotes(text: str) -> str:
    """Text that ends no quotation, escapes nothing and starts no line: readers of extended XYZ differ on escapes."""
    return visible(text.replace("\\", "/").replace('"', "'")).replace("\\", "/")
