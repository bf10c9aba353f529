"""A bond or a metal chosen by its label."""

from __future__ import annotations

from collections.abc import Sequence

from ehmo.errors import InputError


def labelled(labels: Sequence[str], words: str, place: str, *, things: str = "bonds") -> int:
    """Place of a bond among labels such as ``V1-O2``, either way round, or of a metal.

    Parameters
    ----------
    labels : sequence of str
    words : str
        As people type it.
    place : str
        File, for the message.
    things : str
        What the labels name, in the plural.

    Returns
    -------
    place : int

    Raises
    ------
    InputError
        If there is none.
    """
    wanted = words.strip().lower()
    for k, label in enumerate(labels):
        if wanted in (label.lower(), "-".join(reversed(label.lower().split("-")))):
            return k
    some = ", ".join(labels[:6]) + (" ..." if len(labels) > 6 else "")
    raise InputError(f"there is no {things[:-1]} {words!r}", place=place, mend=f"{things} are {some}")
