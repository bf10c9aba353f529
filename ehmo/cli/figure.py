"""``ehmo figure``: figures of a structure file for a paper."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING, Any

from ehmo.cli import bond
from ehmo.cli.output import same_file, write_whole
from ehmo.cli.structures import add_structure_options, chosen_fragments, listing
from ehmo.errors import InputError
from ehmo.report.figures.catalogue import FIGURE_KINDS

if TYPE_CHECKING:
    from ehmo.records.report import BondReport

_NARROWEST_MM, _WIDEST_MM = 60.0, 400.0


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    kinds = "; ".join(f"{kind.name}: {kind.words}" for kind in FIGURE_KINDS.values())
    parser = commands.add_parser(
        "figure",
        help="a figure for a paper, as SVG, PDF or PNG",
        description=f"A figure sized for a journal column. {kinds}.",
    )
    parser.add_argument("kind", choices=tuple(FIGURE_KINDS), metavar="KIND", help=", ".join(FIGURE_KINDS))
    parser.add_argument("file", metavar="FILE", help="XYZ, extended XYZ or CIF file")
    parser.add_argument("-o", "--output", metavar="OUT", help="file to write: .svg, .pdf or .png")
    parser.add_argument("--look", choices=("light", "dark"), default="light", help="for paper or for slides (light)")
    parser.add_argument("--width", type=float, default=84.0, metavar="MM", help="width on paper (84; two columns: 174)")
    parser.add_argument("--bond", metavar="M-X", help="bond of the figure, such as V1-O2")
    parser.add_argument("--bands", metavar="LIST", help="observed bands within the shell [cm-1]: 13000,16000")
    add_structure_options(parser)
    bond.add_calculation_options(parser)
    bond.add_spread_option(parser)
    parser.set_defaults(handler=run)


def run(chosen: argparse.Namespace) -> str:
    """Calculate, draw and write; says what was written."""
    if chosen.list:
        return listing(chosen)
    from ehmo.report.figures.canvas import CM_PER_INCH, figure_bytes, figure_format, look_named

    form = _checked(chosen, figure_format)
    kind, options = FIGURE_KINDS[chosen.kind], {}
    report = _molecule(chosen)
    if chosen.bond is not None:
        if kind.name not in _WITH_BOND:
            raise InputError(f"a {kind.name} figure is of no single bond", mend="leave --bond out")
        options["bond"] = bond_place(report, chosen.bond)
    figure = kind.draw(report, look=look_named(chosen.look), width_cm=chosen.width / 10, **options)
    write_whole(chosen.output, figure_bytes(figure, form))
    width, height = 10 * CM_PER_INCH * figure.get_size_inches()
    return f"{chosen.output}: {kind.words}, {width:.0f} x {height:.0f} mm\n"


_WITH_BOND = ("interaction",)


def _checked(chosen: argparse.Namespace, figure_format: Any) -> str:
    """Format of the file, once all that can be told before the calculation is known to be right."""
    if not chosen.output:
        raise InputError("no file to write the figure to", mend="give -o with a name that ends in .svg, .pdf or .png")
    form: str = figure_format(chosen.output)
    if same_file(chosen.output, chosen.file):
        raise InputError("-o would overwrite the input", place=chosen.output, mend="give another file name")
    if not _NARROWEST_MM <= chosen.width <= _WIDEST_MM:
        raise InputError(
            f"a figure cannot be {chosen.width:g} mm wide", mend=f"give {_NARROWEST_MM:g} to {_WIDEST_MM:g}"
        )
    return form


def _molecule(chosen: argparse.Namespace) -> BondReport:
    """Report of the one structure that was chosen."""
    from dataclasses import replace

    from ehmo.calculate import bond_report
    from ehmo.cli.ladder import observed_bands
    from ehmo.orbitals.parameters import load_parameters

    bands = observed_bands(chosen.bands)
    options = replace(
        bond.calculation_options(chosen),
        observed_bands_per_cm=tuple(value for _, value in bands),
        observed_terms=tuple(term for term, _ in bands),
    )
    fragments = chosen_fragments(chosen)
    if len(fragments) != 1:
        raise InputError(
            f"the file holds {len(fragments)} structures and a figure shows one",
            place=chosen.file,
            mend="choose one with --pick (--list shows them)",
        )
    table = load_parameters(chosen.params)
    if chosen.spread is None:
        return bond_report(fragments[0], table, options)
    from ehmo.studies.spread import spread_report

    return spread_report(fragments[0], table, options, draws=chosen.spread)


def bond_place(report: BondReport, words: str) -> int:
    """Place of a bond in a report by its label.

    Raises
    ------
    InputError
        If the report has no such bond.
    """
    labels = [report.bond_label(one) for one in report.coordination.bonds]
    wanted = words.strip().lower()
    for place, label in enumerate(labels):
        if wanted in (label.lower(), "-".join(reversed(label.lower().split("-")))):
            return place
    some = ", ".join(labels[:6]) + (" ..." if len(labels) > 6 else "")
    raise InputError(f"there is no bond {words!r}", place=report.fragment.source, mend=f"bonds are {some}")
