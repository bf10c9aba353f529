"""Hydrogens of a whole crystal cell or of one fragment: what is missing, placing, lengthening."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator, Mapping
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.records.crystal_origin import CrystalOrigin
from ehmo.records.fragment import Fragment
from ehmo.structure.cif_sites import listed
from ehmo.structure.donors import bond_valence
from ehmo.structure.elements import P_BLOCK_METALS
from ehmo.structure.files import shown
from ehmo.structure.graph import BondGraph, bond_graph
from ehmo.structure.hydrogens import (
    NEUTRON_LENGTHS_A,
    PLACED_LENGTH_A,
    Missing,
    Surroundings,
    hydrogen_vectors,
    missing_hydrogens,
)
from ehmo.structure.periodic import PeriodicCell, PeriodicGraph

if TYPE_CHECKING:
    from ase import Atoms

AROUND_A = 4.0
"""Atoms up to here steer the hydrogens of a water molecule or an ammine [angstrom]."""

X_RAY_SHORTFALL_A = 0.06
"""Mean X-H lengths that fall short of neutron ones by more are those of X-ray refinements [angstrom]."""

COLLISION_A = 1.45
"""The shortest hydrogen bonds between unlike atoms have H...O near 1.5 A (common practice) [angstrom]."""


def cell_missing(graph: PeriodicGraph) -> dict[int, Missing]:
    """Hydrogens that each atom of a cell lacks, by atom; one atom of a site stands for all."""
    has_hydrogen = _formula_has_hydrogen(graph.cell)
    found = _missing(graph, has_hydrogen)
    if has_hydrogen is False and any(lack.group == "water" for lack in found.values()):
        # Then the formula just leaves hydrogen out, as those of minerals and of incomplete refinements do.
        found = _missing(graph, None)
    return found


def _formula_has_hydrogen(cell: PeriodicCell) -> bool | None:
    return "H" in cell.facts.formula if cell.facts.formula else None


def _missing(graph: PeriodicGraph, has_hydrogen: bool | None) -> dict[int, Missing]:
    cell = graph.cell
    by_site: dict[int, Missing | None] = {}
    found: dict[int, Missing] = {}
    for atom, site in enumerate(cell.sites.tolist()):
        if cell.symbols[atom] not in ("O", "N", "C"):
            continue
        if site not in by_site:
            by_site[site] = missing_hydrogens(_in_cell(graph, atom, has_hydrogen))
        known = by_site[site]
        if known is not None:
            found[atom] = known
    return found


def _in_cell(graph: PeriodicGraph, atom: int, has_hydrogen: bool | None) -> Surroundings:
    cell = graph.cell
    keys = list(graph.neighbours[atom])
    metals = [bool(graph.reach.is_metal[key[0]]) or cell.symbols[key[0]] in P_BLOCK_METALS for key in keys]
    valences = [
        bond_valence(cell.symbols[key[0]], cell.symbols[atom], graph.neighbours[atom][key])
        for key, metal in zip(keys, metals, strict=True)
        if metal
    ]
    return Surroundings(
        symbol=cell.symbols[atom],
        label=cell.labels[atom],
        neighbours=tuple(cell.symbols[key[0]] for key in keys),
        vectors=np.array([graph.vector(atom, key) for key in keys]).reshape(-1, 3),
        metal=tuple(metals),
        valence=_total(valences),
        attached=cell.attached.get(int(cell.sites[atom])),
        formula_has_hydrogen=has_hydrogen,
    )


def _total(valences: list[float | None]) -> float | None:
    return None if None in valences else sum(v for v in valences if v is not None)


def missing_sentences(cell: PeriodicCell, missing: Mapping[int, Missing]) -> tuple[str, ...]:
    """One sentence for each kind of group that lacks hydrogens."""
    groups: dict[str, dict[str, str]] = defaultdict(dict)
    for atom, lack in missing.items():
        groups[lack.group].setdefault(cell.labels[atom], lack.reason)
    said = []
    for group, members in groups.items():
        few = [f"{shown(label, 12)} ({reason})" if reason else shown(label, 12) for label, reason in members.items()]
        more = f" and {len(few) - 4} more" if len(few) > 4 else ""
        said.append(f"Hydrogens of {group} are missing: {', '.join(few[:4])}{more}.")
    return tuple(said)


def cell_with_hydrogens(graph: PeriodicGraph, missing: Mapping[int, Missing]) -> PeriodicCell:
    """Cell with the missing hydrogens at standard neutron lengths; images of a site get images of its hydrogens."""
    cell = graph.cell
    if not missing:
        return cell
    inverse = np.linalg.inv(cell.lattice)
    first: dict[int, int] = {}
    for atom in sorted(missing, key=lambda a: (not cell.listed[a], a)):
        first.setdefault(int(cell.sites[atom]), atom)
    model: dict[int, FloatArray] = {}
    crowded: list[str] = []
    for (site, atom), (around, symbols) in zip(first.items(), _around(cell, list(first.values())), strict=True):
        vectors = hydrogen_vectors(_in_cell(graph, atom, None), missing[atom].count, around, symbols)
        if _collides(vectors, around, symbols):
            crowded.append(cell.labels[atom])
        else:
            model[site] = vectors @ inverse
    positions, owners, number = [], [], []
    for atom in sorted(missing):
        site = int(cell.sites[atom])
        if site not in model:
            continue
        turn = cell.rotations[cell.copies[atom]] @ np.linalg.inv(cell.rotations[cell.copies[first[site]]])
        for k, vector in enumerate(model[site]):
            positions.append(cell.positions[atom] + (turn @ vector) @ cell.lattice)
            owners.append(atom)
            number.append((site, k))
    new_site = {pair: int(cell.sites.max()) + 1 + n for n, pair in enumerate(dict.fromkeys(number))}
    own = np.array(owners, dtype=int)
    notes = [f"{len(own)} hydrogens of the cell were placed at standard lengths: their directions are a guess."]
    if crowded:
        notes.append(f"Hydrogens were not placed for want of room: {listed(crowded)}.")
    if not owners:
        return replace(cell, notes=(*cell.notes, *notes[1:]))
    return replace(
        cell,
        atoms=cell.atoms + _hydrogen_atoms(positions),
        listed=np.append(cell.listed, cell.listed[own]),
        labels=(*cell.labels, *(f"H on {cell.labels[a]}" for a in owners)),
        notes=(*cell.notes, *notes),
        sites=np.append(cell.sites, [new_site[pair] for pair in number]),
        weights=np.append(cell.weights, cell.weights[own]),
        copies=np.append(cell.copies, cell.copies[own]),
        occupancies=np.append(cell.occupancies, cell.occupancies[own]),
        attached={},
    )


def _collides(vectors: FloatArray, around: FloatArray, symbols: list[str]) -> bool:
    """Whether a placed hydrogen comes closer to another atom than any hydrogen bond."""
    heavy = around[[symbol != "H" for symbol in symbols]]
    return bool(len(heavy)) and float(np.linalg.norm(vectors[:, None] - heavy[None], axis=2).min()) < COLLISION_A


def _hydrogen_atoms(positions: list[FloatArray]) -> Atoms:
    from ase import Atoms

    return Atoms(["H"] * len(positions), positions=positions)


def _around(cell: PeriodicCell, atoms: list[int]) -> Iterator[tuple[FloatArray, list[str]]]:
    """Vectors to every atom near each of some, and their elements."""
    from ase.neighborlist import neighbor_list

    radii = np.zeros(len(cell.labels))
    radii[atoms] = AROUND_A
    i, j, vectors = neighbor_list("ijD", cell.atoms, radii.tolist())
    order = np.argsort(i, kind="stable")
    starts = np.searchsorted(i[order], np.arange(len(radii) + 1))
    for atom in atoms:
        own = order[starts[atom] : starts[atom + 1]]
        near = np.linalg.norm(vectors[own], axis=1) < AROUND_A
        yield vectors[own][near], [cell.symbols[k] for k in j[own][near].tolist()]


def cell_with_longer_bonds(cell: PeriodicCell, graph: PeriodicGraph) -> PeriodicCell:
    """Cell whose X-H bonds have standard neutron lengths, directions kept."""
    positions = cell.positions.copy()
    moved: dict[str, list[float]] = defaultdict(list)
    for atom, holder, vector in _held_hydrogens(graph):
        length = float(np.linalg.norm(vector))
        if abs(length - NEUTRON_LENGTHS_A[holder]) > PLACED_LENGTH_A:
            positions[atom] += vector * (1.0 - NEUTRON_LENGTHS_A[holder] / length)
            moved[holder].append(length)
    if not moved:
        return cell
    atoms = cell.atoms.copy()
    atoms.positions = positions
    return replace(cell, atoms=atoms, notes=(*cell.notes, _lengthened_note(moved)))


def _held_hydrogens(graph: PeriodicGraph) -> Iterator[tuple[int, str, FloatArray]]:
    """Hydrogens on one atom whose X-H length is known: the hydrogen, that element, the vector to it."""
    symbols = graph.cell.symbols
    for atom, symbol in enumerate(symbols):
        near = list(graph.neighbours[atom]) if symbol == "H" else []
        if len(near) == 1 and symbols[near[0][0]] in NEUTRON_LENGTHS_A:
            yield atom, symbols[near[0][0]], graph.vector(atom, near[0])


def short_bonds_notes(graph: PeriodicGraph) -> tuple[str, ...]:
    """Sentence on X-H lengths that are those of X-ray refinements."""
    lengths: dict[str, list[float]] = defaultdict(list)
    for _, holder, vector in _held_hydrogens(graph):
        lengths[holder].append(float(np.linalg.norm(vector)))
    short = [
        f"{holder}-H {np.mean(found):.2f} A"
        for holder, found in sorted(lengths.items())
        if np.mean(found) < NEUTRON_LENGTHS_A[holder] - X_RAY_SHORTFALL_A
    ]
    return (f"X-ray lengths to hydrogen, on the average {', '.join(short)}.",) if short else ()


def _lengthened_note(moved: Mapping[str, list[float]]) -> str:
    parts = [
        f"{holder}-H {np.mean(lengths):.2f} to {NEUTRON_LENGTHS_A[holder]:g} A ({len(lengths)})"
        for holder, lengths in sorted(moved.items())
    ]
    return f"Bonds to hydrogen were set to neutron lengths: {', '.join(parts)}."


def with_hydrogens(fragment: Fragment) -> Fragment:
    """Fragment with missing hydrogens placed, as far as they are recognised without a crystal around it."""
    graph = bond_graph(fragment)
    new: list[FloatArray] = []
    owners: list[int] = []
    for atom in range(len(fragment)):
        surroundings = _in_fragment(graph, atom, fragment.labels[atom])
        lack = missing_hydrogens(surroundings) if surroundings.symbol in ("O", "N", "C") else None
        if lack is not None:
            gap = fragment.positions_A - fragment.positions_A[atom]
            distance = np.linalg.norm(gap, axis=1)
            near = np.flatnonzero((distance < AROUND_A) & (distance > 1e-3))
            vectors = hydrogen_vectors(surroundings, lack.count, gap[near], [fragment.symbols[k] for k in near])
            new += list(fragment.positions_A[atom] + vectors)
            owners += [atom] * lack.count
    if not new:
        return fragment
    labels = ", ".join(dict.fromkeys(fragment.labels[k] for k in owners))
    note = f"{len(new)} hydrogens were placed at standard lengths, on {labels}: their directions are a guess."
    return replace(
        fragment,
        symbols=(*fragment.symbols, *("H" for _ in new)),
        positions_A=np.vstack([fragment.positions_A, new]),
        notes=(*fragment.notes, note),
        crystal=None if fragment.crystal is None else _extended(fragment.crystal, len(new)),
    )


def _extended(origin: CrystalOrigin, n_new: int) -> CrystalOrigin:
    """Origin with placed hydrogens, which stand for themselves."""
    n = len(origin.labels)
    own = np.tile(np.arange(n, n + n_new), (len(origin.permutations), 1))
    return CrystalOrigin(
        (*origin.labels, *("placed" for _ in range(n_new))),
        origin.multiplicity,
        np.hstack([origin.permutations, own]),
    )


def _in_fragment(graph: BondGraph, atom: int, label: str) -> Surroundings:
    near, metals = graph.neighbours[atom], graph.metal_neighbours[atom]
    both = (*near, *metals)
    valences = [bond_valence(graph.symbols[m], graph.symbols[atom], graph.distance_A(m, atom)) for m in metals]
    return Surroundings(
        symbol=graph.symbols[atom],
        label=label,
        neighbours=tuple(graph.symbols[k] for k in both),
        vectors=(graph.positions_A[list(both)] - graph.positions_A[atom]).reshape(-1, 3),
        metal=tuple(k in metals for k in both),
        valence=_total(valences),
    )


def with_longer_bonds(fragment: Fragment) -> Fragment:
    """Fragment whose X-H bonds have standard neutron lengths, directions kept."""
    graph = bond_graph(fragment)
    positions = np.array(fragment.positions_A)
    moved: dict[str, list[float]] = defaultdict(list)
    for atom, symbol in enumerate(fragment.symbols):
        near = graph.neighbours[atom]
        if symbol != "H" or len(near) != 1 or fragment.symbols[near[0]] not in NEUTRON_LENGTHS_A:
            continue
        holder = fragment.symbols[near[0]]
        vector = positions[atom] - positions[near[0]]
        length = float(np.linalg.norm(vector))
        if abs(length - NEUTRON_LENGTHS_A[holder]) > PLACED_LENGTH_A:
            positions[atom] = positions[near[0]] + vector * NEUTRON_LENGTHS_A[holder] / length
            moved[holder].append(length)
    if not moved:
        return fragment
    return replace(fragment, positions_A=positions, notes=(*fragment.notes, _lengthened_note(moved)))
