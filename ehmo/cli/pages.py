"""The option that writes a report as a page."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from ehmo.cli.output import same_file, write_whole
from ehmo.errors import InputError

if TYPE_CHECKING:
    from basis_params import ParameterTable
    from ehmo.records.report import BondReport


def add_page_option(parser: argparse.ArgumentParser) -> None:
    """Option of every command that can write a page."""
    parser.add_argument(
        "--page", metavar="OUT.html", help="also write a page for any browser, with channels and orbitals in 3-D"
    )


def check_page(chosen: argparse.Namespace, structures: int) -> None:
    """Refuse a page that cannot be written before anything is calculated.

    Raises
    ------
    InputError
        If the path is empty or one of the other files, if there are several structures, or if a library is missing.
    """
    from ehmo.report.page.whole import plotting_library

    if chosen.page in ("", "-"):
        raise InputError("--page needs a path", mend="give a file name such as report.html")
    if same_file(chosen.page, chosen.file):
        raise InputError("--page would overwrite the structure file", place=chosen.page, mend="give another file name")
    if chosen.page == chosen.json:
        raise InputError("--page and --json name one file", place=chosen.page, mend="give two file names")
    if structures != 1:
        raise InputError(
            f"a page shows one structure, and there are {structures}",
            place=chosen.file,
            mend="choose one with --pick (--list shows them)",
        )
    plotting_library()


def write_page(chosen: argparse.Namespace, report: BondReport, table: ParameterTable) -> None:
    """Write the page of a report."""
    from ehmo.report.page.whole import bond_page

    write_whole(chosen.page, bond_page(report, table))
