"""Ligands: the connected pieces of the bond graph without the metals, and their formal charges."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from ehmo.records.coordination import DonorKind, Ligand
from ehmo.records.fragment import hill_formula
from ehmo.structure.elements import ALKALI, ALKALINE_EARTH, covalence
from ehmo.structure.graph import BondGraph
from ehmo.structure.matching import unsatisfied

_FIXED: dict[DonorKind, tuple[int, str]] = {
    DonorKind.PEROXO_END_ON: (-2, "O2 2-"),
    DonorKind.PEROXO_SIDE_ON: (-2, "O2 2-"),
    DonorKind.SUPEROXO: (-1, "O2 -"),
    DonorKind.NITROSYL_LINEAR: (1, "linear nitrosyl counted as NO+"),
    DonorKind.NITROSYL_BENT: (-1, "bent nitrosyl counted as NO-"),
    DonorKind.CARBONYL: (0, "CO"),
}
"""Charges of one- and two-atom ligands whose electrons no valence rule counts (common practice)."""

_HYDROGENS_DOUBTFUL = frozenset({DonorKind.HYDROXO_DOUBTFUL, DonorKind.AQUA_DOUBTFUL, DonorKind.NITROGEN})

_OPEN_SHELL_FREE = frozenset({DonorKind.CARBENE, DonorKind.OTHER})
"""Carbon donors that may hold two open valences as a lone pair: carbenes next to N, O, S and isocyanides."""

Kinds = Mapping[int, DonorKind]


@dataclass(frozen=True, slots=True)
class FormalCharge:
    """Formal charge of a ligand and the reason; None where it cannot be told."""

    charge: int | None
    reason: str


def find_ligands(graph: BondGraph, kinds: Kinds) -> tuple[Ligand, ...]:
    """Ligands, counter-ions and solvent molecules of a bond graph, sorted by first atom.

    Parameters
    ----------
    graph : BondGraph
    kinds : mapping of int to DonorKind
        Kind of each donor atom.

    Returns
    -------
    ligands : tuple of Ligand
    """
    return tuple(_ligand(graph, kinds, piece) for piece in _pieces(graph))


def _pieces(graph: BondGraph) -> list[tuple[int, ...]]:
    seen = set(graph.metals)
    pieces = []
    for start in range(len(graph.symbols)):
        if start in seen:
            continue
        seen.add(start)
        piece = [start]
        for atom in piece:
            fresh = [other for other in graph.neighbours[atom] if other not in seen]
            seen.update(fresh)
            piece += fresh
        pieces.append(tuple(sorted(piece)))
    return pieces


def _ligand(graph: BondGraph, kinds: Kinds, atoms: tuple[int, ...]) -> Ligand:
    formal = formal_charge(graph, kinds, atoms)
    return Ligand(
        atoms=atoms,
        donors=tuple(atom for atom in atoms if graph.metal_neighbours[atom]),
        metals=tuple(sorted({metal for atom in atoms for metal in graph.metal_neighbours[atom]})),
        formula=hill_formula(tuple(graph.symbols[atom] for atom in atoms)),
        charge=formal.charge,
        charge_reason=formal.reason,
    )


def formal_charge(graph: BondGraph, kinds: Kinds, atoms: tuple[int, ...]) -> FormalCharge:
    """Charge of a ligand as a closed shell that keeps both electrons of each bond to a metal."""
    symbol = graph.symbols[atoms[0]]
    if len(atoms) == 1 and symbol in ALKALI | ALKALINE_EARTH:
        return FormalCharge(1 if symbol in ALKALI else 2, "bare counter-ion")
    fixed = _fixed_charge(kinds, atoms)
    if fixed is not None:
        return fixed
    bare = kinds.get(atoms[0]) if len(atoms) == 1 else None
    if bare in _HYDROGENS_DOUBTFUL:
        return FormalCharge(None, f"bare {symbol} at single-bond length: hydrogens may be missing")
    incomplete = [a for a in atoms if _lacks_hydrogen(graph, a)]
    if incomplete:
        label = f"{graph.symbols[incomplete[0]]}{incomplete[0] + 1}"
        return FormalCharge(None, f"hydrogens seem to be missing at {label}")
    macrocycle = _tetrapyrrole_charge(graph, atoms)
    return macrocycle if macrocycle is not None else _closed_shell_charge(graph, kinds, atoms)


def _fixed_charge(kinds: Kinds, atoms: tuple[int, ...]) -> FormalCharge | None:
    found = {kinds[a] for a in atoms if a in kinds} & _FIXED.keys()
    if len(atoms) > 2 or len(found) != 1:
        return None
    charge, reason = _FIXED[found.pop()]
    return FormalCharge(charge, reason)


def _lacks_hydrogen(graph: BondGraph, atom: int) -> bool:
    """Whether a carbon that is no donor is bent with two bonds or pyramidal with three."""
    near = graph.neighbours[atom]
    if graph.symbols[atom] != "C" or graph.metal_neighbours[atom]:
        return False
    if len(near) == 1:
        return graph.symbols[near[0]] not in ("N", "O", "S")
    if len(near) == 2:
        return graph.angle_deg(near[0], atom, near[1]) < 150.0
    if len(near) == 3:
        a, b, c = near
        total = graph.angle_deg(a, atom, b) + graph.angle_deg(b, atom, c) + graph.angle_deg(a, atom, c)
        return total < 345.0
    return False


def _tetrapyrrole_charge(graph: BondGraph, atoms: tuple[int, ...]) -> FormalCharge | None:
    """Porphyrins and phthalocyanines: matching alone would oxidise their conjugated ring to charge 0."""
    pyrrole = [a for a in atoms if graph.symbols[a] == "N" and graph.metal_neighbours[a] and _in_pyrrole(graph, a)]
    if len(pyrrole) != 4 or len({graph.metal_neighbours[a] for a in pyrrole}) != 1:
        return None
    alpha = {c for n in pyrrole for c in graph.neighbours[n]}
    bridges = {m for c in alpha for m in graph.neighbours[c] if m not in pyrrole and m not in alpha}
    meso = [m for m in bridges if len(alpha.intersection(graph.neighbours[m])) == 2]
    direct = sum(1 for c in alpha for d in graph.neighbours[c] if c < d and d in alpha)
    if len(alpha) != 8 or len(meso) + direct != 4:
        return None
    return FormalCharge(-2 - direct, "corrole-type macrocycle" if direct else "porphyrin-type macrocycle")


def _in_pyrrole(graph: BondGraph, nitrogen: int) -> bool:
    """Whether the N closes a five-membered ring with four carbons."""
    near = [k for k in graph.neighbours[nitrogen] if graph.symbols[k] == "C"]
    if len(near) != 2:
        return False
    left, right = ({k for k in graph.neighbours[c] if graph.symbols[k] == "C"} for c in near)
    return any(k in graph.neighbours[m] for k in left for m in right)


def _closed_shell_charge(graph: BondGraph, kinds: Kinds, atoms: tuple[int, ...]) -> FormalCharge:
    """Valences less bonds; neighbours with open valences pair up, what stays open becomes negative charge."""
    charge = 0
    deficits: dict[int, int] = {}
    for atom in atoms:
        bonds = len(graph.neighbours[atom])
        valence = covalence(graph.symbols[atom], bonds)
        if valence is None:
            return FormalCharge(None, f"no valence rule for {graph.symbols[atom]}")
        onium = _onium(graph, atom)
        charge += onium
        deficits[atom] = max(valence + onium - bonds, 0)
        if bonds > valence + onium:
            positive = graph.symbols[atom] in ("N", "O", "S", "C")
            charge += (bonds - valence - onium) * (1 if positive else -1)
    open_valences = unsatisfied(deficits, {atom: graph.neighbours[atom] for atom in atoms})
    for atom in list(open_valences):
        if open_valences[atom] == 2 and _lone_pair_carbon(graph, kinds, atom):
            del open_valences[atom]
    return FormalCharge(charge - sum(open_valences.values()), "closed shell")


def _onium(graph: BondGraph, atom: int) -> int:
    """1 for nitrogen that must carry a positive charge: nitrate, nitro, N-oxide, the middle of an azide."""
    if graph.symbols[atom] != "N":
        return 0
    near = graph.neighbours[atom]
    bare_oxygen = sum(graph.symbols[k] == "O" and len(graph.neighbours[k]) == 1 for k in near)
    azide = (
        len(near) == 2 and all(graph.symbols[k] == "N" for k in near) and graph.angle_deg(near[0], atom, near[1]) > 160
    )
    return int((len(near) == 3 and bare_oxygen >= 1) or azide)


def _lone_pair_carbon(graph: BondGraph, kinds: Kinds, atom: int) -> bool:
    hetero = any(graph.symbols[k] in ("N", "O", "S", "P") for k in graph.neighbours[atom])
    return graph.symbols[atom] == "C" and hetero and kinds.get(atom) in _OPEN_SHELL_FREE
