"""``ehmo bond``: bond report of a structure file."""

from __future__ import annotations

import argparse
from collections.abc import Callable, Sequence
from functools import partial
from typing import TYPE_CHECKING, Any

from ehmo.cli.extended import add_crystal_options, clusters, extended_report, refuse_crystal_options
from ehmo.cli.output import same_file, write_whole
from ehmo.cli.pages import add_page_option, add_scan_option, check_page, check_view, scan_for_page, write_page
from ehmo.cli.papers import add_paper_options, check_paper_options, paper_text
from ehmo.cli.structures import add_structure_options, chosen_fragments, extended_crystals, listing
from ehmo.errors import EhmoError, InputError

if TYPE_CHECKING:
    from basis_params import ParameterTable
    from ehmo.records.fragment import Fragment
    from ehmo.records.options import Options
    from ehmo.records.report import BondReport

USUAL_DRAWS = 64
"""Said here too, so that reading the command line loads no numerics; a test compares it with the study's own."""

_SWITCH = {"on": True, "off": False}


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    parser = commands.add_parser(
        "bond",
        help="bond report of a structure file (XYZ, extended XYZ, CIF)",
        description="Bond report of every metal-donor bond in a structure file.",
    )
    parser.add_argument("file", metavar="FILE", help="XYZ, extended XYZ or CIF file")
    add_structure_options(parser)
    add_crystal_options(parser)
    add_calculation_options(parser)
    add_spread_option(parser)
    parser.add_argument("--json", metavar="PATH", help="also write the report as JSON; - prints it instead of the text")
    add_page_option(parser)
    add_scan_option(parser)
    add_paper_options(parser)
    parser.set_defaults(handler=run)


def add_spread_option(parser: argparse.ArgumentParser) -> None:
    """Option of every command that reports."""
    parser.add_argument(
        "--spread",
        nargs="?",
        type=int,
        const=USUAL_DRAWS,
        metavar="N",
        help=f"standard deviation of every number over N draws of the parameters (N left out: {USUAL_DRAWS})",
    )


def add_calculation_options(parser: argparse.ArgumentParser) -> None:
    """Options of every command that calculates."""
    parser.add_argument("--charge", type=int, metavar="Q", help="total charge (default: from the file, or a guess)")
    parser.add_argument(
        "--unpaired", type=int, metavar="N", help="unpaired electrons (default: from the file, or a guess)"
    )
    parser.add_argument(
        "--oxidation-state", type=int, metavar="N", help="oxidation state of the one metal (default: by counting)"
    )
    parser.add_argument(
        "--params",
        default="auto",
        metavar="NAME|FILE",
        help="parameter set (default: auto, the calibrated oxo for molecules of its elements, else standard)",
    )
    parser.add_argument(
        "--charges",
        choices=("fixed", "self-consistent"),
        default="self-consistent",
        help="whether charges act back on the orbital energies (default: self-consistent)",
    )
    constants = parser.add_argument_group("constants of the Hamiltonian", "default: those of the parameter set")
    constants.add_argument("--K", type=float, metavar="K", help="Wolfsberg-Helmholz constant")
    for channel in ("sigma", "pi", "delta"):
        constants.add_argument(f"--K-{channel}", type=float, metavar="K", help=f"the same for {channel} overlaps alone")
    constants.add_argument("--K-decay", type=float, metavar="D", help="decay of K with distance [1/Å]")
    constants.add_argument("--weighting", choices=tuple(_SWITCH), help="weighting of K by the difference in energy")
    constants.add_argument("--lambda", type=float, dest="lambda_", metavar="L", help="weight of the charge potential")
    limits = parser.add_argument_group("limits")
    limits.add_argument(
        "--max-atoms", type=int, default=10_000, metavar="N", help="atoms allowed in a frame or cell (10000)"
    )
    limits.add_argument(
        "--max-bytes", type=int, default=100_000_000, metavar="N", help="size allowed of a file (100 million bytes)"
    )
    limits.add_argument("--max-functions", type=int, default=4000, metavar="N", help="basis functions allowed (4000)")
    limits.add_argument(
        "--max-iterations",
        type=int,
        default=100,
        metavar="N",
        help="iterations allowed for the charges (100)",
    )


def calculation_options(chosen: argparse.Namespace) -> Options:
    """Options record of the parsed words."""
    from ehmo.records.options import Options

    return Options(
        charge=chosen.charge,
        unpaired_electrons=chosen.unpaired,
        oxidation_state=chosen.oxidation_state,
        charge_model=chosen.charges,
        K=chosen.K,
        weighting=None if chosen.weighting is None else _SWITCH[chosen.weighting],
        K_sigma=chosen.K_sigma,
        K_pi=chosen.K_pi,
        K_delta=chosen.K_delta,
        K_decay_per_A=chosen.K_decay,
        lambda_=chosen.lambda_,
        max_iterations=chosen.max_iterations,
        max_functions=chosen.max_functions,
    )


def run(chosen: argparse.Namespace) -> str:
    """Report of each structure in the file, or the list of them."""
    if chosen.list:
        return listing(chosen)
    extended = extended_crystals(chosen)
    if extended and chosen.cluster is not None:
        return report_on(clusters(extended, chosen), chosen)
    if extended:
        return extended_report(extended, chosen, calculation_options(chosen))
    refuse_crystal_options(chosen)
    return report_on(chosen_fragments(chosen), chosen)


def report_on(
    fragments: Sequence[Fragment],
    chosen: argparse.Namespace,
    options: Options | None = None,
    text_of: Callable[[BondReport], str] | None = None,
) -> str:
    """Text for the terminal; the JSON document goes to its file, or replaces the text."""
    from ehmo.calculate import bond_report
    from ehmo.orbitals.parameters import parameters_for

    if chosen.json == "":
        raise InputError("--json needs a path", mend="give a file name, or - for the standard output")
    if chosen.json not in (None, "-") and same_file(chosen.json, getattr(chosen, "file", None)):
        raise InputError("--json would overwrite the structure file", place=chosen.json, mend="give another file name")
    check_paper_options(chosen)
    page = getattr(chosen, "page", None) is not None
    scan = scan_for_page(chosen, fragments[0].labels)
    if page:
        check_page(chosen, len(fragments), "choose one with --pick (--list shows them)")
        check_view()
    options = options or calculation_options(chosen)
    make: Callable[..., BondReport] = bond_report
    if chosen.spread is not None:
        from ehmo.studies.spread import spread_report

        make = partial(spread_report, draws=chosen.spread)
    reports: list[BondReport] = []
    tables: list[ParameterTable] = []
    refused: dict[str, EhmoError] = {}
    for fragment in fragments:
        table = parameters_for(chosen.params, fragment.symbols)
        try:
            reports.append(make(fragment, table, options))
            tables.append(table)
        except EhmoError as error:
            # One molecule of a crystal, such as a cation without its hydrogens, must not hide the others.
            if fragment.crystal is None or len(fragments) == 1:
                raise
            refused[fragment.source] = error
    if not reports:
        raise next(iter(refused.values()))
    if page:
        write_page(chosen, reports[0], tables[0], scan=scan)
    if chosen.json is not None:
        from ehmo.report.document import json_text

        document = json_text(reports, {source: str(error) for source, error in refused.items()})
        if chosen.json == "-":
            return document
        write_whole(chosen.json, document)
    for_paper = paper_text(reports, tables, chosen)
    if for_paper is not None and not refused:
        return for_paper
    from ehmo.report.text import bond_text

    rule = "\n" + "=" * 100 + "\n\n"
    parts = [(text_of or bond_text)(report) for report in reports]
    if refused:
        parts.append("Not calculated:\n" + "".join(f"  {error}\n" for error in refused.values()))
    return rule.join(parts)
