"""One ordered alternative out of disordered and partly occupied sites."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Final

import numpy as np

from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.structure.cif_sites import Site, listed
from ehmo.structure.elements import COUNTER_IONS, TRANSITION_METALS, covalent_radius_A
from ehmo.structure.files import shown

FULL: Final = 0.995
"""Occupancies from here on count as full."""

HALF: Final = 0.5 - 1e-6
"""A partly occupied site that excludes nothing is taken as present from here on."""

SAME_SITE_A: Final = 0.25
"""Sites closer than this share one place: mixed occupancy [angstrom]."""

REGION_A: Final = 2.0
"""Alternatives without an assembly name belong together if they come closer than this [angstrom]."""

_TOO_CLOSE: Final = 0.75  # of the sum of covalent radii: N-N in dinitrogen 0.77, C-O in carbon monoxide 0.80
_TOO_CLOSE_METAL: Final = 0.60  # shortest metal-ligand multiple bonds 0.67
_TOO_CLOSE_ION: Final = 0.80  # K-O 2.6 A is 0.97
_BOND_RANGE: Final = (0.84, 1.16)  # of the sum of covalent radii
_NEVER_A: Final = 2.0  # light atoms at less, no bond between them, exclude one another
_HYDROGENS_A: Final = 1.1


@dataclass(slots=True)
class OrderedSites:
    """Sites of one ordered alternative.

    Attributes
    ----------
    kept : list of Site
    weights : list of float
        Share of cells in which each kept atom or an alternative of its kind is present.
    left_out : list of Site
        Sites of the minor parts.
    """

    kept: list[Site]
    weights: list[float]
    left_out: list[Site]

    @property
    def partial(self) -> set[int]:
        """Places in `kept` of sites that are not fully occupied."""
        return {k for k, site in enumerate(self.kept) if site.occupancy < FULL}


def major_parts(sites: list[Site], lattice: FloatArray, notes: list[str]) -> OrderedSites:
    """Keep the disorder group of largest occupancy in each assembly.

    Where the assembly has no name, alternatives that come close to one another, and sites of the same group and
    occupancy, count as one.

    Parameters
    ----------
    sites : list of Site
    lattice : (3, 3) ndarray
        Rows are the lattice vectors [angstrom].
    notes : list of str
        Takes a sentence for each choice.

    Returns
    -------
    ordered : OrderedSites
    """
    dropped: set[int] = set()
    weights = {k: site.occupancy for k, site in enumerate(sites)}
    for members in _assemblies(sites, lattice):
        groups: dict[str, list[int]] = defaultdict(list)
        for k in members:
            groups[sites[k].group].append(k)
        if len(groups) < 2:
            continue
        share = {group: float(np.mean([sites[k].occupancy for k in held])) for group, held in groups.items()}
        best = max(share, key=lambda group: (round(share[group], 4), [-ord(letter) for letter in group.lstrip("-")]))
        lost = [k for group, held in groups.items() if group != best for k in held]
        dropped.update(lost)
        for k in groups[best]:
            weights[k] = min(1.0, sum(share.values()))
        taken = listed([sites[k].label for k in groups[best]])
        others = listed([sites[k].label for k in lost])
        notes.append(f"Disorder: part {shown(best, 8)} ({share[best]:.2f}) taken of {taken}; left out {others}.")
    kept = [k for k in range(len(sites)) if k not in dropped]
    return OrderedSites([sites[k] for k in kept], [weights[k] for k in kept], [sites[k] for k in sorted(dropped)])


def _assemblies(sites: list[Site], lattice: FloatArray) -> list[list[int]]:
    named: dict[str, list[int]] = defaultdict(list)
    for k, site in enumerate(sites):
        if site.group:
            named[site.assembly].append(k)
    found = [members for name, members in named.items() if name]
    return found + (_regions(sites, named[""], lattice) if "" in named else [])


def _regions(sites: list[Site], members: list[int], lattice: FloatArray) -> list[list[int]]:
    """Split alternatives without an assembly name into regions that can be decided apart."""
    from ase import Atoms
    from ase.neighborlist import neighbor_list

    where = np.array([sites[k].fractional for k in members])
    atoms = Atoms("H" * len(members), positions=where @ lattice, cell=lattice, pbc=True)
    near, other = (part.tolist() for part in neighbor_list("ij", atoms, REGION_A))
    alike: dict[tuple[str, float], int] = {}
    links = [(k, alike.setdefault((sites[m].group, round(sites[m].occupancy, 3)), k)) for k, m in enumerate(members)]
    links += zip(near, other, strict=True)
    bonded: dict[int, set[int]] = defaultdict(set)
    for one, two in links:
        bonded[one].add(two)
        bonded[two].add(one)
    return [[members[k] for k in sorted(region)] for region in _connected(set(range(len(members))), bonded)]


def _connected(left: set[int], bonds: Mapping[int, set[int]]) -> list[set[int]]:
    """Connected sets that the members of a set belong to, lowest member first."""
    found: list[set[int]] = []
    seen: set[int] = set()
    for start in sorted(left):
        if start in seen:
            continue
        group, queue = set(), [start]
        while queue:
            k = queue.pop()
            if k not in group:
                group.add(k)
                queue += bonds[k]
        seen |= group
        found.append(group)
    return found


@dataclass(slots=True)
class CrowdedCell:
    """Atoms of a cell in which partly occupied ones may exclude others.

    Attributes
    ----------
    sites : list of Site
    site_of, copy_of : (n_atoms,) ndarray of int
        Site and symmetry operation of each atom.
    made : list of ndarray of int
        By site, the atom that each operation makes of it.
    first, second : (n_pairs,) ndarray of int
        Close pairs, both ways.
    distances : (n_pairs,) ndarray
        [angstrom]
    weights : list of float
        By site.
    """

    sites: list[Site]
    site_of: IntArray
    copy_of: IntArray
    made: list[IntArray]
    first: IntArray
    second: IntArray
    distances: FloatArray
    weights: list[float]

    def exclusions(self) -> list[tuple[int, int]]:
        """Pairs of atoms that cannot both be present."""
        found = []
        for a, b, d in zip(self.first.tolist(), self.second.tolist(), self.distances.tolist(), strict=True):
            one, other = self.sites[self.site_of[a]], self.sites[self.site_of[b]]
            if a < b and (excludes(one, other, d) or self._alternative_copies(a, b, d)):
                found.append((a, b))
        return found

    def _alternative_copies(self, a: int, b: int, distance_A: float) -> bool:
        """Whether two images are alternatives though they stand apart like bonded atoms.

        Images of a group with a negative number never bind each other, by the convention of the refinement
        programs; nor do half-occupied images of one site, unless of carbon, which chains put across centres.
        """
        one, other = self.sites[self.site_of[a]], self.sites[self.site_of[b]]
        if self.copy_of[a] == self.copy_of[b] or one.symbol == "H" or other.symbol == "H":
            return False
        ratio = distance_A / (covalent_radius_A(one.symbol) + covalent_radius_A(other.symbol))
        if one.group.startswith("-") and one.group == other.group:
            return ratio < _BOND_RANGE[1]
        half = self.site_of[a] == self.site_of[b] and one.occupancy <= 0.5 and one.symbol != "C"
        return bool(half and ratio < _BOND_RANGE[1])


def excludes(one: Site, other: Site, distance_A: float) -> bool:
    """Whether two sites at a distance cannot both be occupied; fully occupied ones are never set aside."""
    if one.occupancy >= FULL and other.occupancy >= FULL:
        return False
    symbols = {one.symbol, other.symbol}
    ratio = distance_A / (covalent_radius_A(one.symbol) + covalent_radius_A(other.symbol))
    if "H" in symbols:
        return distance_A < (_HYDROGENS_A if symbols == {"H"} else 0.6)
    if symbols & COUNTER_IONS:
        return ratio < _TOO_CLOSE_ION
    if symbols & TRANSITION_METALS:
        return ratio < _TOO_CLOSE_METAL
    shared = one.occupancy + other.occupancy < 1.05
    unbonded = not _BOND_RANGE[0] < ratio < _BOND_RANGE[1]
    return ratio < _TOO_CLOSE or (shared and unbonded and distance_A < _NEVER_A)


@dataclass(frozen=True, slots=True)
class OrderedAtoms:
    """Atoms of one ordered alternative.

    Attributes
    ----------
    kept : (n_kept,) ndarray of int
    weights : list of float
        By site, the share of cells in which it or an alternative of its kind is present.
    mixed : dict of int to str
        Sites that two elements share, in words, by site.
    """

    kept: IntArray
    weights: list[float]
    mixed: dict[int, str]


def ordered_atoms(cell: CrowdedCell, place: str, notes: list[str]) -> OrderedAtoms:
    """Atoms of one ordered alternative.

    Of sites that exclude one another the one of larger occupancy stays. A site whose own images exclude one
    another keeps as many as fit. What excludes nothing stays from half occupancy on. Of the hydrogens on an atom
    as many stay as their occupancies add up to.

    Raises
    ------
    InputError
        If images of a transition metal exclude one another, or no ordered alternative is left.
    """
    exclusions = cell.exclusions()
    weights = list(cell.weights)
    lost_sites, mixed = _weaker_sites(cell, exclusions, notes)
    present = ~np.isin(cell.site_of, sorted(lost_sites))
    _thin_out_images(cell, exclusions, present, weights, place, notes)
    _drop_rare(cell, exclusions, present, weights, notes)
    _drop_hydrogens(cell, present, notes)
    return OrderedAtoms(np.flatnonzero(present), weights, mixed)


def _occupied(site: Site) -> str:
    return f"{shown(site.label, 12)} {site.occupancy:.2f}"


def _few(parts: list[str], limit: int) -> str:
    return "; ".join(parts[:limit]) + " ..." * (len(parts) > limit)


def _weaker_sites(
    cell: CrowdedCell, exclusions: list[tuple[int, int]], notes: list[str]
) -> tuple[set[int], dict[int, str]]:
    """Sites to leave out, and the mixed ones that stay."""
    rivals: dict[int, set[int]] = defaultdict(set)
    near: dict[tuple[int, int], bool] = {}
    gaps = {
        (a, b): d for a, b, d in zip(cell.first.tolist(), cell.second.tolist(), cell.distances.tolist(), strict=True)
    }
    for a, b in exclusions:
        one, other = sorted((int(cell.site_of[a]), int(cell.site_of[b])))
        if one != other:
            rivals[one].add(other)
            rivals[other].add(one)
            near[one, other] = near.get((one, other), False) or gaps[a, b] < SAME_SITE_A
    lost: set[int] = set()
    mixtures: dict[int, str] = {}
    alternatives: list[str] = []
    for k in sorted(rivals, key=lambda k: (-cell.sites[k].occupancy, k)):
        if k in lost:
            continue
        beaten = sorted(other for other in rivals[k] if other not in lost)
        lost.update(beaten)
        site = cell.sites[k]
        mixed = [
            other for other in beaten if near[min(k, other), max(k, other)] and cell.sites[other].symbol != site.symbol
        ]
        name = shown(site.label, 12)
        if mixed:
            mixtures[k] = f"{name} {site.occupancy:.2f} with {', '.join(_occupied(cell.sites[o]) for o in mixed)}"
        rest = [other for other in beaten if other not in mixed]
        if rest:
            alternatives.append(f"{name} {site.occupancy:.2f}, not {', '.join(_occupied(cell.sites[o]) for o in rest)}")
    if mixtures:
        notes.append(mixed_sentence(mixtures.values()))
    if alternatives:
        notes.append(f"Of sites that exclude one another the fuller one was taken: {_few(alternatives, 8)}.")
    return lost, mixtures


def mixed_sentence(mixtures: Iterable[str]) -> str:
    """Sentence on sites that two elements share."""
    return f"Mixed sites, taken as the element of larger share: {_few(list(mixtures), 12)}."


def _thin_out_images(
    cell: CrowdedCell,
    exclusions: list[tuple[int, int]],
    present: np.ndarray[tuple[int], np.dtype[np.bool_]],
    weights: list[float],
    place: str,
    notes: list[str],
) -> None:
    """Where symmetry images exclude one another, keep whole copies of the disordered unit that fit together."""
    own = [(a, b) for a, b in exclusions if present[a] and present[b]]
    if not own:
        return
    crowded = {int(cell.site_of[a]) for pair in own for a in pair}
    metals = [cell.sites[k].label for k in sorted(crowded) if cell.sites[k].symbol in TRANSITION_METALS]
    if metals:
        raise InputError(
            f"{listed(metals)} disordered about a symmetry element: the images of the metal overlap",
            place=place,
            mend="refine in a subgroup, or give one ordered alternative as P 1 or as XYZ",
        )
    rivals: dict[int, set[int]] = defaultdict(set)
    for a, b in own:
        rivals[a].add(b)
        rivals[b].add(a)
    for unit in _units(cell, crowded):
        inside = np.isin(cell.site_of, sorted(unit)) & present
        copies = sorted({tuple(sorted(atoms)) for atoms in zip(*(cell.made[k].tolist() for k in unit), strict=True)})
        chosen: set[int] = set()
        for copy in copies:
            together = chosen.union(copy)
            clash = any(other in together for atom in copy for other in rivals.get(atom, ()))
            if not clash:
                chosen = together
        if not chosen:
            labels = [cell.sites[k].label for k in sorted(unit)]
            raise InputError(
                f"symmetry images of {listed(labels)} exclude one another within one copy",
                place=place,
                mend="give one ordered alternative",
            )
        before = int(inside.sum())
        keep = sorted(chosen)
        present[inside] = False
        present[keep] = True
        share = len(keep) / before
        for k in unit:
            weights[k] = min(1.0, cell.sites[k].occupancy / share)
        labels = [cell.sites[k].label for k in sorted(unit)]
        notes.append(
            f"Disorder about a symmetry element: {len(keep)} of {before} images kept of {listed(labels)}"
            f" (occupancy {cell.sites[min(unit)].occupancy:.2f})."
        )


def _units(cell: CrowdedCell, crowded: set[int]) -> list[set[int]]:
    """Sites that move together: the crowded ones and partly occupied ones bonded to them."""
    bonds: dict[int, set[int]] = defaultdict(set)
    for a, b, d in zip(cell.first.tolist(), cell.second.tolist(), cell.distances.tolist(), strict=True):
        one, other = int(cell.site_of[a]), int(cell.site_of[b])
        sites = cell.sites[one], cell.sites[other]
        ratio = d / (covalent_radius_A(sites[0].symbol) + covalent_radius_A(sites[1].symbol))
        partial = sites[0].occupancy < FULL and sites[1].occupancy < FULL
        if partial and cell.copy_of[a] == cell.copy_of[b] and _TOO_CLOSE - 0.1 < ratio < _BOND_RANGE[1]:
            bonds[one].add(other)
    return _connected(crowded, bonds)


def _drop_rare(
    cell: CrowdedCell,
    exclusions: list[tuple[int, int]],
    present: np.ndarray[tuple[int], np.dtype[np.bool_]],
    weights: list[float],
    notes: list[str],
) -> None:
    """Leave out what is less than half present, and say what was taken as present though partly occupied."""
    alive = sorted({int(k) for k in cell.site_of[present]})
    partial = [k for k in alive if cell.sites[k].occupancy < FULL and cell.sites[k].symbol != "H"]
    rivals = {int(cell.site_of[atom]) for pair in exclusions for atom in pair}
    rare = [k for k in partial if weights[k] < HALF and k not in rivals]
    if rare:
        present[np.isin(cell.site_of, rare)] = False
        notes.append(f"Less than half occupied and left out: {_with_occupancy(cell, rare)}.")
    taken = [k for k in partial if k not in rare and k not in rivals and not cell.sites[k].group]
    if taken:
        notes.append(f"Partly occupied and taken as present: {_with_occupancy(cell, taken)}.")


def _with_occupancy(cell: CrowdedCell, sites: list[int]) -> str:
    return _few([_occupied(cell.sites[k]) for k in sites], 8).replace(";", ",")


def _drop_hydrogens(cell: CrowdedCell, present: np.ndarray[tuple[int], np.dtype[np.bool_]], notes: list[str]) -> None:
    """Keep as many hydrogens on an atom as their occupancies add up to."""
    partial = [
        a for a in np.flatnonzero(present).tolist()
        if cell.sites[cell.site_of[a]].symbol == "H" and cell.sites[cell.site_of[a]].occupancy < FULL
    ]  # fmt: skip
    if not partial:
        return
    nearest: dict[int, tuple[float, int]] = {}
    for a, b, d in zip(cell.first.tolist(), cell.second.tolist(), cell.distances.tolist(), strict=True):
        site = cell.sites[cell.site_of[a]]
        if site.symbol == "H" and cell.sites[cell.site_of[b]].symbol != "H" and present[a] and present[b]:
            nearest[a] = min(nearest.get(a, (np.inf, -1)), (d, b))
    holders: dict[int, list[int]] = defaultdict(list)
    for a, (_, b) in nearest.items():
        holders[b].append(a)
    lost = {a for a in partial if a not in nearest and cell.sites[cell.site_of[a]].occupancy < HALF}
    for holder, hydrogens in holders.items():
        if not set(hydrogens) & set(partial):
            continue
        occupancy = {a: cell.sites[cell.site_of[a]].occupancy for a in hydrogens}
        room = round(sum(occupancy.values()) / cell.sites[cell.site_of[holder]].occupancy + 1e-6)
        ranked = sorted(hydrogens, key=lambda a: (-occupancy[a], a))
        lost.update(ranked[room:])
    if lost:
        present[sorted(lost)] = False
        notes.append(
            "Disordered hydrogens left out: "
            + listed(sorted({cell.sites[cell.site_of[a]].label for a in lost}), 8)
            + "."
        )
