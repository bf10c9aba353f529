"""Primitive cell of a crystal given in a centred one."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import product

import numpy as np

from ehmo.records.arrays import FloatArray, IntArray

SAME_PLACE_A = 0.01
"""Atoms that a translation takes closer than this to one another are equivalent [angstrom]."""

_MAX_CENTRINGS = 64


@dataclass(frozen=True, slots=True, eq=False)
class PrimitiveCell:
    """Smallest cell of a crystal, and where each atom of the given cell is in it.

    Attributes
    ----------
    cell_A : (3, 3) ndarray
        Rows are the lattice vectors [angstrom].
    kept : (n_primitive,) ndarray of int
        Atoms of the given cell that stand for all.
    place : (n_atoms,) ndarray of int
        Number among the kept atoms of the one that a translation takes to each atom.
    shift : (n_atoms, 3) ndarray of int
        That translation, in primitive vectors.
    """

    cell_A: FloatArray
    kept: IntArray
    place: IntArray
    shift: IntArray

    @property
    def ratio(self) -> int:
        """Primitive cells in the given one."""
        return len(self.place) // len(self.kept)


def primitive_cell(
    symbols: Sequence[str], positions_A: FloatArray, cell_A: FloatArray, sites: IntArray
) -> PrimitiveCell:
    """Primitive cell by the pure translations that take every atom to an equivalent one.

    Parameters
    ----------
    symbols : sequence of str
    positions_A : (n_atoms, 3) ndarray
        [angstrom]
    cell_A : (3, 3) ndarray
        Rows are the lattice vectors [angstrom].
    sites : (n_atoms,) ndarray of int
        Atoms with different numbers are never taken for one another.

    Returns
    -------
    primitive : PrimitiveCell
        The given cell if it is primitive already.
    """
    kinds = [(symbol, int(site)) for symbol, site in zip(symbols, sites, strict=True)]
    fractions = positions_A @ np.linalg.inv(cell_A)
    centrings = _centrings(kinds, fractions, cell_A)
    if not centrings:
        everything = np.arange(len(kinds))
        return PrimitiveCell(cell_A, everything, everything, np.zeros((len(kinds), 3), dtype=np.intp))
    vectors = _shortest_basis(np.array([*centrings, *np.eye(3)]) @ cell_A, abs(np.linalg.det(cell_A)), len(centrings))
    fractions = positions_A @ np.linalg.inv(vectors)
    kept: list[int] = []
    place, shift = np.zeros(len(kinds), dtype=np.intp), np.zeros((len(kinds), 3), dtype=np.intp)
    for atom, kind in enumerate(kinds):
        for number, other in enumerate(kept):
            gap = fractions[atom] - fractions[other]
            whole = np.round(gap)
            if kinds[other] == kind and np.linalg.norm((gap - whole) @ vectors) < SAME_PLACE_A:
                place[atom], shift[atom] = number, whole.astype(np.intp)
                break
        else:
            place[atom] = len(kept)
            kept.append(atom)
    return PrimitiveCell(vectors, np.array(kept), place, shift)


def _centrings(kinds: Sequence[tuple[str, int]], fractions: FloatArray, cell: FloatArray) -> list[FloatArray]:
    """Fractional translations, none of them whole, that take every atom to an equivalent one."""
    counts = Counter(kinds)
    rarest = min(counts, key=lambda kind: (counts[kind], kind))
    members = [atom for atom, kind in enumerate(kinds) if kind == rarest]
    groups = [np.array([a for a, other in enumerate(kinds) if other == kind]) for kind in counts]
    found = []
    for other in members[1 : _MAX_CENTRINGS + 1]:
        translation = (fractions[other] - fractions[members[0]]) % 1.0
        if all(_maps_onto_itself(fractions[group], translation, cell) for group in groups):
            found.append(translation)
    return found


def _maps_onto_itself(fractions: FloatArray, translation: FloatArray, cell: FloatArray) -> bool:
    gaps = fractions[:, None] + translation - fractions
    distances = np.linalg.norm((gaps - np.round(gaps)) @ cell, axis=2)
    return bool((distances.min(axis=1) < SAME_PLACE_A).all())


def _shortest_basis(generators: FloatArray, volume: float, n_centrings: int) -> FloatArray:
    """Right-handed basis of the shortest vectors among the small combinations of some lattice vectors."""
    wanted = volume / (n_centrings + 1)
    combinations = np.array(list(product((-1, 0, 1), repeat=3)))
    shifts = combinations @ generators[-3:]
    candidates = np.concatenate([shifts, *(shifts + vector for vector in generators[:-3])])
    lengths = np.linalg.norm(candidates, axis=1)
    candidates = candidates[np.lexsort((*candidates.T, np.round(lengths, 6)))]
    candidates = candidates[np.linalg.norm(candidates, axis=1) > SAME_PLACE_A]
    first = candidates[0]
    second = next(v for v in candidates if np.linalg.norm(np.cross(first, v)) > SAME_PLACE_A)
    normal = np.cross(first, second)
    third = next(v for v in candidates if abs(abs(normal @ v) - wanted) < 0.01 * wanted)
    return np.array([first, second, third if normal @ third > 0 else -third])
