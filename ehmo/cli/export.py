"""``ehmo export``: a store as tables, full records or structures for other programs."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING, Any

from ehmo.cli.output import same_file, whole_file
from ehmo.cli.stores import add_store_options, opened, shown_count
from ehmo.errors import InputError

if TYPE_CHECKING:
    from ehmo.report.export import Exported


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    parser = commands.add_parser(
        "export",
        help="write a store as CSV, Parquet, JSON, extended XYZ or an ASE database",
        description="Write what a store holds as a table with one row per bond or per structure, as full records, "
        "or as structures.",
    )
    add_store_options(parser)
    parser.add_argument("--to", required=True, metavar="FILE", help="target: .csv, .parquet, .json, .xyz or .db (ASE)")
    parser.add_argument(
        "--rows",
        choices=("bonds", "structures", "records"),
        help="rows of a table, or full records (.json alone has the choice of all three; default: bonds)",
    )
    parser.add_argument("--columns", metavar="A,B,...", help="only these columns of the table, in this order")
    parser.set_defaults(handler=run)


def run(chosen: argparse.Namespace) -> str:
    """Write the file; the text says what went into it."""
    from ehmo.report.export import Selection, chosen_columns, export_format
    from ehmo.store import condition

    if not chosen.to:
        raise InputError("--to needs a path", mend="give a file name")
    made = export_format(chosen.to)
    rows = chosen.rows or made.rows[0]
    if rows not in made.rows:
        raise InputError(f"{made.name} has no rows of {rows}", place="--rows", mend=f"use {' or '.join(made.rows)}")
    names = None if chosen.columns is None else [name.strip() for name in chosen.columns.split(",")]
    where = None if chosen.where is None else condition(chosen.where)
    selection = Selection(rows, where, chosen_columns(rows, names))
    if same_file(chosen.store, chosen.to):
        raise InputError("that is the store itself", place=chosen.to, mend="give another file")
    with opened(chosen) as store, whole_file(chosen.to) as place:
        done = made.write(store, selection, place)
        return f"{chosen.to}: {_in_words(rows, done)} of {store.name}\n"


def _in_words(rows: str, done: Exported) -> str:
    kind = "structures" if rows == "records" else rows
    left = f" ({shown_count(done.left_out, 'failed structures')} left out)" if done.left_out else ""
    return f"{shown_count(done.rows, kind)}{left}"
