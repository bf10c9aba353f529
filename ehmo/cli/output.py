"""Files written whole or not at all."""

from __future__ import annotations

import os
import tempfile
from pathlib import Path

from ehmo.errors import InputError


def write_whole(path: str | Path, content: str | bytes) -> None:
    """Write a file so that a failure leaves no half of it behind.

    The content goes to a temporary file in the same folder, which then takes the name of the target. A link keeps
    pointing where it does; a pipe or a device is written to and never replaced.

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
    target = Path(path)
    temporary: str | None = None
    try:
        raw = content.encode() if isinstance(content, str) else content
        target = target.resolve()
        if target.exists() and not target.is_file():
            target.write_bytes(raw)
            return
        with tempfile.NamedTemporaryFile(dir=target.parent, prefix=f".{target.name}.", delete=False) as file:
            temporary = file.name
            file.write(raw)
        _give_usual_permissions(temporary)
        Path(temporary).replace(target)
    except (OSError, ValueError, RuntimeError) as fault:  # ValueError: a null character; RuntimeError: a loop of links
        if temporary is not None:
            Path(temporary).unlink(missing_ok=True)
        raise InputError(
            f"cannot write the file ({getattr(fault, 'strerror', None) or fault})",
            place=str(path),
            mend="choose a folder that exists, is writable and has room",
        ) from fault


def _give_usual_permissions(path: str) -> None:
    """Temporary files are private; the result should have the permissions of any new file."""
    mask = os.umask(0)
    os.umask(mask)
    Path(path).chmod(0o666 & ~mask)


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
