"""Metal-donor bonds of the asymmetric unit, each once with its multiplicity."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.records.coordination import DonorKind
from ehmo.records.crystal import MetalDonorUnit
from ehmo.structure.donors import DonorSite, bond_valence, donor_kind
from ehmo.structure.graph import BondGraph
from ehmo.structure.periodic import PeriodicGraph, Piece, Shift

SAME_BOND_A: Final = 0.05
"""Bond vectors that symmetry takes closer than this to one another are equivalent [angstrom]."""

_DEPTH: Final = 4


@dataclass(slots=True)
class _Bond:
    key: tuple[int, Shift]
    vector: FloatArray
    count: int = 1


def metal_donor_units(graph: PeriodicGraph, piece: Piece, copies: int = 1) -> tuple[MetalDonorUnit, ...]:
    """Metal-donor bonds of a molecule or network, one for all equivalent ones, by metal and length.

    Parameters
    ----------
    graph : PeriodicGraph
    piece : Piece
    copies : int
        Pieces that are alike though no symmetry relates them; multiplicities count them all.

    Returns
    -------
    units : tuple of MetalDonorUnit
    """
    cell = graph.cell
    metals: dict[int, int] = {}
    for atom in sorted(piece.atoms, key=lambda a: (not cell.listed[a], a)):
        if graph.reach.is_metal[atom]:
            metals.setdefault(int(cell.sites[atom]), atom)
    found: list[MetalDonorUnit] = []
    for site, metal in sorted(metals.items()):
        number = copies * int((cell.sites == site).sum())
        own = [_unit(graph, metal, bond, number) for bond in _distinct_bonds(graph, metal)]
        found += sorted(own, key=lambda unit: unit.length_A)
    return tuple(found)


def _distinct_bonds(graph: PeriodicGraph, metal: int) -> list[_Bond]:
    """Bonds of one metal, those that the symmetry of its site makes equal counted together."""
    cell = graph.cell
    here = cell.fractional[metal]
    gap = cell.rotations @ here + cell.translations - here
    fixed = np.linalg.norm((gap - np.round(gap)) @ cell.lattice, axis=1) < SAME_BOND_A
    inverse = np.linalg.inv(cell.lattice)
    found: list[_Bond] = []
    for key in graph.neighbours[metal]:
        if graph.reach.is_metal[key[0]]:
            continue
        vector = graph.vector(metal, key)
        site = cell.sites[key[0]]
        twin = None
        for other in found:
            if cell.sites[other.key[0]] == site:
                images = (cell.rotations[fixed] @ (other.vector @ inverse)) @ cell.lattice
                if (np.linalg.norm(images - vector, axis=1) < SAME_BOND_A).any():
                    twin = other
                    break
        if twin is None:
            found.append(_Bond(key, vector))
        else:
            twin.count += 1
    return found


def _unit(graph: PeriodicGraph, metal: int, bond: _Bond, copies: int) -> MetalDonorUnit:
    cell = graph.cell
    donor, shift = bond.key
    length = float(np.linalg.norm(bond.vector))
    return MetalDonorUnit(
        metal=cell.labels[metal],
        donor=cell.labels[donor],
        metal_symbol=cell.symbols[metal],
        donor_symbol=cell.symbols[donor],
        kind=_kind(graph, donor),
        length_A=length,
        bond_valence=bond_valence(cell.symbols[metal], cell.symbols[donor], length),
        n_metals=len(graph.metals_at(donor)),
        per_metal=bond.count,
        multiplicity=copies * bond.count,
        metal_atom=metal,
        donor_atom=donor,
        shift=shift,
    )


def _kind(graph: PeriodicGraph, donor: int) -> DonorKind:
    """Kind of a donor as the metal nearest to it sees it, from the bonds around it."""
    local, places = _ball(graph, donor)
    nearest = min(graph.metals_at(donor), key=lambda key: graph.neighbours[donor][key])
    metal = places[nearest]
    symbols = local.symbols
    valence = bond_valence(symbols[metal], symbols[0], local.distance_A(metal, 0))
    return donor_kind(DonorSite(local, metal, 0, valence))


def _ball(graph: PeriodicGraph, start: int) -> tuple[BondGraph, dict[tuple[int, Shift], int]]:
    """Bond graph of what is within a few bonds of an atom, which comes first."""
    cell = graph.cell
    places: dict[tuple[int, Shift], int] = {(start, (0, 0, 0)): 0}
    depth = {0: 0}
    order = [(start, (0, 0, 0))]
    for atom, shift in order:
        level = depth[places[atom, shift]]
        if level == _DEPTH:
            continue
        for other, step in graph.neighbours[atom]:
            key = (other, (shift[0] + step[0], shift[1] + step[1], shift[2] + step[2]))
            if key not in places:
                places[key] = len(order)
                depth[places[key]] = level + 1
                order.append(key)
    metal = [bool(graph.reach.is_metal[atom]) for atom, _ in order]
    near: list[list[int]] = [[] for _ in order]
    for (atom, shift), k in places.items():
        for other, step in graph.neighbours[atom]:
            there = places.get((other, (shift[0] + step[0], shift[1] + step[1], shift[2] + step[2])))
            if there is not None:
                near[k].append(there)
    where = cell.positions[[atom for atom, _ in order]] + np.array([s for _, s in order]) @ cell.lattice
    local = BondGraph(
        symbols=tuple(cell.symbols[atom] for atom, _ in order),
        positions_A=where,
        metals=tuple(k for k, is_metal in enumerate(metal) if is_metal),
        neighbours=tuple(tuple(sorted(b for b in n if not metal[b])) for n in near),
        metal_neighbours=tuple(() if metal[a] else tuple(sorted(b for b in n if metal[b])) for a, n in enumerate(near)),
        metal_contacts=(),
    )
    return local, places
