"""``ehmo merge``: the rows of several stores in one."""

from __future__ import annotations

import argparse
import contextlib
from typing import Any

from ehmo.cli.output import same_file
from ehmo.cli.stores import add_wait_option, must_be_named, open_for_reading, shown_count
from ehmo.errors import InputError


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    parser = commands.add_parser(
        "merge",
        help="copy the rows of several stores into one",
        description="Copy the rows of stores, such as those of a job array, into one that is made if it is not there. "
        "A key that several have is kept once: a done row before a failed one, of two failed ones the later.",
    )
    parser.add_argument("into", metavar="INTO", help="SQLite file, or postgresql://[user@]host/database")
    parser.add_argument("stores", nargs="+", metavar="STORE", help="stores to copy from; they are not changed")
    add_wait_option(parser)
    parser.set_defaults(handler=run)


def run(chosen: argparse.Namespace) -> str:
    """Merge the stores; the text counts what came from each."""
    from ehmo.records.table import aligned
    from ehmo.store import merge, open_store

    must_be_named(chosen.into)
    for place, location in enumerate(chosen.stores):
        if location == chosen.into or same_file(location, chosen.into):
            raise InputError("is to be merged into itself", place=_masked(location), mend="leave it out of the stores")
        if any(location == other or same_file(location, other) for other in chosen.stores[:place]):
            raise InputError("is named twice", place=_masked(location), mend="name it once")
    with contextlib.ExitStack() as open_ones:
        # All are opened before anything is written, so that a wrong name costs nothing.
        sources = [open_ones.enter_context(open_for_reading(location, chosen.wait)) for location in chosen.stores]
        into = open_ones.enter_context(open_store(chosen.into, create=True, wait_s=chosen.wait))
        rows: list[tuple[str, ...]] = [("store", "rows", "new", "in place of a failed one", "there already")]
        for source in sources:
            written = merge(into, source)
            rows.append((source.name, *(f"{number:,}" for number in (sum(written), *written))))
        counts = " and ".join(shown_count(count, f"{status} rows") for status, count in into.counts().items())
        return "\n".join([*aligned(rows, (1, 2, 3, 4)), "", f"{into.name} has {counts or 'no rows'}."]) + "\n"


def _masked(location: str) -> str:
    from ehmo.store import masked

    return masked(location)
