"""Hydrogen-saturated clusters out of extended structures."""

from __future__ import annotations

from collections import deque
from functools import partial
from typing import Final

import numpy as np

from ehmo.errors import InputError, LimitError
from ehmo.records.arrays import FloatArray
from ehmo.records.crystal import CrystalContents
from ehmo.records.fragment import Fragment
from ehmo.structure.donors import bond_valence
from ehmo.structure.elements import P_BLOCK_METALS, covalent_radius_A
from ehmo.structure.files import shown
from ehmo.structure.hydrogens import NEUTRON_LENGTHS_A
from ehmo.structure.periodic import PeriodicCell, PeriodicGraph, Shift, periodic_graph

LARGEST_CLUSTER: Final = 600
"""Atoms allowed in a cluster before it is saturated."""

_LARGEST_RADIUS_A: Final = 50.0
_BONDS_OF_OXYGEN: Final = 2  # hydrogens and non-metals at an oxygen, so that no cut makes more than water of it

_UNKNOWN_VALENCE: Final = 1.0

_Key = tuple[int, Shift]


def metal_clusters(contents: CrystalContents, radius_A: float) -> tuple[Fragment, ...]:
    """Cluster round each distinct metal of the chains, layers and frameworks of a crystal.

    A cluster holds the metals within the radius that bonds connect with the central one, all their donors, and the
    whole of each ligand. Bonds that are cut then lead from donors to outer metals. A donor gets as many hydrogens as
    the bond valences of its cut bonds add up to, towards the nearest of these metals: a short oxo bond stays one when
    its long contact to the next metal is cut. An oxygen never gets more than makes water of it.

    Parameters
    ----------
    contents : CrystalContents
        What a file holds.
    radius_A : float
        Distance from the central metal [angstrom].

    Returns
    -------
    clusters : tuple of Fragment
        Central metal first; the charge is left to counting.

    Raises
    ------
    InputError
        If the radius is out of range, or the crystal has no extended part.
    LimitError
        If a cluster is too large.
    """
    if not 0 < radius_A <= _LARGEST_RADIUS_A:
        raise InputError(
            f"a cluster of radius {radius_A:g} Å cannot be cut", mend=f"give a radius up to {_LARGEST_RADIUS_A:g} Å"
        )
    if not contents.networks:
        raise InputError(
            "no chain, layer or framework to cut a cluster from", place=contents.source, mend="leave out --cluster"
        )
    graph = _graph(contents)
    centres = dict.fromkeys(unit.metal_atom for network in contents.networks for unit in network.units)
    return tuple(_cluster(contents, graph, metal, radius_A) for metal in centres)


def _graph(contents: CrystalContents) -> PeriodicGraph:
    from ase import Atoms

    atoms = Atoms(list(contents.symbols), positions=contents.positions_A, cell=contents.cell_A, pbc=True)
    listed = np.ones(len(contents.symbols), dtype=bool)
    return periodic_graph(PeriodicCell(atoms, listed, contents.labels, contents.source, contents.title))


def _cluster(contents: CrystalContents, graph: PeriodicGraph, metal: int, radius_A: float) -> Fragment:
    keys = _members(graph, metal, radius_A)
    symbols = [contents.symbols[atom] for atom, _ in keys]
    positions = [_position(graph, key) for key in keys]
    hydrogens = [place for key in keys for place in _hydrogens(graph, key, set(keys))]
    label = shown(contents.labels[metal], 20)
    note = (
        f"Cluster of radius {radius_A:g} Å round {label}, cut from the crystal: {len(keys)} atoms, and "
        f"{len(hydrogens)} hydrogens by the valence of the bonds that are cut, at neutron lengths."
    )
    return Fragment(
        symbols=(*symbols, *["H"] * len(hydrogens)),
        positions_A=np.array([*positions, *hydrogens]) - positions[0],
        title=contents.title,
        source=f"{contents.source}, cluster round {label}",
        notes=(*contents.notes, note),
    )


def _position(graph: PeriodicGraph, key: _Key) -> FloatArray:
    return np.asarray(graph.cell.positions[key[0]] + np.array(key[1]) @ graph.cell.lattice)


def _members(graph: PeriodicGraph, metal: int, radius_A: float) -> list[_Key]:
    """Atoms of the cluster, the central metal first."""
    centre: _Key = (metal, (0, 0, 0))
    origin = _position(graph, centre)
    is_metal = partial(_is_metal, graph)
    found = {centre: None}
    waiting = deque([centre])
    while waiting:
        key = waiting.popleft()
        for other in _bonded(graph, key):
            if other in found:
                continue
            # A metal brings every donor, a donor its whole ligand; only further metals have to be near.
            if is_metal(other[0]) and np.linalg.norm(_position(graph, other) - origin) > radius_A:
                continue
            found[other] = None
            waiting.append(other)
            if len(found) > LARGEST_CLUSTER:
                raise LimitError(
                    f"a cluster of {radius_A:g} Å has more than {LARGEST_CLUSTER} atoms",
                    place=graph.cell.place,
                    mend="give a smaller radius",
                )
    return list(found)


def _bonded(graph: PeriodicGraph, key: _Key) -> list[_Key]:
    atom, (x, y, z) = key
    return [(other, (x + step[0], y + step[1], z + step[2])) for other, step in graph.neighbours[atom]]


def _is_metal(graph: PeriodicGraph, atom: int) -> bool:
    """Whether bonds to an atom may be cut: metals of the p block too, or their frameworks would have no end."""
    return bool(graph.reach.is_metal[atom]) or graph.cell.symbols[atom] in P_BLOCK_METALS


def _hydrogens(graph: PeriodicGraph, key: _Key, members: set[_Key]) -> list[FloatArray]:
    """Hydrogens of one atom towards the metals that the cut takes away, nearest first."""
    atom = key[0]
    if _is_metal(graph, atom):
        return []
    here = _position(graph, key)
    around = _bonded(graph, key)
    symbol, symbols = graph.cell.symbols[atom], graph.cell.symbols
    cut, valence = [], 0.0
    for other in around:
        if other not in members:
            vector = _position(graph, other) - here
            cut.append(vector)
            known = bond_valence(symbols[other[0]], symbol, float(np.linalg.norm(vector)))
            valence += _UNKNOWN_VALENCE if known is None else known
    cut = sorted(cut, key=np.linalg.norm)[: round(valence)]
    if symbol == "O":
        cut = cut[: max(0, _BONDS_OF_OXYGEN - sum(not _is_metal(graph, other) for other, _ in around))]
    length = NEUTRON_LENGTHS_A.get(symbol) or covalent_radius_A(symbol) + covalent_radius_A("H")
    return [here + length / np.linalg.norm(vector) * vector for vector in cut]
