"""Bytes of an input file, checked, and text from files made fit for one line of a message."""

from __future__ import annotations

from pathlib import Path

from ehmo.errors import InputError, LimitError, visible

MAX_ATOMS = 10_000
"""Default limit of atoms in one frame or crystal cell."""

MAX_BYTES = 100_000_000
"""Default limit of the size of a file [byte]."""

_SQLITE_HEADER = b"SQLite format 3\0"


def shown(text: object, limit: int = 60) -> str:
    """Text from a file on one line: control characters shown, blanks squeezed, cut to a length."""
    line = visible(" ".join(str(text).split()))
    return line if len(line) <= limit else line[: limit - 3] + "..."


def is_ase_database(path: Path) -> bool:
    """Whether a file is a SQLite file, as an ASE database is."""
    try:
        with path.open("rb") as file:
            return file.read(len(_SQLITE_HEADER)) == _SQLITE_HEADER
    except (OSError, ValueError):
        return False


def read_text(path: Path, max_bytes: int = MAX_BYTES) -> str:
    """Text of an input file.

    Parameters
    ----------
    path : Path
        File to read.
    max_bytes : int
        Largest size allowed [byte].

    Returns
    -------
    text : str
        Decoded, without byte-order mark.

    Raises
    ------
    InputError
        If there is no such file, or it is empty, binary or unreadable.
    LimitError
        If it is larger than `max_bytes`.
    """
    place = shown(path, 200)
    try:
        if path.is_dir():
            raise InputError("that is a folder", place=place, mend="give a file")
        size = path.stat().st_size
        if size > max_bytes:
            raise LimitError(
                f"{size} bytes, the limit is {max_bytes}", place=place, mend="raise max_bytes (--max-bytes)"
            )
        raw = path.read_bytes()
    except FileNotFoundError:
        raise InputError("no such file", place=place, mend="check the path") from None
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) else str(error)
        raise InputError(f"cannot be read ({shown(reason)})", place=place, mend="check the path") from None
    return decoded(raw, place)


def decoded(raw: bytes, place: str) -> str:
    """Text of the bytes of an input file, or of a piece of one, without byte-order mark.

    Raises
    ------
    InputError
        If they are empty or binary.
    """
    if not raw.strip():
        raise InputError("the file is empty", place=place, mend="give a file with atoms")
    if b"\0" in raw:
        raise InputError("the file is binary", place=place, mend="give a text file such as XYZ or CIF")
    try:
        return raw.decode("utf-8-sig")
    except UnicodeDecodeError:
        # Latin-1 names of authors and compounds are common in old files; it decodes any byte.
        return raw.decode("latin-1")
