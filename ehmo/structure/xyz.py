"""XYZ and extended XYZ, several frames to a file.

Every line is checked here first, so that a fault is reported with its line. Frames whose first four columns are
symbol and coordinates are then complete: importing ASE's reader costs more time than a small calculation (0.4 s where
numpy takes 0.09 s). Frames with a ``Lattice=`` or other columns go through `ase.io.extxyz`, which knows them.
"""

from __future__ import annotations

import io
import re
from collections.abc import Iterator
from dataclasses import dataclass
from math import isfinite
from typing import TYPE_CHECKING

from ehmo.conventions import ELEMENT_SYMBOLS
from ehmo.errors import InputError, LimitError
from ehmo.records.fragment import Fragment
from ehmo.structure.electron_keys import ELECTRON_KEYS, comment_pairs, stated_electrons, without_keys
from ehmo.structure.files import shown

if TYPE_CHECKING:
    from ase import Atoms

_EXTENDED = re.compile(r"""(?<!\S)(Properties|Lattice)\s*=""", re.IGNORECASE)
_USUAL_COLUMNS = re.compile(r"""(?<!\S)Properties\s*=\s*["']?species:S:1:pos:R:3(?=[:\s"']|$)""", re.IGNORECASE)
_SAID_ELSEWHERE = frozenset({"properties", "lattice", "pbc"}) | ELECTRON_KEYS
_LABEL = re.compile(r"([A-Za-z]{1,2})\d*")
_ISOTOPES = {"D": "H", "T": "H"}


@dataclass(frozen=True, slots=True)
class XyzFrame:
    """Lines of one frame; `first_line` is the number of the count line in the file."""

    number: int
    first_line: int
    comment: str
    rows: tuple[str, ...]

    @property
    def extended(self) -> bool:
        """Whether the comment describes a cell, or columns other than symbol and coordinates first."""
        return _EXTENDED.search(_USUAL_COLUMNS.sub("", self.comment)) is not None

    @property
    def title(self) -> str:
        """The comment without the columns, cell, charge and spin that it may state."""
        return without_keys(self.comment, _SAID_ELSEWHERE)


def split_frames(
    text: str, place: str, max_atoms: int, *, first_line: int = 1, first_number: int = 1
) -> Iterator[XyzFrame]:
    """Frames of a text, one after another; the text may be a piece of a file that starts at a later line and frame.

    Raises
    ------
    InputError
        If a count line is no count or a frame stops short.
    LimitError
        If a frame has more than `max_atoms` atoms.
    """
    # Not splitlines: a form feed or a Unicode line separator inside a comment is no new line.
    lines = re.split(r"\r\n|\n|\r", text)
    while lines and not lines[-1].strip():
        lines.pop()
    start, number = 0, first_number
    while start < len(lines):
        if number > first_number and not lines[start].strip():
            start += 1
            continue
        count = _count(lines[start], f"{place}, line {start + first_line}", max_atoms)
        rows = lines[start + 2 : start + 2 + count]
        for offset, row in enumerate(rows):
            if not row.strip():
                raise InputError(
                    f"blank line inside frame {number}",
                    place=f"{place}, line {start + first_line + 2 + offset}",
                    mend=f"the count line promises {count} atoms",
                )
        if len(rows) < count:
            raise InputError(
                f"frame {number} stops after {len(rows)} of {count} atoms",
                place=f"{place}, line {len(lines) + first_line - 1}",
                mend="complete the file or correct the count",
            )
        yield XyzFrame(number, start + first_line, lines[start + 1], tuple(rows))
        start += 2 + count
        number += 1


def _count(line: str, place: str, max_atoms: int) -> int:
    word = line.strip()
    if not re.fullmatch(r"\d{1,9}", word, re.ASCII) or int(word) == 0:
        raise InputError(
            f"{shown(word, 30)!r} is no count of atoms", place=place, mend="start each frame with the count"
        )
    if int(word) > max_atoms:
        raise LimitError(
            f"{int(word)} atoms, the limit is {max_atoms}", place=place, mend="raise max_atoms (--max-atoms)"
        )
    return int(word)


def plain_fragment(frame: XyzFrame, place: str) -> Fragment:
    """Fragment of a plain frame: symbol, x, y, z [angstrom]; further columns are ignored.

    Raises
    ------
    InputError
        If a line is no atom; it names the line.
    """
    atoms = [_atom(row, f"{place}, line {frame.first_line + 2 + index}") for index, row in enumerate(frame.rows)]
    stated = stated_electrons(comment_pairs(frame.comment), f"{place}, line {frame.first_line + 1}")
    return Fragment(
        symbols=tuple(symbol for symbol, _ in atoms),
        positions_A=[position for _, position in atoms],  # type: ignore[arg-type]
        charge=stated.charge,
        unpaired_electrons=stated.unpaired_electrons,
        title=frame.title,
        source=place if frame.number == 1 else f"{place}, frame {frame.number}",
    )


def _atom(row: str, place: str) -> tuple[str, tuple[float, float, float]]:
    words = row.split()
    if len(words) < 4:
        raise InputError(f"{shown(row, 40)!r} is no atom", place=place, mend="write a symbol and three coordinates")
    x, y, z = (_coordinate(word, place) for word in words[1:4])
    return element_symbol(words[0], place), (x, y, z)


def _coordinate(word: str, place: str) -> float:
    try:
        value = float(word)
    except ValueError:
        raise InputError(
            f"{shown(word, 30)!r} is no number", place=place, mend="write coordinates in angstrom"
        ) from None
    if not isfinite(value):
        raise InputError(f"the coordinate {shown(word, 30)} is not finite", place=place, mend="write a number")
    return value


def element_symbol(word: str, place: str) -> str:
    """Chemical symbol from a symbol in any case, a label such as ``V1``, or an atomic number.

    Raises
    ------
    InputError
        If it is none of them.
    """
    if re.fullmatch(r"\d{1,3}", word, re.ASCII) and 1 <= int(word) <= len(ELEMENT_SYMBOLS):
        return ELEMENT_SYMBOLS[int(word) - 1]
    match = _LABEL.fullmatch(word)
    symbol = match[1].capitalize() if match else word
    symbol = _ISOTOPES.get(symbol, symbol)
    if symbol not in ELEMENT_SYMBOLS:
        raise InputError(
            f"unknown element {shown(word, 20)!r}", place=place, mend="write a chemical symbol such as V or O"
        )
    return symbol


def extended_atoms(frame: XyzFrame, place: str) -> Atoms:
    """ASE atoms of an extended frame, with its info and cell.

    Raises
    ------
    InputError
        If ASE cannot read it; it names the frame's first line.
    """
    from ase.io.extxyz import read_xyz

    where = f"{place}, line {frame.first_line + 1}"
    text = "\n".join((str(len(frame.rows)), frame.comment, *frame.rows)) + "\n"
    try:
        atoms = next(read_xyz(io.StringIO(text), index=slice(None)))
    except Exception as error:
        raise InputError(
            f"extended XYZ that cannot be read ({shown(error)})",
            place=where,
            mend="check Properties= and the columns of the frame",
        ) from error
    if len(atoms) != len(frame.rows):
        raise InputError(
            "extended XYZ with another number of atoms than counted", place=where, mend="correct the frame"
        )
    return atoms
