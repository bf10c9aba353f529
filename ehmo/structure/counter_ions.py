"""Counter-ions of groups 1 and 2 taken into the fragment of a molecule."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.records.crystal import CrystalMolecule
from ehmo.records.crystal_origin import CrystalOrigin
from ehmo.structure.elements import ALKALI
from ehmo.structure.periodic import PeriodicGraph, Piece

_Place = tuple[float, int, tuple[float, float, float]]


def with_counter_ions(
    graph: PeriodicGraph, molecule: CrystalMolecule, ions: Sequence[Sequence[Piece]]
) -> CrystalMolecule:
    """Molecule with its share of the counter-ions of groups 1 and 2, each at its nearest place.

    Parameters
    ----------
    graph : PeriodicGraph
    molecule : CrystalMolecule
    ions : sequence of sequence of Piece
        Bare ions by kind.

    Returns
    -------
    molecule : CrystalMolecule
        The charge, if known, is that of molecule and ions together.
    """
    cell, fragment = graph.cell, molecule.fragment
    pools: dict[str, list[list[_Place]]] = {}
    for kind in ions:
        atoms = [member.atoms[0] for member in kind]
        pools.setdefault(cell.symbols[atoms[0]], []).append(_nearest(graph, fragment.positions_A, atoms))
    taken, places, said = [], [], []
    for symbol, kinds in pools.items():
        share = sum(map(len, kinds)) / molecule.multiplicity
        chosen, rest = [], []
        for near in kinds:
            number = int(len(near) / molecule.multiplicity + 1e-6)
            chosen += near[:number]
            rest += near[number:]
        chosen += sorted(rest)[: max(round(share) - len(chosen), 0)]
        taken += [atom for _, atom, _ in chosen]
        places += [where for _, _, where in chosen]
        off = "" if abs(share - round(share)) < 0.01 else f" (of {share:.3g} for each molecule)"
        said.append(f"{len(chosen)} {symbol}{off}")
    if not taken:
        return molecule
    assert fragment.crystal is not None
    symbols = [cell.symbols[atom] for atom in taken]
    added = sum(1 if symbol in ALKALI else 2 for symbol in symbols)
    n, n_new = len(fragment), len(taken)
    own = np.tile(np.arange(n, n + n_new), (len(fragment.crystal.permutations), 1))
    origin = CrystalOrigin(
        (*fragment.crystal.labels, *(cell.labels[atom] for atom in taken)),
        fragment.crystal.multiplicity,
        np.hstack([fragment.crystal.permutations, own]),
    )
    charge = None if fragment.charge is None else fragment.charge + added
    whole = replace(
        fragment,
        symbols=(*fragment.symbols, *symbols),
        positions_A=np.vstack([fragment.positions_A, places]),
        charge=charge,
        charge_reason=f"{fragment.charge_reason}; with the counter-ions" if charge is not None else "",
        notes=(*fragment.notes, f"Counter-ions in the fragment, with functions of their own: {', '.join(said)}."),
        crystal=origin,
    )
    return replace(molecule, fragment=whole)


def _nearest(graph: PeriodicGraph, molecule: FloatArray, atoms: Sequence[int]) -> list[_Place]:
    """Nearest image of each ion to any atom of the molecule, nearest ion first."""
    cell = graph.cell
    moves = np.array([(x, y, z) for x in range(-2, 3) for y in range(-2, 3) for z in range(-2, 3)])
    base = np.floor(molecule.mean(axis=0) @ np.linalg.inv(cell.lattice))
    found = []
    for atom in atoms:
        home = cell.positions[atom] - np.floor(cell.fractional[atom]) @ cell.lattice
        images = home + (moves + base) @ cell.lattice
        gap = np.linalg.norm(images[:, None] - molecule[None], axis=2).min(axis=1)
        best = int(gap.argmin())
        x, y, z = images[best].tolist()
        found.append((round(float(gap[best]), 4), atom, (x, y, z)))
    return sorted(found)
