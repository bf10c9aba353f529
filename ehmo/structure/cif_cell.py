"""Sites and symmetry of a CIF block to the full cell, one ordered alternative."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from typing import TYPE_CHECKING, Final

import numpy as np

from ehmo.errors import InputError, LimitError
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.structure.cif_sites import Site, listed
from ehmo.structure.disorder import FULL, CrowdedCell, major_parts, ordered_atoms
from ehmo.structure.elements import COUNTER_IONS, TRANSITION_METALS, covalent_radius_A
from ehmo.structure.graph import BOND_FACTOR
from ehmo.structure.periodic import SAME_PLACE_A, LeftOut, PeriodicCell, StatedFacts, check_cell

if TYPE_CHECKING:
    from ase import Atoms

MONATOMIC_IONS: Final = COUNTER_IONS | {"F", "Cl", "Br", "I"}
"""Elements whose lone atoms are ions."""

_EXCLUSION_A: Final = 1.05  # half of what light atoms that exclude one another may be apart


@dataclass(slots=True)
class ExpandedSites:
    """Atoms of the full cell: the listed ones where the file puts them, their images anywhere in the lattice.

    Attributes
    ----------
    fractional : (n_atoms, 3) ndarray
    site_of, copy_of : (n_atoms,) ndarray of int
        Site of each atom and the operation that makes it.
    made : list of ndarray of int
        By site, the atom that each operation makes of it.
    repeated : list of str
        Labels of sites that repeat an image of an earlier one.
    """

    fractional: FloatArray
    site_of: IntArray
    copy_of: IntArray
    made: list[IntArray] = field(default_factory=list)
    repeated: list[str] = field(default_factory=list)

    @property
    def listed(self) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
        """Whether the file lists the atom itself."""
        return np.asarray(self.copy_of == 0)


def expanded(
    sites: list[Site],
    rotations: FloatArray,
    translations: FloatArray,
    lattice: FloatArray,
    place: str,
    max_atoms: int,
) -> ExpandedSites:
    """Images of every site, each place once.

    Raises
    ------
    LimitError
        If there are more than `max_atoms` atoms.
    """
    where: list[FloatArray] = []
    site_of: list[int] = []
    copy_of: list[int] = []
    made: list[IntArray] = []
    repeated: list[str] = []
    seen: dict[str, list[FloatArray]] = {}
    symmetric = len(rotations) > 1
    for number, site in enumerate(sites):
        images = rotations @ np.array(site.fractional) + translations
        images[0] = site.fractional
        fresh, same_as = _first_of_each(images, lattice)
        if symmetric and site.occupancy >= FULL and _repeats(images[0], seen.get(site.symbol, []), lattice):
            repeated.append(site.label)
            made.append(np.zeros(0, int))
            continue
        if symmetric and site.occupancy >= FULL:
            seen.setdefault(site.symbol, []).append(images[fresh])
        where.append(images[fresh])
        made.append(len(site_of) + same_as)
        site_of += [number] * len(fresh)
        copy_of += fresh.tolist()
        if len(site_of) > max_atoms:
            raise LimitError(
                f"the cell holds more than {max_atoms} atoms", place=place, mend="raise max_atoms (--max-atoms)"
            )
    return ExpandedSites(np.vstack(where), np.array(site_of), np.array(copy_of), made, repeated)


def _first_of_each(images: FloatArray, lattice: FloatArray) -> tuple[IntArray, IntArray]:
    """Images that repeat no earlier one, lattice translations aside, and which of them each image is."""
    if len(images) == 1:
        return np.zeros(1, int), np.zeros(1, int)
    gap = images[:, None, :] - images[None, :, :]
    close = np.linalg.norm((gap - np.round(gap)) @ lattice, axis=2) < SAME_PLACE_A
    fresh = np.flatnonzero(~np.triu(close, k=1).any(axis=0))
    return fresh, close[:, fresh].argmax(axis=1)


def _repeats(fractional: FloatArray, earlier: list[FloatArray], lattice: FloatArray) -> bool:
    """Whether a site repeats an atom already made, as in files that list the whole cell and the symmetry."""
    if not earlier:
        return False
    gap = np.vstack(earlier) - fractional
    return bool((np.linalg.norm((gap - np.round(gap)) @ lattice, axis=1) < SAME_PLACE_A).any())


def ordered_cell(
    sites: list[Site],
    rotations: FloatArray,
    translations: FloatArray,
    lattice: FloatArray,
    facts: StatedFacts,
    place: str,
    title: str,
    notes: list[str],
    max_atoms: int,
) -> PeriodicCell:
    """Full cell of one ordered alternative; `notes` takes a sentence for each choice.

    Raises
    ------
    InputError
        If cell or coordinates are impossible, or no ordered alternative is to be had.
    LimitError
        If the cell holds more than `max_atoms` atoms.
    """
    from ase import Atoms

    ordered = major_parts(sites, lattice, notes)
    images = expanded(ordered.kept, rotations, translations, lattice, place, max_atoms)
    if images.repeated:
        notes.append(f"Sites that repeat symmetry images of others count once: {listed(images.repeated)}.")
    symbols = [ordered.kept[k].symbol for k in images.site_of.tolist()]
    labels = tuple(ordered.kept[k].label for k in images.site_of.tolist())
    atoms = Atoms(symbols, positions=images.fractional @ lattice, cell=lattice, pbc=True)
    weights, keep = np.array(ordered.weights), np.arange(len(atoms))
    dropped: list[Site] = []
    mixed: dict[int, str] = {}
    if ordered.partial:
        check_cell(PeriodicCell(atoms, images.listed, labels, place, title))
        crowded = _crowded(ordered.kept, ordered.weights, images, atoms)
        chosen = ordered_atoms(crowded, place, notes)
        keep, weights, mixed = chosen.kept, np.array(chosen.weights), chosen.mixed
        gone = set(range(len(ordered.kept))) - set(images.site_of[keep].tolist())
        dropped += [ordered.kept[k] for k in sorted(gone)]
        _check_metals(dropped, {symbols[k] for k in keep}, place)
    site_of = images.site_of[keep]
    facts = _with_left_out(facts, ordered.left_out, dropped, rotations, translations, lattice)
    return PeriodicCell(
        atoms=atoms[keep],
        listed=images.listed[keep],
        labels=tuple(labels[k] for k in keep),
        place=place,
        title=title,
        notes=tuple(notes),
        sites=site_of,
        weights=weights[site_of],
        rotations=rotations,
        translations=translations,
        copies=images.copy_of[keep],
        occupancies=np.array([ordered.kept[k].occupancy for k in site_of.tolist()]),
        oxidation={k: s.oxidation for k, s in enumerate(ordered.kept) if s.oxidation is not None},
        mixed=mixed,
        attached={k: s.attached for k, s in enumerate(ordered.kept) if s.attached is not None},
        facts=facts,
    )


def _check_metals(dropped: list[Site], present: set[str], place: str) -> None:
    """Refuse a model whose only transition metals were left out: what remains is another compound."""
    metals = [site.label for site in dropped if site.symbol in TRANSITION_METALS]
    if metals and not present & TRANSITION_METALS:
        raise InputError(
            f"the only metals are less than half occupied: {listed(metals)}",
            place=place,
            mend="raise their occupancy if the sites are to count as present",
        )


def _crowded(sites: list[Site], weights: list[float], images: ExpandedSites, atoms: Atoms) -> CrowdedCell:
    """Close pairs that involve a partly occupied site."""
    from ase.neighborlist import neighbor_list

    radii = BOND_FACTOR * np.array([covalent_radius_A(sites[k].symbol) for k in images.site_of.tolist()])
    i, j, distances = neighbor_list("ijd", atoms, np.maximum(radii, _EXCLUSION_A).tolist())
    partial = np.array([sites[k].occupancy < FULL for k in images.site_of.tolist()])
    near = partial[i] | partial[j]
    return CrowdedCell(sites, images.site_of, images.copy_of, images.made, i[near], j[near], distances[near], weights)


def _with_left_out(
    facts: StatedFacts,
    minor: list[Site],
    dropped: list[Site],
    rotations: FloatArray,
    translations: FloatArray,
    lattice: FloatArray,
) -> StatedFacts:
    """Facts with the sites left out; minor parts of a disorder group are counted with the major one already."""
    found = []
    for k, site in enumerate((*minor, *dropped)):
        images = rotations @ np.array(site.fractional) + translations
        count = len(_first_of_each(images, lattice)[0]) * site.occupancy
        found.append(LeftOut(site.label, site.symbol, count, k >= len(minor) and site.symbol in MONATOMIC_IONS))
    return replace(facts, left_out=tuple(found))
