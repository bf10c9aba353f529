"""Whole molecules out of a periodic cell."""

from __future__ import annotations

from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from ehmo.errors import InputError
from ehmo.records.fragment import Fragment
from ehmo.structure.files import shown
from ehmo.structure.graph import BOND_FACTOR, MAX_COORDINATE_A, OVERLAP_A, ElementReach

if TYPE_CHECKING:
    from ase import Atoms

MAX_ATOMS_PER_A3: Final = 0.4
"""No crystal is denser; diamond has 0.18 (common practice)."""

MIN_CELL_HEIGHT_A: Final = 1.5
"""Cells flatter than this are taken for mistakes [angstrom]."""

Neighbours = list[list[tuple[int, tuple[int, int, int]]]]


@dataclass(frozen=True, slots=True)
class PeriodicCell:
    """Full contents of a cell.

    Attributes
    ----------
    atoms : ase.Atoms
        Every atom of the cell, with its lattice.
    listed : (n_atoms,) ndarray of bool
        Whether the file lists the atom itself, rather than symmetry making it.
    labels : tuple of str
        Label of each atom in the file.
    place : str
        File and block, for messages and as `Fragment.source`.
    title : str
        Title as found.
    notes : tuple of str
        What the reader did.
    """

    atoms: Atoms
    listed: NDArray[np.bool_]
    labels: tuple[str, ...]
    place: str
    title: str
    notes: tuple[str, ...] = ()


def check_cell(cell: PeriodicCell) -> None:
    """Refuse lattices and coordinates that cannot be real.

    Raises
    ------
    InputError
        If a coordinate, a cell height or the volume per atom is impossible.
    """
    lattice = np.asarray(cell.atoms.cell)
    if not (np.abs(lattice) < MAX_COORDINATE_A).all():
        raise InputError("impossible cell", place=cell.place, mend="correct the cell lengths and angles")
    far = ~(np.abs(cell.atoms.positions) < MAX_COORDINATE_A).all(axis=1)
    if far.any():
        label = shown(cell.labels[int(far.argmax())], 20)
        raise InputError(
            f"{label} has a coordinate beyond {MAX_COORDINATE_A:.0e} A",
            place=cell.place,
            mend="give coordinates in angstrom",
        )
    volume = abs(float(np.linalg.det(lattice)))
    faces = [float(np.linalg.norm(np.cross(lattice[k - 2], lattice[k - 1]))) for k in range(3)]
    if not np.isfinite(volume) or volume / max(*faces, 1e-9) < MIN_CELL_HEIGHT_A:
        raise InputError("impossible cell", place=cell.place, mend="correct the cell lengths and angles")
    if len(cell.atoms) / volume > MAX_ATOMS_PER_A3:
        raise InputError(
            f"{len(cell.atoms)} atoms do not fit into a cell of {volume:.1f} A^3",
            place=cell.place,
            mend="correct the cell, or the symmetry operations",
        )


def molecules_with_metals(cell: PeriodicCell) -> tuple[Fragment, ...]:
    """One fragment for each metal-containing molecule whose atoms the file lists.

    Atoms are moved by lattice translations only, so that a molecule cut by a cell face is put together.

    Raises
    ------
    InputError
        If there is no metal, atoms overlap, or no molecule is whole; it says whether the structure is polymeric
        or the molecule needs atoms that symmetry makes.
    """
    check_cell(cell)
    symbols = tuple(cell.atoms.get_chemical_symbols())
    reach = ElementReach.of(symbols)
    starts = np.flatnonzero(reach.is_metal & cell.listed).tolist()
    if not starts:
        raise InputError("no metal", place=cell.place, mend="give a compound of a metal")
    neighbours = _periodic_neighbours(cell, reach)
    found: dict[frozenset[int], dict[int, tuple[int, int, int]]] = {}
    faults: list[str] = []
    seen: set[int] = set()
    for start in starts:
        if start in seen:
            continue
        shifts, endless = _walk(start, neighbours)
        seen.update(shifts)
        fault = _fault(cell, start, shifts, endless)
        if fault:
            faults.append(fault)
        else:
            found[frozenset(shifts)] = shifts
    if not found:
        raise InputError("; ".join(faults[:3]), place=cell.place, mend="cut out one whole molecule and give it as XYZ")
    left_out = int(cell.listed.sum()) - sum(map(len, found))
    return tuple(_fragment(cell, symbols, shifts, left_out, faults) for shifts in found.values())


def _periodic_neighbours(cell: PeriodicCell, reach: ElementReach) -> Neighbours:
    from ase.neighborlist import neighbor_list

    i, j, distances, shifts = neighbor_list("ijdS", cell.atoms, (BOND_FACTOR * reach.radii_A).tolist())
    close = np.flatnonzero(distances < OVERLAP_A)
    if close.size:
        a, b = (shown(cell.labels[k[close[0]]], 20) for k in (i, j))
        raise InputError(
            f"{a} and {b} overlap at {distances[close[0]]:.3f} A",
            place=cell.place,
            mend="disordered or duplicate sites: keep one alternative",
        )
    bonded = reach.bonded(i, j, distances)
    neighbours: Neighbours = [[] for _ in cell.labels]
    for a, b, shift in zip(i[bonded].tolist(), j[bonded].tolist(), shifts[bonded].tolist(), strict=True):
        neighbours[a].append((b, tuple(shift)))
    return neighbours


def _walk(start: int, neighbours: Neighbours) -> tuple[dict[int, tuple[int, int, int]], bool]:
    """Lattice shift of each atom of a molecule, and whether some atom is reached at two shifts: a polymer."""
    shifts = {start: (0, 0, 0)}
    queue = deque([start])
    endless = False
    while queue:
        atom = queue.popleft()
        here = shifts[atom]
        for other, step in neighbours[atom]:
            there = (here[0] + step[0], here[1] + step[1], here[2] + step[2])
            if other not in shifts:
                shifts[other] = there
                queue.append(other)
            elif shifts[other] != there:
                endless = True
    return shifts, endless


def _fault(cell: PeriodicCell, start: int, shifts: dict[int, tuple[int, int, int]], endless: bool) -> str:
    label = shown(cell.labels[start], 20)
    if endless:
        return f"polymeric: the bonds from {label} run on without end"
    made = sum(not cell.listed[atom] for atom in shifts)
    if made:
        return f"the molecule of {label} is not listed whole: symmetry makes {made} of its {len(shifts)} atoms"
    return ""


def _fragment(
    cell: PeriodicCell,
    symbols: Sequence[str],
    shifts: dict[int, tuple[int, int, int]],
    left_out: int,
    faults: list[str],
) -> Fragment:
    order = sorted(shifts)
    moves = np.array([shifts[atom] for atom in order])
    notes = list(cell.notes)
    if moves.any():
        notes.append("Atoms were moved by lattice translations to put the molecule together.")
    if left_out:
        notes.append(f"{left_out} listed atoms outside the molecules with a metal were left out.")
    notes += [f"Left out: {fault}." for fault in faults]
    first = next(cell.labels[atom] for atom in order if shifts[atom] == (0, 0, 0))
    return Fragment(
        symbols=tuple(symbols[atom] for atom in order),
        positions_A=cell.atoms.positions[order] + moves @ np.asarray(cell.atoms.cell),
        title=cell.title,
        source=f"{cell.place}, molecule of {shown(first, 20)}",
        notes=tuple(notes),
    )
