"""What a crystal cell holds: its pieces sorted into molecules, networks, counter-ions and solvent."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import replace
from typing import Literal

import numpy as np

from ehmo.errors import InputError
from ehmo.records.crystal import CrystalContents, CrystalMolecule, CrystalNetwork, CrystalSpecies
from ehmo.records.crystal_origin import CrystalOrigin
from ehmo.records.fragment import Fragment, hill_formula
from ehmo.structure.balance import Balance, CrystalUnit, balance_charges
from ehmo.structure.cell_hydrogens import (
    cell_missing,
    cell_with_hydrogens,
    cell_with_longer_bonds,
    missing_sentences,
    short_bonds_notes,
)
from ehmo.structure.cell_kinds import PieceKind, piece_kinds, piece_positions, site_permutations
from ehmo.structure.cell_units import metal_donor_units
from ehmo.structure.counter_ions import with_counter_ions
from ehmo.structure.disorder import mixed_sentence
from ehmo.structure.files import shown
from ehmo.structure.formula_check import formula_notes
from ehmo.structure.graph import BondGraph
from ehmo.structure.hydrogens import Missing
from ehmo.structure.periodic import PeriodicCell, PeriodicGraph, Piece, check_cell, periodic_graph
from ehmo.structure.species import Identity, identify, shown_ion, species_in_words

Hydrogens = Literal["file", "place", "lengthen"]
Cations = Literal["none", "basis"]


def contents_of_cell(
    cell: PeriodicCell, *, hydrogens: Hydrogens = "file", cations: Cations = "none"
) -> CrystalContents:
    """Sort the atoms of a cell into molecules, networks and species without metals.

    Parameters
    ----------
    cell : PeriodicCell
    hydrogens : {"file", "place", "lengthen"}
        As in the file, with missing ones placed, or with X-H bonds at neutron lengths.
    cations : {"none", "basis"}
        Whether group 1 and 2 counter-ions join the fragments of molecules.

    Returns
    -------
    contents : CrystalContents

    Raises
    ------
    InputError
        If cell or coordinates are impossible, atoms overlap, or there is no metal.
    """
    check_cell(cell)
    graph = periodic_graph(cell)
    if not graph.reach.is_metal.any():
        raise InputError("no metal", place=cell.place, mend="give a compound of a metal")
    if hydrogens == "lengthen":
        cell = cell_with_longer_bonds(cell, graph)
        graph = periodic_graph(cell)
    missing = cell_missing(graph)
    if hydrogens == "place":
        cell = cell_with_hydrogens(graph, missing)
        graph = periodic_graph(cell)
        missing = cell_missing(graph)
    kinds = piece_kinds(graph)
    metallic = [kind for kind in kinds if graph.reach.is_metal[kind.first.atoms].any()]
    rest = [kind for kind in kinds if not graph.reach.is_metal[kind.first.atoms].any()]
    identities = [_identity(graph, kind, missing) for kind in rest]
    units = [_unit(graph, kind, missing) for kind in metallic]
    species = _species(cell, rest, identities)
    balances = balance_charges(units, species, cell.facts)
    short = short_bonds_notes(graph) if hydrogens != "lengthen" else ()
    notes = (*cell.notes, *formula_notes(cell), *short)
    general = tuple(note for note in notes if note != mixed_sentence(cell.mixed.values()))
    sentences = missing_sentences(cell, missing)
    molecules, networks = [], []
    for kind, unit, balance in zip(metallic, units, balances, strict=True):
        if kind.first.dimension == 0:
            molecule = _molecule(graph, kind, unit, balance, general, missing, len(metallic) > 1)
            if cations == "basis":
                ions = [k for k in rest if len(k.first.shifts) == 1 and graph.reach.is_bare_ion[k.first.atoms[0]]]
                molecule = with_counter_ions(graph, molecule, [k.members for k in ions])
            elif species:
                molecule = _with_note(molecule, _surroundings_note(species, len(kind.members)))
            molecules.append(molecule)
        else:
            networks.append(_network(graph, kind, balance))
    return CrystalContents(
        source=cell.place,
        title=cell.title,
        cell_A=cell.lattice,
        symbols=cell.symbols,
        positions_A=cell.positions,
        labels=cell.labels,
        sites=cell.sites,
        molecules=tuple(molecules),
        networks=tuple(networks),
        species=tuple(species),
        missing_hydrogens=sentences,
        notes=notes,
    )


def _bond_graph(graph: PeriodicGraph, piece: Piece) -> BondGraph:
    """Bonds of a molecule without metals, as the analysis of ligands takes them."""
    place = {atom: k for k, atom in enumerate(piece.atoms)}
    near = tuple(tuple(sorted({place[key[0]] for key in graph.neighbours[atom]})) for atom in piece.atoms)
    none: tuple[int, ...] = ()
    symbols = tuple(graph.cell.symbols[atom] for atom in piece.atoms)
    return BondGraph(symbols, piece_positions(graph, piece), (), near, tuple(none for _ in symbols), ())


def _identity(graph: PeriodicGraph, kind: PieceKind, missing: dict[int, Missing]) -> Identity:
    lacking = sum(missing[atom].count for atom in kind.first.atoms if atom in missing)
    if kind.first.dimension:
        formula = hill_formula(tuple(graph.cell.symbols[a] for a in kind.first.atoms))
        return Identity(formula, "", None, lacking)
    return identify(_bond_graph(graph, kind.first), lacking)


def _species(cell: PeriodicCell, kinds: Sequence[PieceKind], identities: Sequence[Identity]) -> list[CrystalSpecies]:
    """Species without metals by formula, with those that the ordered model leaves out."""
    counts: dict[tuple[Identity, bool, int], float] = defaultdict(float)
    for kind, identity in zip(kinds, identities, strict=True):
        counts[identity, True, kind.first.dimension] += sum(_presence(cell, piece) for piece in kind.members)
    for site in cell.facts.left_out:
        if site.lone_ion:
            counts[identify(_lone(site.symbol), 0), False, 0] += site.count
    return [
        CrystalSpecies(i.formula, i.name, i.charge, count, i.missing_hydrogens if inside else 0, inside, dimension)
        for (i, inside, dimension), count in counts.items()
    ]


def _lone(symbol: str) -> BondGraph:
    return BondGraph((symbol,), np.zeros((1, 3)), (), ((),), ((),), ())


def _presence(cell: PeriodicCell, piece: Piece) -> float:
    """Share of cells in which a piece is there: that of its most present atom."""
    heavy = [atom for atom in piece.atoms if cell.symbols[atom] != "H"] or piece.atoms
    return float(cell.weights[heavy].max())


def _unit(graph: PeriodicGraph, kind: PieceKind, missing: dict[int, Missing]) -> CrystalUnit:
    cell, piece = graph.cell, kind.first
    numbers = [cell.oxidation.get(int(cell.sites[atom])) for atom in piece.atoms]
    total = None if None in numbers else sum(n for n in numbers if n is not None)
    symbols = tuple(cell.symbols[atom] for atom in piece.atoms)
    fragment = None if piece.dimension else Fragment(symbols, piece_positions(graph, piece), source=cell.place)
    return CrystalUnit(
        formula=hill_formula(symbols),
        count=sum(_presence(cell, member) for member in kind.members),
        incomplete=any(atom in missing for atom in piece.atoms),
        mixed=any(int(site) in cell.mixed for site in cell.sites[piece.atoms]),
        labelled_charge=None if total is None or abs(total - round(total)) > 0.05 else round(total),
        fragment=fragment,
    )


def _molecule(
    graph: PeriodicGraph,
    kind: PieceKind,
    unit: CrystalUnit,
    balance: Balance,
    notes: tuple[str, ...],
    missing: dict[int, Missing],
    several: bool,
) -> CrystalMolecule:
    cell, piece = graph.cell, kind.first
    made = int((~cell.listed[piece.atoms]).sum())
    first = next(atom for atom in piece.atoms if graph.reach.is_metal[atom])
    label = shown(cell.labels[first], 20)
    said = list(notes)
    if made:
        said.append(
            f"Symmetry makes {made} of the {len(piece.atoms)} atoms; the cell holds {len(kind.members)} such"
            f" molecule{'s' * (len(kind.members) > 1)}."
        )
    elif any(any(shift) for shift in piece.shifts.values()):
        said.append("Atoms were moved by lattice translations to put the molecule together.")
    said += _label_note(graph, piece)
    origin = CrystalOrigin(
        tuple(cell.labels[atom] for atom in piece.atoms), len(kind.members), site_permutations(graph, piece)
    )
    assert unit.fragment is not None
    fragment = replace(
        unit.fragment,
        charge=balance.charge,
        charge_reason=balance.reason,
        title=cell.title,
        source=f"{cell.place}, molecule of {label}" if several else cell.place,
        notes=(*said, *balance.notes),
        doubts=(*_doubts(cell, piece, missing), *balance.doubts),
        crystal=origin,
    )
    return CrystalMolecule(
        fragment=fragment,
        name=shown_ion(fragment.formula, balance.charge),
        multiplicity=len(kind.members),
        units=metal_donor_units(graph, piece, len(kind.members) // kind.like),
    )


def _doubts(cell: PeriodicCell, piece: Piece, missing: dict[int, Missing]) -> list[str]:
    """Sentences on mixed sites and missing hydrogens of the molecule itself."""
    sites = dict.fromkeys(cell.sites[piece.atoms].tolist())
    mixed = [cell.mixed[site] for site in sites if site in cell.mixed]
    own = {atom: missing[atom] for atom in piece.atoms if atom in missing}
    return [mixed_sentence(mixed)] * bool(mixed) + list(missing_sentences(cell, own))


def _with_note(molecule: CrystalMolecule, note: str) -> CrystalMolecule:
    fragment = molecule.fragment
    return replace(molecule, fragment=replace(fragment, notes=(*fragment.notes, note)))


def _surroundings_note(species: Sequence[CrystalSpecies], copies: int) -> str:
    few = species_in_words(species, copies)
    return f"Left out of the fragment, for each molecule: {few}."


def _label_note(graph: PeriodicGraph, piece: Piece) -> list[str]:
    """Names in the file of the metals and their donors, where they are not those of the report."""
    cell = graph.cell
    place = {atom: k for k, atom in enumerate(piece.atoms)}
    metals = [atom for atom in piece.atoms if graph.reach.is_metal[atom]]
    wanted = dict.fromkeys(metals)
    wanted.update(dict.fromkeys(key[0] for metal in metals for key in graph.neighbours[metal]))
    one_of_site = {int(cell.sites[a]): a for a in sorted(wanted, reverse=True)}
    pairs = [(f"{cell.symbols[a]}{place[a] + 1}", shown(cell.labels[a], 12)) for a in sorted(one_of_site.values())]
    pairs = [(ours, theirs) for ours, theirs in pairs if ours != theirs]
    if not pairs:
        return []
    few = ", ".join(f"{ours} is {theirs}" for ours, theirs in pairs[:16])
    return [f"Labels in the file: {few}{f' and {len(pairs) - 16} more' if len(pairs) > 16 else ''}."]


def _network(graph: PeriodicGraph, kind: PieceKind, balance: Balance) -> CrystalNetwork:
    cell, piece = graph.cell, kind.first
    return CrystalNetwork(
        symbols=tuple(cell.symbols[atom] for atom in piece.atoms),
        positions_A=piece_positions(graph, piece),
        cell_A=cell.lattice,
        labels=tuple(cell.labels[atom] for atom in piece.atoms),
        atoms=np.array(piece.atoms),
        dimension=piece.dimension,
        multiplicity=len(kind.members),
        units=metal_donor_units(graph, piece, len(kind.members) // kind.like),
        charge=balance.charge,
        charge_reason=balance.reason,
    )
