"""Files of a folder and below, and what leads out of it."""

from __future__ import annotations

import os
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Final

FOLDER_SUFFIXES: Final = frozenset({".xyz", ".extxyz", ".cif", ".mcif", ".mol", ".sdf", ".pdb"})
"""Suffixes by which files of a folder are taken; others must be named."""

LEADS_OUT: Final = "the link or path leads out of the folder\nname the file itself, or allow it with --allow-outside"


@dataclass(frozen=True, slots=True)
class SourceFile:
    """A file of a source.

    Attributes
    ----------
    path : str
        As it was given.
    charge, unpaired_electrons : int or None
    tags : tuple of str
    fault : str
        Why it cannot be used, and on a second line the mend; empty if it can be tried.
    """

    path: str
    charge: int | None = None
    unpaired_electrons: int | None = None
    tags: tuple[str, ...] = ()
    fault: str = ""

    @property
    def size(self) -> int:
        """Bytes; 0 if it cannot be told."""
        try:
            return os.stat(self.path).st_size  # noqa: PTH116  a Path per file costs more than the call
        except (OSError, ValueError):
            return 0


def folder_files(folder: Path, *, allow_outside: bool) -> Iterator[SourceFile]:
    """Structure files of a folder and its sub-folders in the order of their names.

    Links to files within the folder are followed; those that lead out of it are faults unless allowed. Linked folders
    are entered only if that is allowed, each real folder once.

    Yields
    ------
    file : SourceFile
    """
    seen: set[tuple[int, int]] = set()
    yield from _walk(folder, folder, seen, allow_outside=allow_outside)


def _walk(folder: Path, root: Path, seen: set[tuple[int, int]], *, allow_outside: bool) -> Iterator[SourceFile]:
    try:
        status = folder.stat()
        entries = sorted(os.scandir(folder), key=lambda entry: entry.name)
    except OSError as fault:
        yield SourceFile(str(folder), fault=f"the folder cannot be read ({fault.strerror})\ncheck its permissions")
        return
    identity = (status.st_dev, status.st_ino)
    if identity in seen:
        return
    seen.add(identity)
    for entry in entries:
        path = folder / entry.name
        if entry.is_dir(follow_symlinks=False) or (allow_outside and entry.is_dir()):
            yield from _walk(path, root, seen, allow_outside=allow_outside)
        elif path.suffix.lower() in FOLDER_SUFFIXES and not entry.is_dir():
            leads_out = outside(path, root) if entry.is_symlink() and not allow_outside else ""
            yield SourceFile(str(path), fault=leads_out)


def outside(path: Path, root: Path) -> str:
    """Why a path may not be followed: it leads out of the root; empty if it stays within."""
    try:
        within = path.resolve().is_relative_to(root.resolve())
    except (OSError, ValueError, RuntimeError):
        within = False
    return "" if within else LEADS_OUT
