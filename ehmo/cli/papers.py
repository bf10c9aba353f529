"""Options ``--table`` and ``--cite``: what goes into a paper, in place of the report."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from typing import TYPE_CHECKING

from ehmo.errors import InputError

if TYPE_CHECKING:
    from basis_params import ParameterTable
    from ehmo.records.crystal_report import CrystalReport
    from ehmo.records.report import BondReport

TABLE_FORMATS = ("latex", "markdown", "csv")
"""Said here too, so that reading the command line loads no numerics; a test compares it with the writers' own."""


def add_paper_options(parser: argparse.ArgumentParser) -> None:
    """Options of a command that reports on bonds."""
    group = parser.add_argument_group("for a paper, in place of the report").add_mutually_exclusive_group()
    group.add_argument("--table", choices=TABLE_FORMATS, help="the bonds as a table")
    group.add_argument(
        "--cite",
        nargs="?",
        const="text",
        choices=("text", "bibtex"),
        help="method paragraph with the works that this run used, or these as BibTeX",
    )


def check_paper_options(chosen: argparse.Namespace) -> None:
    """Refuse two things on one standard output.

    Raises
    ------
    InputError
        If the JSON is to go there too.
    """
    name = next((name for name in ("table", "cite") if getattr(chosen, name, None) is not None), None)
    if name is not None and chosen.json == "-":
        raise InputError(f"--{name} and --json - both take the standard output", mend="give --json a file name")


def paper_text(
    reports: Sequence[BondReport | CrystalReport], tables: Sequence[ParameterTable], chosen: argparse.Namespace
) -> str | None:
    """Text that was asked for in place of reports, each with its parameter set; None if none was."""
    if getattr(chosen, "table", None) is not None:
        from ehmo.report.bond_table import bond_table

        return bond_table(reports, chosen.table)
    if getattr(chosen, "cite", None) is None:
        return None
    from ehmo.records.crystal_report import CrystalReport
    from ehmo.report.bibtex import bibtex
    from ehmo.report.method import crystal_paragraph, method_paragraph

    found = [
        crystal_paragraph(report, table) if isinstance(report, CrystalReport) else method_paragraph(report, table)
        for report, table in zip(reports, tables, strict=True)
    ]
    if chosen.cite == "bibtex":
        return bibtex(key for paragraph in found for key in paragraph.keys)
    # Structures that were calculated alike share a paragraph.
    return "\n\n".join(dict.fromkeys(str(paragraph) for paragraph in found)) + "\n"
