"""Crystal structure files to their contents."""

from __future__ import annotations

import os
from dataclasses import replace
from pathlib import Path

from ehmo.errors import InputError
from ehmo.records.crystal import CrystalContents
from ehmo.records.fragment import Fragment
from ehmo.structure.contents import Cations, Hydrogens, contents_of_cell
from ehmo.structure.files import MAX_ATOMS, MAX_BYTES, read_text, shown


def crystal_contents(
    path: str | os.PathLike[str],
    *,
    hydrogens: Hydrogens = "file",
    cations: Cations = "none",
    max_atoms: int = MAX_ATOMS,
    max_bytes: int = MAX_BYTES,
) -> CrystalContents:
    """What the one crystal structure of a CIF holds.

    Parameters
    ----------
    path : str or path-like
        CIF.
    hydrogens : {"file", "place", "lengthen"}
        As in the file, with missing ones placed at neutron lengths, or with X-H bonds lengthened to them.
    cations : {"none", "basis"}
        Whether counter-ions of groups 1 and 2 join the fragments of molecules.
    max_atoms, max_bytes : int
        Limits of the cell and of the file.

    Returns
    -------
    contents : CrystalContents
        Molecules, networks, counter-ions and solvent.

    Raises
    ------
    InputError
        If the file is no usable CIF, has no metal, or holds several structures.
    LimitError
        If the file or the cell is over a limit.
    """
    found = read_crystals(path, hydrogens=hydrogens, cations=cations, max_atoms=max_atoms, max_bytes=max_bytes)
    if len(found) > 1:
        raise InputError(
            f"{len(found)} crystal structures where one was asked for",
            place=shown(path, 200),
            mend="use read_crystals, which gives them all",
        )
    return found[0]


def read_crystals(
    path: str | os.PathLike[str],
    *,
    hydrogens: Hydrogens = "file",
    cations: Cations = "none",
    max_atoms: int = MAX_ATOMS,
    max_bytes: int = MAX_BYTES,
) -> tuple[CrystalContents, ...]:
    """What each data block of a CIF holds; arguments as for `crystal_contents`."""
    place = shown(path, 200)
    text = read_text(Path(path), max_bytes)
    return crystals_of_text(text, place, max_atoms, hydrogens=hydrogens, cations=cations)


def crystals_of_text(
    text: str, place: str, max_atoms: int, *, hydrogens: Hydrogens = "file", cations: Cations = "none"
) -> tuple[CrystalContents, ...]:
    """What each data block of the text of a CIF holds."""
    from ehmo.structure.cif import cif_cells

    return tuple(
        contents_of_cell(cell, hydrogens=hydrogens, cations=cations) for cell in cif_cells(text, place, max_atoms)
    )


def molecules_of(contents: CrystalContents) -> tuple[Fragment, ...]:
    """Fragments of the molecules of a crystal.

    Raises
    ------
    InputError
        If its metals are all in chains, layers or frameworks.
    """
    if not contents.molecules:
        words = ", ".join(f"{network.word} {network.reduced_formula}" for network in contents.networks[:3])
        raise InputError(
            f"extended structure without molecules: {words}",
            place=contents.source,
            mend="see what it holds with --list, or cut out a molecule and give it as XYZ",
        )
    left = [f"{network.word} {network.reduced_formula}" for network in contents.networks]
    if not left:
        return contents.fragments
    note = f"Not in the report: the {', the '.join(left)} of the same crystal."
    return tuple(replace(fragment, notes=(*fragment.notes, note)) for fragment in contents.fragments)
