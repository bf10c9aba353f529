"""A crystal cell, its bond graph across the cell faces, and the pieces that hang together."""

from __future__ import annotations

from collections import deque
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import TYPE_CHECKING, Final

import numpy as np
from numpy.typing import NDArray

from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.structure.files import shown
from ehmo.structure.graph import (
    BOND_FACTOR,
    MAX_COORDINATE_A,
    OVERLAP_A,
    OVERLAP_FRACTION,
    SHADOW_MARGIN,
    ElementReach,
)

if TYPE_CHECKING:
    from ase import Atoms

MAX_ATOMS_PER_A3: Final = 0.4
"""No crystal is denser; diamond has 0.18 (common practice)."""

MIN_CELL_HEIGHT_A: Final = 1.5
"""Cells flatter than this are taken for mistakes [angstrom]."""

MAX_CROWD: Final = 40
"""Atoms in one cube of 2 A; three alternatives of a methyl group are 12."""

_CUBE_A: Final = 2.0

SAME_PLACE_A: Final = 0.1
"""Images of a site closer than this are one atom on a special position [angstrom]."""

_ION_REACH: Final = 0.7
"""Bare ions have no bonds; their neighbours matter only up to this fraction of their radius, for overlaps."""

Shift = tuple[int, int, int]


@dataclass(frozen=True, slots=True)
class LeftOut:
    """A site that the ordered model lacks; `count` is in the unit cell, weighted with the occupancy.

    `lone_ion` says whether it is a monatomic ion that counts beside the ones in the model.
    """

    label: str
    symbol: str
    count: float
    lone_ion: bool


@dataclass(frozen=True, slots=True)
class StatedFacts:
    """What a file says of the whole crystal.

    Attributes
    ----------
    formula : mapping of str to float
        Atoms of one formula unit; empty where the file gives none.
    formula_units : int or None
        In the unit cell.
    moieties : mapping of str to int
        Charge by Hill formula, as the author states it.
    left_out : tuple of LeftOut
    deposited : bool
        Whether the file describes a crystal as determined, whose ions must all be there; a box around a molecule
        that was made for a calculation need not be neutral.
    masked : bool
        Whether solvent was taken out of the electron density instead of being refined.
    """

    formula: Mapping[str, float] = field(default_factory=dict)
    formula_units: int | None = None
    moieties: Mapping[str, int] = field(default_factory=dict)
    left_out: tuple[LeftOut, ...] = ()
    deposited: bool = False
    masked: bool = False


@dataclass(frozen=True)
class PeriodicCell:
    """Full contents of a cell, one ordered alternative.

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
    sites : (n_atoms,) ndarray of int
        Number of the site of each atom; by default each atom is its own.
    weights : (n_atoms,) ndarray
        Share of cells in which the atom or one of its kind is present.
    rotations : (n_operations, 3, 3) ndarray
        Space-group operations on fractional coordinates, the identity first.
    translations : (n_operations, 3) ndarray
    copies : (n_atoms,) ndarray of int
        Operation that makes each atom from its site.
    occupancies : (n_atoms,) ndarray
        As the file gives them.
    oxidation : mapping of int to float
        Oxidation number by site, where the file labels it.
    mixed : mapping of int to str
        Sites that two elements share, in words, by site.
    attached : mapping of int to int
        Number of hydrogens at a site, where the file states it.
    facts : StatedFacts
    """

    atoms: Atoms
    listed: NDArray[np.bool_]
    labels: tuple[str, ...]
    place: str
    title: str
    notes: tuple[str, ...] = ()
    sites: IntArray = field(default_factory=lambda: np.empty(0, np.intp))
    weights: FloatArray = field(default_factory=lambda: np.empty(0))
    rotations: FloatArray = field(default_factory=lambda: np.eye(3)[None])
    translations: FloatArray = field(default_factory=lambda: np.zeros((1, 3)))
    copies: IntArray = field(default_factory=lambda: np.empty(0, np.intp))
    occupancies: FloatArray = field(default_factory=lambda: np.empty(0))
    oxidation: Mapping[int, float] = field(default_factory=dict)
    mixed: Mapping[int, str] = field(default_factory=dict)
    attached: Mapping[int, int] = field(default_factory=dict)
    facts: StatedFacts = field(default_factory=StatedFacts)

    def __post_init__(self) -> None:
        n = len(self.labels)
        if not len(self.sites):
            object.__setattr__(self, "sites", np.arange(n))
        if not len(self.weights):
            object.__setattr__(self, "weights", np.ones(n))
        if not len(self.copies):
            object.__setattr__(self, "copies", np.zeros(n, np.intp))
        if not len(self.occupancies):
            object.__setattr__(self, "occupancies", np.ones(n))

    @cached_property
    def symbols(self) -> tuple[str, ...]:
        """Element of each atom."""
        return tuple(self.atoms.get_chemical_symbols())

    @cached_property
    def lattice(self) -> FloatArray:
        """Rows are the lattice vectors [angstrom]."""
        return np.array(self.atoms.cell, dtype=float)

    @cached_property
    def positions(self) -> FloatArray:
        """Cartesian coordinates [angstrom]."""
        return np.array(self.atoms.positions, dtype=float)

    @cached_property
    def fractional(self) -> FloatArray:
        """Fractional coordinates."""
        return np.asarray(np.linalg.solve(self.lattice.T, self.positions.T).T)


def check_cell(cell: PeriodicCell) -> None:
    """Refuse lattices and coordinates that cannot be real.

    Raises
    ------
    InputError
        If a coordinate, a cell height or the volume per atom is impossible.
    """
    lattice = cell.lattice
    if not (np.abs(lattice) < MAX_COORDINATE_A).all():
        raise InputError("impossible cell", place=cell.place, mend="correct the cell lengths and angles")
    far = ~(np.abs(cell.positions) < MAX_COORDINATE_A).all(axis=1)
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
    crowd = _largest_crowd(cell)
    if len(cell.labels) / volume > MAX_ATOMS_PER_A3 or crowd > MAX_CROWD:
        raise InputError(
            f"{len(cell.labels)} atoms do not fit into a cell of {volume:.1f} A^3"
            if crowd <= MAX_CROWD
            else f"{crowd} atoms fall into one cube of {_CUBE_A:g} A",
            place=cell.place,
            mend="correct the cell, or the symmetry operations",
        )


def _largest_crowd(cell: PeriodicCell) -> int:
    """Atoms in the fullest box of about `_CUBE_A`; pairs are only listed once it is known to be small."""
    if len(cell.labels) <= MAX_CROWD:
        return 0
    boxes = np.maximum(np.linalg.norm(cell.lattice, axis=1) / _CUBE_A, 1.0).astype(int)
    places = np.floor((cell.fractional % 1.0) * boxes).astype(int)
    return int(np.unique(places, axis=0, return_counts=True)[1].max())


@dataclass(frozen=True)
class PeriodicGraph:
    """Bonds of a crystal.

    Attributes
    ----------
    cell : PeriodicCell
    reach : ElementReach
    neighbours : list of dict
        Of each atom: bonded atom and its lattice shift, with the distance [angstrom].
    """

    cell: PeriodicCell
    reach: ElementReach
    neighbours: list[dict[tuple[int, Shift], float]]

    def vector(self, atom: int, neighbour: tuple[int, Shift]) -> FloatArray:
        """From an atom to a neighbour [angstrom]."""
        other, shift = neighbour
        cell = self.cell
        return np.asarray(cell.positions[other] + np.array(shift) @ cell.lattice - cell.positions[atom])

    def metals_at(self, atom: int) -> list[tuple[int, Shift]]:
        """Metals bonded to an atom."""
        return [key for key in self.neighbours[atom] if self.reach.is_metal[key[0]]]


def periodic_graph(cell: PeriodicCell) -> PeriodicGraph:
    """Bond graph of a crystal, by the rules of `bond_graph`.

    Raises
    ------
    InputError
        If atoms overlap.
    """
    reach = ElementReach.of(cell.symbols)
    i, j, distances, shifts = close_pairs(cell.atoms, reach)
    _check_overlap(cell, reach, i, j, distances)
    bonded = reach.bonded(i, j, distances)
    i, j, distances, shifts = i[bonded], j[bonded], distances[bonded], shifts[bonded]
    neighbours: list[dict[tuple[int, Shift], float]] = [{} for _ in cell.labels]
    for a, b, d, shift in zip(i.tolist(), j.tolist(), distances.tolist(), map(tuple, shifts.tolist()), strict=True):
        neighbours[a][b, shift] = d
    far = (reach.ratios(i, j, distances) > 1.0) & (reach.is_metal[i] != reach.is_metal[j])
    if far.any():
        found = zip(i[far].tolist(), j[far].tolist(), map(tuple, shifts[far].tolist()), strict=True)
        contacts = [(a, b, s) for a, b, s in found if _only_contact(a, b, s, neighbours, reach)]
        for a, b, shift in contacts:
            del neighbours[a][b, shift]
    return PeriodicGraph(cell, reach, neighbours)


def close_pairs(atoms: Atoms, reach: ElementReach) -> tuple[IntArray, IntArray, FloatArray, IntArray]:
    """Pairs within bonding reach, both ways, with distances and lattice shifts."""
    from ase.neighborlist import neighbor_list

    radii = np.where(reach.is_bare_ion, _ION_REACH, BOND_FACTOR) * reach.radii_A
    return neighbor_list("ijdS", atoms, radii.tolist())


def _check_overlap(cell: PeriodicCell, reach: ElementReach, i: IntArray, j: IntArray, distances: FloatArray) -> None:
    light = reach.is_hydrogen[i] | reach.is_hydrogen[j]
    allowed = np.where(
        light, OVERLAP_A, np.maximum(OVERLAP_A, OVERLAP_FRACTION * (reach.radii_A[i] + reach.radii_A[j]))
    )
    if not (distances < allowed).any():
        return
    k = int(np.argmin(distances - allowed))
    a, b = (shown(cell.labels[atom], 20) for atom in (i[k], j[k]))
    same = cell.sites[i[k]] == cell.sites[j[k]]
    raise InputError(
        f"symmetry images of {a} overlap at {distances[k]:.3f} A"
        if same
        else f"{a} and {b} overlap at {distances[k]:.3f} A",
        place=cell.place,
        mend="check the coordinates and the symmetry operations"
        if same
        else "disordered or duplicate sites: keep one alternative, or give them disorder groups and occupancies",
    )


def _only_contact(
    a: int, b: int, shift: Shift, neighbours: list[dict[tuple[int, Shift], float]], reach: ElementReach
) -> bool:
    """Whether a metal-donor contact is owed to a closer donor next to it; see `bond_graph`."""
    metal, far, move = (a, b, shift) if reach.is_metal[a] else (b, a, (-shift[0], -shift[1], -shift[2]))
    ratio = neighbours[metal][far, move] / (reach.radii_A[metal] + reach.radii_A[far])
    for c, step in neighbours[far]:
        if reach.is_metal[c]:
            continue
        there = neighbours[metal].get((c, _added(move, step)))
        if there is not None and there / (reach.radii_A[metal] + reach.radii_A[c]) < ratio - SHADOW_MARGIN:
            return True
    return False


def _added(a: Shift, b: Shift) -> Shift:
    return a[0] + b[0], a[1] + b[1], a[2] + b[2]


@dataclass(frozen=True)
class Piece:
    """Atoms that hang together: lattice shift of each, and the number of directions in which the bonds run on."""

    shifts: dict[int, Shift]
    dimension: int

    @cached_property
    def atoms(self) -> list[int]:
        """Atoms in ascending order."""
        return sorted(self.shifts)


def pieces(graph: PeriodicGraph) -> list[Piece]:
    """Connected pieces of a crystal, listed atoms as starting points first."""
    seen: set[int] = set()
    found = []
    order = np.argsort(~graph.cell.listed, kind="stable").tolist()
    for start in order:
        if start not in seen:
            piece = _walk(start, graph.neighbours)
            seen.update(piece.shifts)
            found.append(piece)
    return found


def _walk(start: int, neighbours: list[dict[tuple[int, Shift], float]]) -> Piece:
    """Breadth-first walk; an atom reached at two shifts closes a loop through the lattice."""
    shifts: dict[int, Shift] = {start: (0, 0, 0)}
    loops: set[Shift] = set()
    queue = deque([start])
    while queue:
        atom = queue.popleft()
        here = shifts[atom]
        for other, step in neighbours[atom]:
            there = _added(here, step)
            known = shifts.get(other)
            if known is None:
                shifts[other] = there
                queue.append(other)
            elif known != there:
                loops.add((there[0] - known[0], there[1] - known[1], there[2] - known[2]))
    dimension = int(np.linalg.matrix_rank(np.array(sorted(loops)))) if loops else 0
    return Piece(shifts, dimension)
