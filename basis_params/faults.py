"""The error of a table that cannot be read, and the reading of one cell."""

from __future__ import annotations

import csv
import io
import math
from dataclasses import dataclass, field
from pathlib import Path

MAX_BYTES = 10_000_000
FAULTS_SHOWN = 20


class ParameterFileError(ValueError):
    """A table that cannot be read; holds every fault found, each with its line and mend.

    Attributes
    ----------
    origin : str
        Path of the file.
    faults : tuple of str
    """

    def __init__(self, origin: str, faults: tuple[str, ...]) -> None:
        super().__init__(origin, faults)
        self.origin = origin
        self.faults = faults

    def __str__(self) -> str:
        more = len(self.faults) - FAULTS_SHOWN
        tail = f"; and {more} more" if more > 0 else ""
        origin = self.origin if self.origin.isprintable() else ascii(self.origin)
        return f"{origin}: " + "; ".join(self.faults[:FAULTS_SHOWN]) + tail


def shown(text: str) -> str:
    """Return text from a file quoted, cut to 40 characters and with control characters escaped."""
    return ascii(text if len(text) <= 40 else text[:37] + "...")


@dataclass
class FaultList:
    """Collects the faults of one file so that the user sees them all at once."""

    origin: str
    faults: list[str] = field(default_factory=list)

    def add(self, line: int, text: str) -> None:
        """Note one fault of one line."""
        self.faults.append(f"line {line}: {text}")

    def raise_if_any(self) -> None:
        """Raise everything collected so far.

        Raises
        ------
        ParameterFileError
        """
        if self.faults:
            raise ParameterFileError(self.origin, tuple(self.faults))


def read_text(path: Path) -> str:
    """Return the text of a table file.

    Raises
    ------
    FileNotFoundError, ParameterFileError
    """
    if not path.exists():
        raise FileNotFoundError(f"{str(path)!a}: no such file: check the path of the table")
    if not path.is_file():
        raise ParameterFileError(str(path), ("not a file: give the path of a CSV table",))
    if path.stat().st_size > MAX_BYTES:
        raise ParameterFileError(str(path), (f"larger than {MAX_BYTES} bytes: no parameter table is",))
    raw = path.read_bytes()
    try:
        text = raw.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = raw[: error.start].count(b"\n") + 1
        raise ParameterFileError(str(path), (f"line {line}: not UTF-8 text: save as CSV",)) from error
    if "\0" in text:
        raise ParameterFileError(str(path), ("binary data, not text: save the table as CSV",))
    if not text.strip():
        raise ParameterFileError(str(path), ("the file is empty: start from a copy of the standard table",))
    return text


@dataclass(frozen=True)
class Row:
    """Cells of one line by column, with the number of that line."""

    line: int
    cells: dict[str, str]


def split_rows(text: str, first_line: int, faults: FaultList) -> tuple[tuple[str, ...], list[Row]]:
    """Split CSV text into its header and rows; a row of the wrong length is a fault."""
    reader = csv.reader(io.StringIO(text), strict=True)
    header: tuple[str, ...] = ()
    rows: list[Row] = []
    try:
        for values in reader:
            line = first_line - 1 + reader.line_num
            stripped = [value.strip() for value in values]
            if not any(stripped):
                continue
            if not header:
                header = tuple(stripped)
            elif len(stripped) != len(header):
                faults.add(line, f"{len(stripped)} cells under a header of {len(header)}: mend the commas")
            else:
                rows.append(Row(line, dict(zip(header, stripped, strict=True))))
    except csv.Error as error:
        faults.add(first_line - 1 + reader.line_num, f"not valid CSV ({error}): check the quotes")
    return header, rows


def number(text: str, what: str, line: int, faults: FaultList) -> float:
    """Return a finite number; a fault and 0.0 if the text is none."""
    try:
        value = float(text)
    except ValueError:
        faults.add(line, f"{what} is {shown(text)}: write a number")
        return 0.0
    if not math.isfinite(value):
        faults.add(line, f"{what} is {shown(text)}: write a finite number")
        return 0.0
    return value


def plain_text(text: str, what: str, line: int, faults: FaultList) -> str:
    """Return a text cell; empty cells, control characters and spreadsheet formulas are faults."""
    if not text:
        faults.add(line, f"{what} is empty: say where the row comes from")
    elif not text.isprintable():
        faults.add(line, f"{what} {shown(text)} holds control characters: remove them")
    elif text[0] in "=+-@":
        faults.add(line, f"{what} {shown(text)} starts like a spreadsheet formula: put a word first")
    return text
