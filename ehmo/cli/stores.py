"""Options and words that the commands on stores share."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from ehmo.errors import InputError

if TYPE_CHECKING:
    from ehmo.store import Store

WAIT_S = 30.0


def add_store_options(parser: argparse.ArgumentParser) -> None:
    """Options of a command that reads one store."""
    parser.add_argument("store", metavar="STORE", help="SQLite file, or postgresql://[user@]host/database")
    parser.add_argument(
        "--where",
        metavar="CONDITION",
        help="only what meets it, such as \"metal = 'V' and kind = 'oxo' and mayer < 2\" (README has the columns)",
    )
    add_wait_option(parser)


def add_wait_option(parser: argparse.ArgumentParser) -> None:
    """Option of every command on a store."""
    parser.add_argument(
        "--wait",
        type=_seconds,
        default=WAIT_S,
        metavar="S",
        help=f"time to wait for another writer, or for a database that restarts ({WAIT_S:g}) [s]",
    )


def _seconds(text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = -1.0
    if not 0.0 <= value <= 86_400.0:
        raise argparse.ArgumentTypeError(f"{text!r} is no number of seconds from 0 to 86400")
    return value


def opened(chosen: argparse.Namespace) -> Store:
    """Store of the command, open for reading."""
    return open_for_reading(chosen.store, chosen.wait)


def open_for_reading(location: str, wait_s: float) -> Store:
    """Store at a location given on the command line.

    Parameters
    ----------
    location : str
    wait_s : float
        Time to wait for another writer [s].

    Returns
    -------
    store : Store

    Raises
    ------
    InputError
        If the location is empty.
    StoreError
        As for `open_store`.
    """
    from ehmo.store import open_store

    must_be_named(location)
    return open_store(location, read_only=True, wait_s=wait_s)


def must_be_named(location: str) -> None:
    """Refuse an empty location."""
    if not location:
        raise InputError("the store has no name", mend="give a file or a database")


def shown_count(count: int, things: str) -> str:
    """Count with its things in words, thousands set apart.

    Examples
    --------
    >>> shown_count(12345, "bonds"), shown_count(1, "bonds")
    ('12,345 bonds', '1 bond')
    """
    return f"{count:,} {things[:-1] if count == 1 and things.endswith('s') else things}"
