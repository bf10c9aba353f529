"""Options on what is taken from a structure file, and the reading itself."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from typing import TYPE_CHECKING

from ehmo.errors import InputError

if TYPE_CHECKING:
    from ehmo.records.crystal import CrystalContents
    from ehmo.records.fragment import Fragment


def add_structure_options(parser: argparse.ArgumentParser) -> None:
    """Options of every command that reads a structure file."""
    group = parser.add_argument_group("structures of the file")
    group.add_argument("--list", action="store_true", help="print what the file holds, and calculate nothing")
    group.add_argument("--pick", metavar="N[,M]", help="take only these entries of the list (default: all molecules)")
    add_reading_options(group)


def add_reading_options(group: argparse._ArgumentGroup) -> None:
    """Options on atoms that a file lacks or that a calculation may leave out."""
    group.add_argument(
        "--hydrogens",
        choices=("file", "place", "lengthen"),
        default="file",
        help="as in the file, with missing ones placed, or with X-ray X-H bonds lengthened (default: file)",
    )
    group.add_argument(
        "--cations",
        choices=("none", "basis"),
        default="none",
        help="counter-ions of groups 1 and 2 in a crystal: left out, or with functions of their own (default: none)",
    )


def listing(chosen: argparse.Namespace) -> str:
    """Numbered list of what the file holds."""
    from ehmo.report.crystal_text import contents_text, frames_text

    crystals = _crystals(chosen)
    if crystals is None:
        return frames_text(_frames(chosen))
    parts, first = [], 1
    for contents in crystals:
        parts.append(contents_text(contents, first))
        first += len(contents.molecules) + len(contents.networks)
    return "\n".join(parts)


def chosen_fragments(chosen: argparse.Namespace) -> Sequence[Fragment]:
    """Fragments to calculate.

    Raises
    ------
    InputError
        If the file has no molecule, an entry is picked that does not exist or is a network, or one charge is given
        for several molecules.
    """
    crystals = _crystals(chosen)
    if crystals is None:
        frames = _frames(chosen)
        return frames if chosen.pick is None else [frames[k - 1] for k in _numbers(chosen, len(frames))]
    found = _molecules(crystals, chosen)
    stated = (chosen.charge, chosen.unpaired, chosen.oxidation_state)
    if len(found) > 1 and any(value is not None for value in stated):
        raise InputError(
            f"charge or spin is given, and the file holds {len(found)} molecules with metals",
            place=chosen.file,
            mend="choose one with --pick (--list shows them)",
        )
    return found


def extended_crystals(chosen: argparse.Namespace) -> Sequence[CrystalContents]:
    """Crystals to calculate as periodic wholes: those picked by a network, else all if the file has no molecule.

    Raises
    ------
    InputError
        If networks and molecules are picked together.
    """
    crystals = _crystals(chosen) or ()
    if chosen.pick is None:
        return () if any(contents.molecules for contents in crystals) else crystals
    owners: list[CrystalContents | None] = []
    for contents in crystals:
        owners += [None] * len(contents.molecules) + [contents] * len(contents.networks)
    if not any(owners):
        return ()
    picked = [owners[number - 1] for number in _numbers(chosen, len(owners))]
    found = {id(contents): contents for contents in picked if contents is not None}
    if found and None in picked:
        raise InputError(
            f"--pick {chosen.pick!r} names both a molecule and an extended structure",
            place=chosen.file,
            mend="pick them in two calls",
        )
    return tuple(found.values())


def _crystals(chosen: argparse.Namespace) -> Sequence[CrystalContents] | None:
    """Contents of each data block of a CIF, read once; None for other files."""
    from ehmo.structure import is_crystal

    if not is_crystal(chosen.file, max_bytes=chosen.max_bytes):
        return None
    if "crystals" not in chosen:
        from ehmo.structure import read_crystals

        chosen.crystals = read_crystals(
            chosen.file,
            hydrogens=chosen.hydrogens,
            cations=chosen.cations,
            max_atoms=chosen.max_atoms,
            max_bytes=chosen.max_bytes,
        )
    found: Sequence[CrystalContents] = chosen.crystals
    return found


def _frames(chosen: argparse.Namespace) -> Sequence[Fragment]:
    from ehmo.structure import read_frames

    return read_frames(chosen.file, hydrogens=chosen.hydrogens, max_atoms=chosen.max_atoms, max_bytes=chosen.max_bytes)


def _molecules(crystals: Sequence[CrystalContents], chosen: argparse.Namespace) -> Sequence[Fragment]:
    from ehmo.structure.crystal import molecules_of

    if chosen.pick is None:
        usable = [contents for contents in crystals if contents.molecules] or crystals[:1]
        return [fragment for contents in usable for fragment in molecules_of(contents)]
    entries: list[Fragment | str] = []
    for contents in crystals:
        entries += contents.fragments
        entries += [f"{network.word} {network.reduced_formula}" for network in contents.networks]
    found = []
    for number in _numbers(chosen, len(entries)):
        entry = entries[number - 1]
        if isinstance(entry, str):
            raise InputError(
                f"entry {number} is a {entry}, no molecule", place=chosen.file, mend="pick a molecule (--list)"
            )
        found.append(entry)
    return found


def _numbers(chosen: argparse.Namespace, last: int) -> list[int]:
    words = [word.strip() for word in chosen.pick.split(",") if word.strip()]
    if not words or not all(word.isascii() and word.isdigit() and 1 <= int(word) <= last for word in words):
        entries = "the file has 1 entry" if last == 1 else f"the file has the entries 1 to {last}"
        raise InputError(f"--pick {chosen.pick!r}: {entries}", place=chosen.file, mend="see them with --list")
    return list(dict.fromkeys(int(word) for word in words))
