"""Symmetry-equivalent pieces of a crystal, and the symmetry that a molecule keeps in it."""

from __future__ import annotations

from collections import Counter, defaultdict
from dataclasses import dataclass
from typing import Final

import numpy as np

from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.fragment import hill_formula
from ehmo.structure.periodic import PeriodicGraph, Piece, pieces

SAME_SHAPE_A: Final = 0.002
"""Molecules whose sorted interatomic distances differ by less are taken for one [angstrom]."""

_MAX_COMPARED_ATOMS: Final = 400
_SAME_ATOM_A: Final = 0.1


@dataclass(frozen=True)
class PieceKind:
    """Symmetry-equivalent pieces, the one with most listed atoms first.

    `like` is the number of pieces of the same sites; in a cell without symmetry it may be less than that of members.
    """

    members: list[Piece]
    like: int

    @property
    def first(self) -> Piece:
        """The one that stands for all."""
        return self.members[0]


def piece_kinds(graph: PeriodicGraph) -> list[PieceKind]:
    """Pieces by the sites they are made of: symmetry takes every copy of a site into one another."""
    cell = graph.cell
    by_sites: dict[tuple[tuple[int, int], ...], list[Piece]] = defaultdict(list)
    for piece in pieces(graph):
        key = tuple(sorted(Counter(cell.sites[piece.atoms].tolist()).items()))
        by_sites[key].append(piece)
    kinds = [
        PieceKind(sorted(found, key=lambda piece: -int(cell.listed[piece.atoms].sum())), len(found))
        for found in by_sites.values()
    ]
    return _merged(graph, kinds) if len(cell.rotations) == 1 else kinds


def _merged(graph: PeriodicGraph, kinds: list[PieceKind]) -> list[PieceKind]:
    """In a cell without symmetry, molecules of one formula and the same distances count as one."""
    found: list[tuple[str, FloatArray | None, PieceKind]] = []
    for kind in kinds:
        piece = kind.first
        formula = hill_formula(tuple(graph.cell.symbols[a] for a in piece.atoms))
        compared = piece.dimension == 0 and graph.reach.is_metal[piece.atoms].any()
        distances = _sorted_distances(graph, piece) if compared else None
        twin = None
        if distances is not None:
            twin = next(
                (
                    other
                    for name, theirs, other in found
                    if name == formula
                    and theirs is not None
                    and np.abs(theirs - distances).max(initial=0) < SAME_SHAPE_A
                ),
                None,
            )
        if twin is None:
            found.append((formula, distances, PieceKind(list(kind.members), kind.like)))
        else:
            twin.members.extend(kind.members)
    return [kind for _, _, kind in found]


def _sorted_distances(graph: PeriodicGraph, piece: Piece) -> FloatArray | None:
    """Distances of a molecule, sorted within each pair of elements."""
    if len(piece.atoms) > _MAX_COMPARED_ATOMS:
        return None
    where = piece_positions(graph, piece)
    symbols = np.array([graph.cell.symbols[a] for a in piece.atoms])
    parts = []
    for one in sorted(set(symbols)):
        for other in sorted(set(symbols)):
            if one <= other:
                gap = where[symbols == one][:, None] - where[symbols == other][None]
                parts.append(np.sort(np.linalg.norm(gap, axis=2).ravel()))
    return np.concatenate(parts)


def piece_positions(graph: PeriodicGraph, piece: Piece) -> FloatArray:
    """Atoms of a piece put together [angstrom]."""
    cell = graph.cell
    moves = np.array([piece.shifts[atom] for atom in piece.atoms])
    return np.asarray(cell.positions[piece.atoms] + moves @ cell.lattice)


def site_permutations(graph: PeriodicGraph, piece: Piece) -> IntArray:
    """Atom permutations of the operations that leave the molecule in place."""
    cell, n = graph.cell, len(piece.atoms)
    inverse = np.linalg.inv(cell.lattice)
    where = piece_positions(graph, piece) @ inverse
    sites = cell.sites[piece.atoms]
    centre = where.mean(axis=0)
    gap = cell.rotations @ centre + cell.translations - centre
    off = np.linalg.norm((gap - np.round(gap)) @ cell.lattice, axis=1)
    found = {tuple(range(n))}
    for k in np.flatnonzero(off < 2 * _SAME_ATOM_A).tolist():
        images = where @ cell.rotations[k].T + cell.translations[k] - np.round(gap[k])
        order = _matched(images @ cell.lattice, where @ cell.lattice, sites)
        if order is not None:
            found.add(order)
    return np.array(sorted(found))


def _matched(
    images: FloatArray,
    where: FloatArray,
    sites: IntArray,
) -> tuple[int, ...] | None:
    """Atom at the place of each image; None where an image falls on none."""
    order = np.full(len(images), -1)
    for site in np.unique(sites):
        own = np.flatnonzero(sites == site)
        distance = np.linalg.norm(images[own][:, None] - where[own][None], axis=2)
        nearest = distance.argmin(axis=1)
        if distance[np.arange(len(own)), nearest].max() > _SAME_ATOM_A:
            return None
        order[own] = own[nearest]
    return tuple(order.tolist()) if len(set(order.tolist())) == len(order) else None
