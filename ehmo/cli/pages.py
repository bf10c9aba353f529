"""The options that write a report as a page."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from ehmo.cli.output import same_file, write_whole
from ehmo.errors import InputError

if TYPE_CHECKING:
    from basis_params import ParameterTable
    from ehmo.records.crosscheck import Crosscheck
    from ehmo.records.crystal_report import CrystalReport
    from ehmo.records.report import BondReport
    from ehmo.records.scan import Scan


def add_page_option(parser: argparse.ArgumentParser) -> None:
    """Option of every command that can write a page."""
    parser.add_argument(
        "--page", metavar="OUT.html", help="also write a page for any browser, with channels and orbitals in 3-D"
    )


def add_scan_option(parser: argparse.ArgumentParser) -> None:
    """Option of a command whose page can show a scan."""
    parser.add_argument("--scan", metavar="SCAN.json", help="show this scan of the same atoms on the page")


def check_page(chosen: argparse.Namespace, structures: int, mend: str) -> None:
    """Refuse a page that cannot be written before anything is calculated.

    Parameters
    ----------
    chosen : Namespace
    structures : int
        How many there are to show.
    mend : str
        What to do about several.

    Raises
    ------
    InputError
        If the path is empty or one of the other files, or if there are several structures.
    """
    if chosen.page in ("", "-"):
        raise InputError("--page needs a path", mend="give a file name such as report.html")
    if same_file(chosen.page, chosen.file):
        raise InputError("--page would overwrite the structure file", place=chosen.page, mend="give another file name")
    if same_file(chosen.page, getattr(chosen, "scan", None)):
        raise InputError("--page would overwrite the scan", place=chosen.page, mend="give another file name")
    if chosen.page == chosen.json:
        raise InputError("--page and --json name one file", place=chosen.page, mend="give two file names")
    if structures != 1:
        raise InputError(f"a page shows one structure, and there are {structures}", place=chosen.file, mend=mend)


def check_view() -> None:
    """Refuse a page with orbitals where a library is missing, before anything is calculated.

    Raises
    ------
    InputError
        If it is.
    """
    from ehmo.report.page.frame import plotting_library

    plotting_library()


def scan_for_page(chosen: argparse.Namespace, labels: tuple[str, ...]) -> Scan | None:
    """Scan that the page shall show.

    Raises
    ------
    InputError
        If it is given without a page, cannot be read, or is of other atoms.
    """
    path = getattr(chosen, "scan", None)
    if path is None:
        return None
    if chosen.page is None:
        raise InputError("--scan is for a page", mend="give --page too, or leave it out")
    from ehmo.report.scan_reading import read_scan

    scan = read_scan(path, max_bytes=chosen.max_bytes)
    if scan.labels != labels:
        raise InputError("the scan is of other atoms", place=path, mend=f"give a scan of {chosen.file}")
    return scan


def write_page(
    chosen: argparse.Namespace,
    report: BondReport,
    table: ParameterTable,
    *,
    crosscheck: Crosscheck | None = None,
    scan: Scan | None = None,
) -> None:
    """Write the page of a report."""
    from ehmo.report.page.whole import bond_page

    write_whole(chosen.page, bond_page(report, table, crosscheck=crosscheck, scan=scan))


def write_crystal_page(chosen: argparse.Namespace, report: CrystalReport, table: ParameterTable) -> None:
    """Write the page of a report on an extended structure."""
    from ehmo.report.page.crystal import crystal_page

    write_whole(chosen.page, crystal_page(report, table))
