"""Fragment to coordination: metals, bonds, donor kinds, ligands and local frames."""

from __future__ import annotations

import numpy as np

from ehmo.errors import InputError
from ehmo.records.coordination import Coordination, DonorKind, MetalDonorBond
from ehmo.records.fragment import Fragment
from ehmo.structure.donors import DonorSite, bond_valence, donor_kind
from ehmo.structure.frames import local_frame
from ehmo.structure.graph import BOND_FACTOR, BondGraph, bond_graph
from ehmo.structure.ligands import find_ligands

DOUBTFUL_KINDS = frozenset({DonorKind.HYDROXO_DOUBTFUL, DonorKind.AQUA_DOUBTFUL})
"""Kinds that guess at missing hydrogens."""


def perceive(fragment: Fragment) -> Coordination:
    """Metals, metal-donor bonds, ligands and local frames of a fragment.

    Parameters
    ----------
    fragment : Fragment

    Returns
    -------
    coordination : Coordination

    Raises
    ------
    InputError
        If atoms overlap, or there is no metal, or no donor within reach of any metal.
    """
    graph = bond_graph(fragment)
    place = fragment.source or "fragment"
    if not graph.metals:
        raise InputError("no metal", place=place, mend="give a compound of a metal")
    if not any(graph.metal_neighbours):
        raise InputError(
            _nearest_atom(fragment, graph),
            place=place,
            mend="check that coordinates are in angstrom and the ligands are present",
        )
    sites = [_site(graph, metal, atom) for metal in graph.metals for atom in graph.donors_of(metal)]
    kinds = _kinds(sites)
    ligands = find_ligands(graph, kinds)
    ligand_of = {atom: index for index, ligand in enumerate(ligands) for atom in ligand.atoms}
    bonds = tuple(
        MetalDonorBond(
            metal=site.metal,
            donor=site.atom,
            kind=kinds[site.atom],
            length_A=graph.distance_A(site.metal, site.atom),
            bond_valence=site.valence,
            ligand=ligand_of[site.atom],
        )
        for site in sites
    )
    bonds = tuple(sorted(bonds, key=lambda bond: (bond.metal, round(bond.length_A, 3), bond.donor)))
    frames = tuple(
        local_frame(fragment, metal, tuple(bond for bond in bonds if bond.metal == metal)) for metal in graph.metals
    )
    return Coordination(graph.metals, bonds, ligands, frames, _warnings(fragment, graph, bonds))


def _site(graph: BondGraph, metal: int, atom: int) -> DonorSite:
    valence = bond_valence(graph.symbols[metal], graph.symbols[atom], graph.distance_A(metal, atom))
    return DonorSite(graph, metal, atom, valence)


def _kinds(sites: list[DonorSite]) -> dict[int, DonorKind]:
    """Kind of each donor as the metal nearest to it sees it."""
    nearest: dict[int, DonorSite] = {}
    for site in sites:
        known = nearest.get(site.atom)
        if known is None or site.graph.distance_A(site.metal, site.atom) < known.graph.distance_A(
            known.metal, known.atom
        ):
            nearest[site.atom] = site
    return {atom: donor_kind(site) for atom, site in nearest.items()}


def _nearest_atom(fragment: Fragment, graph: BondGraph) -> str:
    metal = graph.metals[0]
    label = fragment.labels[metal]
    others = [k for k in range(len(fragment)) if k not in graph.metals]
    if not others:
        return f"no donor within reach of {label}: there are no other atoms"
    distances = np.linalg.norm(fragment.positions_A[others] - fragment.positions_A[metal], axis=1)
    k = int(distances.argmin())
    return (
        f"no donor within reach of {label}: the nearest atom, {fragment.labels[others[k]]}, is"
        f" {distances[k]:.2f} A away, beyond {BOND_FACTOR} times the covalent radii"
    )


def _warnings(fragment: Fragment, graph: BondGraph, bonds: tuple[MetalDonorBond, ...]) -> tuple[str, ...]:
    labels = fragment.labels
    found = [
        f"{labels[bond.donor]} is shown as {bond.kind.value} ({labels[bond.metal]}-{labels[bond.donor]}"
        f" {bond.length_A:.3f} A, bond valence {bond.bond_valence:.2f}): hydrogens may be missing."
        for bond in bonds
        if bond.kind in DOUBTFUL_KINDS
    ]
    found += [
        f"{labels[bond.donor]} is a bare N at single-bond length: hydrogens may be missing."
        for bond in bonds
        if bond.kind is DonorKind.NITROGEN and not graph.neighbours[bond.donor]
    ]
    found += [
        f"{labels[a]}-{labels[b]} at {graph.distance_A(a, b):.2f} A is within metal-metal bonding distance;"
        " it is not counted as a bond."
        for a, b in graph.metal_contacts
    ]
    lonely = [labels[m] for m in graph.metals if not graph.donors_of(m)]
    if lonely:
        found.append(f"No donor within reach of {', '.join(lonely)}.")
    return tuple(found)
