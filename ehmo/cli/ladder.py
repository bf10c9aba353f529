"""``ehmo ladder``: d-orbital ladder, terms, bands and magnetism of a structure file."""

from __future__ import annotations

import argparse
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from ehmo.cli import bond
from ehmo.cli.structures import add_structure_options, chosen_fragments, listing
from ehmo.errors import InputError

if TYPE_CHECKING:
    from ehmo.records.report import BondReport


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    parser = commands.add_parser(
        "ladder",
        help="d-orbital ladder, terms, bands and g values of a structure file",
        description="Ladder, ligand-field parameters, terms, bands and magnetism of each structure in a file.",
    )
    parser.add_argument("file", metavar="FILE", help="XYZ, extended XYZ or CIF file")
    add_structure_options(parser)
    bond.add_calculation_options(parser)
    bond.add_spread_option(parser)
    spectrum = parser.add_argument_group("spectrum")
    spectrum.add_argument(
        "--bands",
        metavar="LIST",
        help="observed bands within the shell, assigned and fitted [cm-1]: 13000,16000 or 2E:13000,2B1:16000",
    )
    spectrum.add_argument("--racah-b", type=float, metavar="B", help="Racah B in cm-1 (default: free ion, reduced)")
    parser.add_argument("--json", metavar="PATH", help="also write the report as JSON; - prints it instead of the text")
    parser.set_defaults(handler=run)


def run(chosen: argparse.Namespace) -> str:
    """Ladder text of each structure in the file; the JSON is that of the whole report."""
    if chosen.list:
        return listing(chosen)
    bands = observed_bands(chosen.bands)
    options = replace(
        bond.calculation_options(chosen),
        observed_bands_per_cm=tuple(value for _, value in bands),
        observed_terms=tuple(term for term, _ in bands),
        racah_B_per_cm=chosen.racah_b,
    )
    return bond.report_on(chosen_fragments(chosen), chosen, options, _text)


def _text(report: BondReport) -> str:
    from ehmo.report.cautions import CAUTIONS
    from ehmo.report.ladder_text import ladder_text
    from ehmo.report.spread_text import draw_lines
    from ehmo.report.text import heading_lines, sentence_lines

    parts = ["\n".join(heading_lines(report)), ladder_text(report).rstrip()]
    if report.spread is not None:
        parts.append("\n".join(draw_lines(report)))
    parts.append("\n".join(sentence_lines("Assumed", report.assumptions)))
    if report.warnings:
        parts.append("\n".join(sentence_lines("To doubt", report.warnings)))
    parts.append("\n".join(sentence_lines("Cautions", CAUTIONS)))
    return "\n\n".join(parts) + "\n"


def observed_bands(words: str | None) -> list[tuple[str, float]]:
    """Upper term (empty if not named) and wavenumber of each observed band.

    Raises
    ------
    InputError
        If a word is no band.
    """
    found = []
    for word in (words or "").replace(";", ",").split(","):
        if not word.strip():
            continue
        term, _, number = word.rpartition(":")
        try:
            found.append((term.strip(), float(number)))
        except ValueError:
            raise InputError(
                f"--bands {words!r} are no bands", mend="give wavenumbers in cm-1, such as 13000,16000 or 2E:13000"
            ) from None
    return found
