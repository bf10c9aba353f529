"""A file cut into work items: frames of XYZ, data blocks of CIF, other files whole.

Only lines are looked at here; what they mean is found out where the work is done. One piece is held at a time.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from functools import partial
from pathlib import Path
from typing import Any, Final, TextIO

from ehmo.batch.items import WorkItem
from ehmo.batch.tree import SourceFile
from ehmo.errors import EhmoError
from ehmo.structure import ase_database_numbers, is_ase_database
from ehmo.structure.files import shown
from ehmo.structure.readers import CIF_SUFFIXES, XYZ_SUFFIXES

_BLOCK: Final = re.compile(r"\s*data_(\S*)", re.IGNORECASE)
_SITES: Final = re.compile(r"_atom_site[_.]fract_x", re.IGNORECASE)
_COUNT: Final = re.compile(r"\s*(\d{1,9})\s*", re.ASCII)
_BYTE_ORDER_MARK: Final = "\xef\xbb\xbf"

LONGEST_LINE: Final = 1_000_000
"""Characters of a line; whoever writes longer ones has no structure file."""


class _TooLargeError(Exception):
    """A piece that is over the limit."""


def pieces(file: SourceFile, *, max_atoms: int, max_bytes: int) -> Iterator[WorkItem]:
    """Work items of a file.

    Parameters
    ----------
    file : SourceFile
    max_atoms : int
        Frames with more atoms are passed over but for their first line, which makes their row say so.
    max_bytes : int
        Size allowed of one piece.

    Yields
    ------
    item : WorkItem
    """
    shared: dict[str, Any] = {
        "source": file.path,
        "charge": file.charge,
        "unpaired_electrons": file.unpaired_electrons,
        "tags": file.tags,
    }
    if file.fault:
        yield WorkItem(**shared, kind="fault", text=file.fault)
        return
    suffix = Path(file.path).suffix.lower()
    try:
        if suffix in XYZ_SUFFIXES:
            yield from _cut(file.path, partial(_frames, shared, max_atoms), shared, max_bytes)
        elif suffix in CIF_SUFFIXES:
            yield from _cut(file.path, partial(_blocks, shared), shared, max_bytes)
        else:
            yield from _whole(file.path, shared)
    except FileNotFoundError:
        yield WorkItem(**shared, kind="fault", text="no such file\ncheck the path")
    except IsADirectoryError:
        yield WorkItem(**shared, kind="fault", text="that is a folder\ngive a file")
    except (OSError, ValueError) as fault:
        reason = fault.strerror if isinstance(fault, OSError) else str(fault)
        yield WorkItem(**shared, kind="fault", text=f"cannot be read ({shown(reason)})\ncheck the path")


def _whole(path: str, shared: dict[str, Any]) -> Iterator[WorkItem]:
    """A file to read where the work is done, or the rows of an ASE database."""
    status = Path(path).stat()
    stamp = f"{status.st_size} {status.st_mtime_ns}"
    if not is_ase_database(Path(path)):
        yield WorkItem(**shared, text=stamp, size=status.st_size)
        return
    try:
        numbers = list(ase_database_numbers(Path(path)))
        part = status.st_size // max(1, len(numbers))
        for number in numbers:
            yield WorkItem(**shared, entry=f"row {number}", kind="row", text=stamp, number=number, size=part)
    except EhmoError as fault:
        yield WorkItem(**shared, kind="fault", text=f"{fault.fault}\n{fault.mend}", size=status.st_size)


def _cut(
    path: str, cut: Callable[[_Lines], Iterator[WorkItem]], shared: dict[str, Any], max_bytes: int
) -> Iterator[WorkItem]:
    # Latin-1 keeps every byte as one character; the encoding is settled where the text is read.
    with Path(path).open(encoding="latin-1") as opened:
        try:
            yield from cut(_Lines(opened, max_bytes))
        except _TooLargeError:
            words = f"a piece is larger than {max_bytes} bytes, or a line than {LONGEST_LINE}\nraise --max-bytes"
            yield WorkItem(**shared, kind="fault", text=words)


class _Lines:
    """Lines of a file, one looked ahead, with their numbers; a piece that grows too large raises."""

    def __init__(self, opened: TextIO, max_bytes: int) -> None:
        self._opened, self._max_bytes = opened, max_bytes
        self.number = 0
        self.left = max_bytes
        self.next = ""
        self.advance()
        self.next = self.next.removeprefix(_BYTE_ORDER_MARK)

    def advance(self) -> str:
        """The line looked ahead, which is empty at the end of the file; the next one is read."""
        line = self.next
        self.next = self._opened.readline(LONGEST_LINE + 1)
        self.number += bool(line)
        if len(self.next) > LONGEST_LINE:
            raise _TooLargeError
        return line

    def take(self) -> str:
        """The same for a line that becomes part of the piece."""
        line = self.advance()
        self.left -= len(line)
        if self.left < 0:
            raise _TooLargeError
        return line

    def start_piece(self) -> None:
        """Count the size anew."""
        self.left = self._max_bytes


def _frames(shared: dict[str, Any], max_atoms: int, lines: _Lines) -> Iterator[WorkItem]:
    number = 1
    while lines.next or number == 1:
        if number > 1 and not lines.next.strip():
            lines.advance()
            continue
        lines.start_piece()
        first_line = lines.number + 1
        head = lines.take()
        count = _COUNT.fullmatch(head.rstrip("\n"))
        whole = [head]
        wanted = int(count[1]) + 1 if count else 1
        if count and int(count[1]) > max_atoms:
            for _ in range(wanted):
                if not lines.advance():
                    break
        else:
            whole += [lines.take() for _ in range(wanted)]
        text = "".join(whole)
        yield WorkItem(
            **shared,
            entry=f"frame {number}" if number > 1 or lines.next.strip() else "",
            kind="xyz",
            text=text,
            first_line=first_line,
            number=number,
            size=len(text),
        )
        if count is None:
            return  # where the next frame starts cannot be told
        number += 1


def _blocks(shared: dict[str, Any], lines: _Lines) -> Iterator[WorkItem]:
    """Data blocks with atom sites; the last block if none has any, so that its row says what is missing."""
    found, waiting = 0, None
    for name, text, first_line in _block_texts(lines):
        item = WorkItem(**shared, entry=name, kind="cif", text=text, first_line=first_line, size=len(text))
        if not _SITES.search(text):
            waiting = item
            continue
        if found == 0 and not lines.next:
            item = WorkItem(**shared, kind="cif", text=text, first_line=first_line, size=len(text))
        found += 1
        yield item
    if not found:
        yield waiting or WorkItem(**shared, kind="cif")


def _block_texts(lines: _Lines) -> Iterator[tuple[str, str, int]]:
    """Name, text and first line of each block."""
    lines.start_piece()
    parts: list[str] = []
    name, first_line, in_text = "", 1, False
    while lines.next:
        begins = None if in_text else _BLOCK.match(lines.next)
        if begins:
            if parts and name:
                yield name, "".join(parts), first_line
                parts = []
                lines.start_piece()
            if not parts:
                first_line = lines.number + 1
            name = f"block {shown(begins[1], 30)}"
        if lines.next.startswith(";"):
            in_text = not in_text
        parts.append(lines.take())
    yield name, "".join(parts), first_line
