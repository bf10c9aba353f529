"""``ehmo summary``: what a store holds."""

from __future__ import annotations

import argparse
from typing import Any

from ehmo.cli.output import same_file, write_whole
from ehmo.cli.stores import add_store_options, opened
from ehmo.errors import InputError


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    parser = commands.add_parser(
        "summary",
        help="what a store holds: counts, failures by reason, bond orders by metal and donor, outliers",
        description="Counts, failures by reason, bond orders by metal and kind of donor, and outliers.",
    )
    add_store_options(parser)
    parser.add_argument("--json", metavar="PATH", help="also write it as JSON; - prints the JSON instead")
    parser.add_argument(
        "--page", metavar="OUT.html", help="also write a page with order against length by metal and donor"
    )
    parser.set_defaults(handler=run)


def run(chosen: argparse.Namespace) -> str:
    """Text of the summary."""
    from ehmo.report.summary_document import summary_json
    from ehmo.report.summary_text import summary_text
    from ehmo.store import condition, summarise

    for name in ("json", "page"):
        path = getattr(chosen, name)
        if path == "":
            raise InputError(f"--{name} needs a path", mend="give a file name")
        if same_file(chosen.store, path):
            raise InputError("that is the store itself", place=path, mend="give another file")
    where = None if chosen.where is None else condition(chosen.where)
    with opened(chosen) as store:
        summary = summarise(store, where)
        page = None
        if chosen.page is not None:
            from ehmo.report.page.store import store_page
            from ehmo.store.distributions import bond_points

            page = store_page(summary, bond_points(store, where))
    if page is not None:
        write_whole(chosen.page, page)
    if chosen.json == "-":
        return summary_json(summary)
    if chosen.json is not None:
        write_whole(chosen.json, summary_json(summary))
    return summary_text(summary)
