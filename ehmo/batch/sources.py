"""Sources on the command line to work items, one at a time, so that memory stays flat."""

from __future__ import annotations

import glob
import os
from collections.abc import Iterator, Sequence
from pathlib import Path

from ehmo.batch.items import WorkItem
from ehmo.batch.manifest import is_manifest, manifest_files
from ehmo.batch.pieces import pieces
from ehmo.batch.tree import SourceFile, folder_files, outside
from ehmo.errors import InputError
from ehmo.structure.files import shown


def work_items(
    sources: Sequence[str],
    *,
    allow_outside: bool = False,
    shard: tuple[int, int] = (1, 1),
    max_atoms: int = 10_000,
    max_bytes: int = 100_000_000,
) -> Iterator[WorkItem]:
    """Items of some sources in their order: files, folders with all that is below them, globs, manifests.

    Parameters
    ----------
    sources : sequence of str
        A file with the suffix ``.csv`` is a manifest.
    allow_outside : bool
        Follow links, and paths of a manifest, that lead out of the folder.
    shard : tuple of int
        Number and count: only every count-th item, starting with that number.
    max_atoms, max_bytes : int
        Limits of one item.

    Yields
    ------
    item : WorkItem
        Files that cannot be used come as items of the kind "fault".

    Raises
    ------
    InputError
        If a source does not exist, or a manifest cannot be used at all.
    """
    number, count = shard
    place = 0
    for file in source_files(sources, allow_outside=allow_outside):
        for item in pieces(file, max_atoms=max_atoms, max_bytes=max_bytes):
            if place % count == number - 1:
                yield item
            place += 1


def source_files(sources: Sequence[str], *, allow_outside: bool = False) -> Iterator[SourceFile]:
    """Files of some sources; arguments and errors as for `work_items`.

    Yields
    ------
    file : SourceFile
    """
    for source in sources:
        path = Path(source)
        if _exists(path) or not glob.has_magic(source):
            yield from _of_path(path, source, allow_outside=allow_outside)
        else:
            yield from _of_pattern(source, allow_outside=allow_outside)


def _exists(path: Path) -> bool:
    try:
        return path.exists()
    except (OSError, ValueError):
        return False


def _of_path(path: Path, source: str, *, allow_outside: bool) -> Iterator[SourceFile]:
    if not _exists(path):
        raise InputError("no such file or folder", place=shown(source, 200), mend="check the path")
    if path.is_dir():
        yield from folder_files(path, allow_outside=allow_outside)
    elif is_manifest(path):
        yield from manifest_files(path, allow_outside=allow_outside)
    else:
        yield SourceFile(source)


def _of_pattern(pattern: str, *, allow_outside: bool) -> Iterator[SourceFile]:
    found = sorted(glob.glob(pattern, recursive=True))  # noqa: PTH207  patterns may start anywhere
    if not found:
        raise InputError("no file fits the pattern", place=shown(pattern, 200), mend="check the path")
    root = Path(_fixed_part(pattern))
    for name in found:
        path = Path(name)
        if path.is_dir():
            continue
        fault = "" if allow_outside else outside(path, root)
        yield SourceFile(name, fault=fault)


def _fixed_part(pattern: str) -> str:
    """Folder before the first wildcard of a pattern."""
    parts = []
    for part in Path(pattern).parts[:-1]:
        if glob.has_magic(part):
            break
        parts.append(part)
    return os.path.join(*parts) if parts else "."  # noqa: PTH118  an absolute first part needs no special case here
