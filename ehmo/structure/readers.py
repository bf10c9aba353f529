"""From a file to fragments: XYZ, extended XYZ, CIF, and further formats that ASE reads."""

from __future__ import annotations

import os
import re
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Final

from ehmo.errors import InputError, LimitError
from ehmo.records.fragment import Fragment
from ehmo.structure.ase_atoms import fragments_of_atoms
from ehmo.structure.electron_keys import StatedElectrons, comment_pairs, stated_electrons
from ehmo.structure.files import MAX_ATOMS, MAX_BYTES, is_ase_database, read_text, shown
from ehmo.structure.xyz import XyzFrame, extended_atoms, plain_fragment, split_frames

if TYPE_CHECKING:
    from ase import Atoms

    from ehmo.structure.contents import Cations, Hydrogens

ASE_FORMATS: Final = frozenset({"aims", "gen", "mol", "proteindatabank", "sdf", "turbomole", "vasp", "xsf"})
"""Text formats left to ASE; others are refused, since some of its readers run or unpickle what they read."""

CIF_SUFFIXES: Final = (".cif", ".mcif")
XYZ_SUFFIXES: Final = (".xyz", ".extxyz")


def read(
    path: str | os.PathLike[str],
    *,
    hydrogens: Hydrogens = "file",
    cations: Cations = "none",
    max_atoms: int = MAX_ATOMS,
    max_bytes: int = MAX_BYTES,
) -> Fragment:
    """Fragment of a file that holds one structure.

    Parameters
    ----------
    path : str or path-like
        XYZ, extended XYZ or CIF, told by suffix or content; else a text format that ASE knows.
    hydrogens, cations, max_atoms, max_bytes
        As for `read_frames`.

    Returns
    -------
    fragment : Fragment
        Charge and unpaired electrons are None where the file does not tell them.

    Raises
    ------
    InputError
        If the file cannot be read as a molecule, or holds several structures.
    LimitError
        If the file is over a limit.
    """
    fragments = read_frames(path, hydrogens=hydrogens, cations=cations, max_atoms=max_atoms, max_bytes=max_bytes)
    if len(fragments) > 1:
        raise InputError(
            f"{len(fragments)} structures where one was asked for",
            place=shown(path, 200),
            mend="use read_frames, which gives them all",
        )
    return fragments[0]


def from_ase(atoms: Atoms, charge: int | None = None, unpaired_electrons: int | None = None) -> Fragment:
    """Fragment of ASE atoms: a molecule, or the one molecule with a metal in a periodic cell.

    Parameters
    ----------
    atoms : ase.Atoms
        Atoms; its `info` may state charge and unpaired electrons or spin multiplicity, as an extended XYZ would.
    charge, unpaired_electrons : int, optional
        Override what `info` states.

    Returns
    -------
    fragment : Fragment

    Raises
    ------
    InputError
        If the coordinates are not finite, or a cell holds several molecules with metals or none that is whole.
    """
    stated = stated_electrons(((str(key), value) for key, value in atoms.info.items()), "ASE atoms")
    found = _fragments_of(atoms, "ASE atoms", atoms.get_chemical_formula(), stated)
    if len(found) > 1:
        raise InputError(
            f"{len(found)} molecules with metals where one was asked for",
            place="ASE atoms",
            mend="cut out one of them",
        )
    one = found[0]
    return replace(
        one,
        charge=one.charge if charge is None else charge,
        unpaired_electrons=one.unpaired_electrons if unpaired_electrons is None else unpaired_electrons,
    )


def read_frames(
    path: str | os.PathLike[str],
    *,
    hydrogens: Hydrogens = "file",
    cations: Cations = "none",
    max_atoms: int = MAX_ATOMS,
    max_bytes: int = MAX_BYTES,
) -> tuple[Fragment, ...]:
    """Fragments of a file.

    Parameters
    ----------
    path : str or path-like
        XYZ, extended XYZ or CIF, told by suffix or content; else an ASE database, or a text format that ASE knows.
    hydrogens : {"file", "place", "lengthen"}
        As in the file, with missing ones placed at neutron lengths, or with X-H bonds lengthened to them.
    cations : {"none", "basis"}
        Whether counter-ions of groups 1 and 2 join the molecules of a CIF.
    max_atoms : int
        Largest number of atoms in a frame or a crystal cell.
    max_bytes : int
        Largest file size [byte].

    Returns
    -------
    fragments : tuple of Fragment
        One per frame of XYZ, one per distinct molecule with a metal of a crystal. Charge and unpaired electrons
        are None where neither the file states them nor a crystal balances them.

    Raises
    ------
    InputError
        If the file cannot be read as a molecule; the message names the place and the mend.
    LimitError
        If the file or a frame is over a limit.
    """
    path = Path(path)
    place = shown(path, 200)
    if is_ase_database(path):
        return completed(_database_fragments(path, place, max_atoms, max_bytes), hydrogens)
    text = read_text(path, max_bytes)
    kind = _kind(path, text)
    if kind == "cif":
        return _cif_fragments(text, place, max_atoms, hydrogens, cations)
    if kind == "xyz":
        return frames_of_text(text, place, hydrogens=hydrogens, max_atoms=max_atoms)
    return completed(_ase_fragments(path, place, max_atoms), hydrogens)


def frames_of_text(
    text: str,
    place: str,
    *,
    hydrogens: Hydrogens = "file",
    max_atoms: int = MAX_ATOMS,
    first_line: int = 1,
    first_number: int = 1,
) -> tuple[Fragment, ...]:
    """Fragments of the text of an XYZ file, or of some frames of one.

    Parameters
    ----------
    text : str
    place : str
        File, as messages name it.
    hydrogens, max_atoms
        As for `read_frames`.
    first_line, first_number : int
        Line and frame of the file that the text starts with.

    Returns
    -------
    fragments : tuple of Fragment

    Raises
    ------
    InputError
        If a frame cannot be read.
    LimitError
        If a frame is over the limit.
    """
    frames = split_frames(text, place, max_atoms, first_line=first_line, first_number=first_number)
    found = tuple(fragment for frame in frames for fragment in _frame_fragments(frame, place))
    return completed(found, hydrogens)


def completed(found: tuple[Fragment, ...], hydrogens: Hydrogens) -> tuple[Fragment, ...]:
    """Fragments with hydrogens as they are asked for; see `read_frames`."""
    if hydrogens == "file":
        return found
    from ehmo.structure.cell_hydrogens import with_hydrogens, with_longer_bonds

    change = with_hydrogens if hydrogens == "place" else with_longer_bonds
    return tuple(change(fragment) for fragment in found)


def is_crystal(path: str | os.PathLike[str], *, max_bytes: int = MAX_BYTES) -> bool:
    """Whether a file is a CIF, by its suffix or its content."""
    path = Path(path)
    suffix = path.suffix.lower()
    if suffix in CIF_SUFFIXES or suffix in XYZ_SUFFIXES:
        return suffix in CIF_SUFFIXES
    if is_ase_database(path):
        return False
    return _kind(path, read_text(path, max_bytes)) == "cif"


def _cif_fragments(
    text: str, place: str, max_atoms: int, hydrogens: Hydrogens, cations: Cations
) -> tuple[Fragment, ...]:
    """Molecules of every block; a block without any is refused only where no other has some."""
    from ehmo.structure.crystal import crystals_of_text, molecules_of

    crystals = crystals_of_text(text, place, max_atoms, hydrogens=hydrogens, cations=cations)
    usable = [contents for contents in crystals if contents.molecules] or crystals[:1]
    return tuple(fragment for contents in usable for fragment in molecules_of(contents))


def _kind(path: Path, text: str) -> str:
    suffix = path.suffix.lower()
    if suffix in CIF_SUFFIXES:
        return "cif"
    if suffix in XYZ_SUFFIXES:
        return "xyz"
    if re.search(r"^_cell[_.]length_a\s", text, re.MULTILINE) and re.search(r"^data_", text, re.MULTILINE):
        return "cif"
    lines = text.split("\n", 3)
    if re.fullmatch(r"\s*\d{1,9}\s*", lines[0]) and len(lines) > 2 and len(lines[2].split()) >= 4:
        return "xyz"
    return "other"


def _frame_fragments(frame: XyzFrame, place: str) -> tuple[Fragment, ...]:
    if not frame.extended:
        return (plain_fragment(frame, place),)
    stated = stated_electrons(comment_pairs(frame.comment), f"{place}, line {frame.first_line + 1}")
    source = place if frame.number == 1 else f"{place}, frame {frame.number}"
    return _fragments_of(extended_atoms(frame, place), source, frame.title, stated)


def _fragments_of(atoms: Atoms, source: str, title: str, stated: StatedElectrons) -> tuple[Fragment, ...]:
    """Fragments of ASE atoms: as they stand, or the molecules of a cell periodic in three directions."""
    found, contents = fragments_of_atoms(atoms, source, title, stated)
    if not found and contents is not None:
        from ehmo.structure.crystal import molecules_of

        return molecules_of(contents)  # says what the crystal holds instead
    return found


def _database_fragments(path: Path, place: str, max_atoms: int, max_bytes: int) -> tuple[Fragment, ...]:
    """Molecules of every row of an ASE database; a row that cannot be used refuses the whole."""
    from ehmo.structure.ase_database import ase_database_rows

    if path.stat().st_size > max_bytes:
        raise LimitError(
            f"{path.stat().st_size} bytes, the limit is {max_bytes}", place=place, mend="raise max_bytes (--max-bytes)"
        )
    found: list[Fragment] = []
    for row in ase_database_rows(path, max_atoms=max_atoms):
        if row.fault:
            raise InputError(row.fault)
        if not row.fragments:
            raise InputError(
                "extended structure without molecules", place=f"{place}, {row.entry}", mend="give it as a CIF"
            )
        found += row.fragments
    if not found:
        raise InputError("no rows", place=place, mend="give an ASE database with structures")
    return tuple(found)


def _ase_fragments(path: Path, place: str, max_atoms: int) -> tuple[Fragment, ...]:
    from ase.io import read
    from ase.io.formats import UnknownFileTypeError, filetype

    try:
        name = filetype(str(path))
    except (UnknownFileTypeError, OSError, EOFError, ValueError):
        name = "unknown"
    if name not in ASE_FORMATS:
        raise InputError("unknown file format", place=place, mend="give XYZ (suffix .xyz) or CIF (suffix .cif)")
    try:
        frames = read(path, index=":", format=name)
    except Exception as error:
        raise InputError(f"cannot be read as {name} ({shown(error)})", place=place, mend="convert it to XYZ") from error
    if not frames:
        raise InputError("no atoms", place=place, mend="give a file with atoms")
    if max(map(len, frames)) > max_atoms:
        raise LimitError(
            f"{max(map(len, frames))} atoms, the limit is {max_atoms}",
            place=place,
            mend="raise max_atoms (--max-atoms)",
        )
    found: list[Fragment] = []
    for number, atoms in enumerate(frames, start=1):
        source = place if len(frames) == 1 else f"{place}, frame {number}"
        stated = stated_electrons(((str(key), value) for key, value in atoms.info.items()), source)
        found += _fragments_of(atoms, source, str(atoms.info.get("name", path.stem)), stated)
    return tuple(found)
