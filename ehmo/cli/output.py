"""Files written whole or not at all."""

from __future__ import annotations

import contextlib
import os
import tempfile
from collections.abc import Iterator
from pathlib import Path

from ehmo.errors import InputError


def write_whole(path: str | Path, content: str | bytes) -> None:
    """Write a file so that a failure leaves no half of it behind.

    Parameters
    ----------
    path : str or Path
        Target.
    content : str or bytes
        Text is written as UTF-8.

    Raises
    ------
    InputError
        If the folder is missing, not writable, or the disk is full.
    """
    with whole_file(path) as place:
        place.write_bytes(content.encode() if isinstance(content, str) else content)


@contextlib.contextmanager
def whole_file(path: str | Path) -> Iterator[Path]:
    """Place to write to that takes the name of the target at the end, and leaves nothing behind on a failure.

    The place is a temporary file in the same folder. A link keeps pointing where it does; a pipe or a device is
    written to and never replaced.

    Parameters
    ----------
    path : str or Path
        Target.

    Yields
    ------
    place : Path
        Where to write.

    Raises
    ------
    InputError
        If the folder is missing, not writable, or the disk is full.
    """
    temporary: Path | None = None
    try:
        target = _resolved(path)
        if target.exists() and not target.is_file():
            yield target
            return
        temporary = _temporary(target)
        yield temporary
        _give_usual_permissions(temporary)
        temporary.replace(target)
    except BaseException as fault:
        if temporary is not None:
            temporary.unlink(missing_ok=True)
        if isinstance(fault, OSError):
            raise _not_written(path, fault) from fault
        raise


def _resolved(path: str | Path) -> Path:
    try:
        return Path(path).resolve()
    except (ValueError, RuntimeError) as fault:  # a null character; a loop of links
        raise _not_written(path, fault) from fault


def _not_written(path: str | Path, fault: Exception) -> InputError:
    return InputError(
        f"cannot write the file ({getattr(fault, 'strerror', None) or fault})",
        place=str(path),
        mend="choose a folder that exists, is writable and has room",
    )


def _temporary(target: Path) -> Path:
    """Empty file beside the target."""
    with tempfile.NamedTemporaryFile("w", dir=target.parent, prefix=f".{target.name}.", delete=False) as file:
        return Path(file.name)


def _give_usual_permissions(path: Path) -> None:
    """Temporary files are private; the result should have the permissions of any new file."""
    mask = os.umask(0)
    os.umask(mask)
    path.chmod(0o666 & ~mask)


def same_file(first: str, second: str | None) -> bool:
    """Whether two paths name one existing file.

    Parameters
    ----------
    first : str
    second : str or None

    Returns
    -------
    same : bool
    """
    if second is None:
        return False
    try:
        return Path(first).samefile(second)
    except (OSError, ValueError):
        return False
