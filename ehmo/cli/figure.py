"""``ehmo figure``: figures for a paper, of a structure file, a scan or a store."""

from __future__ import annotations

import argparse
import math
from collections.abc import Callable, Sequence
from typing import Any

from ehmo.cli import bond
from ehmo.cli.output import same_file, write_whole
from ehmo.cli.stores import WAIT_S, open_for_reading
from ehmo.cli.structures import add_structure_options, chosen_fragments, extended_crystals, listing
from ehmo.errors import InputError
from ehmo.report.figures.catalogue import FIGURE_KINDS, FigureKind
from ehmo.report.figures.choice import labelled

_NARROWEST_MM, _WIDEST_MM = 80.0, 400.0
_OPTIONS = ("bond", "metal", "bands", "spread", "mesh", "path", "window", "where")

Drawn = tuple[Any, dict[str, Any]]
"""What a figure is drawn from, and its options."""


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    kinds = "; ".join(f"{kind.name}: {kind.words}" for kind in FIGURE_KINDS.values())
    parser = commands.add_parser(
        "figure",
        help="a figure for a paper, as SVG, PDF or PNG",
        description=f"A figure sized for a journal column. {kinds}.",
    )
    parser.add_argument("kind", choices=tuple(FIGURE_KINDS), metavar="KIND", help=", ".join(FIGURE_KINDS))
    parser.add_argument("file", metavar="FILE", help="XYZ, extended XYZ or CIF file; JSON of a scan; store")
    parser.add_argument("-o", "--output", metavar="OUT", help="file to write: .svg, .pdf or .png")
    parser.add_argument("--look", choices=("light", "dark"), default="light", help="for paper or for slides (light)")
    parser.add_argument("--width", type=float, metavar="MM", help="width on paper (84; overview: 174)")
    own = parser.add_argument_group("what the figure shows")
    own.add_argument("--bond", metavar="M-X", help="bond of the figure, such as V1-O2")
    own.add_argument("--metal", metavar="M", help="metal of the figure, such as V1")
    own.add_argument("--bands", metavar="LIST", help="observed bands within the shell [cm-1]: 13000,16000")
    own.add_argument("--mesh", metavar="A,B,C", help="k-points of a crystal along each reciprocal vector")
    own.add_argument("--path", metavar="NAMES|auto", help="bands of a crystal along special points such as GXMG")
    own.add_argument("--window", metavar="A,B", help="energies of a crystal, from the highest filled level [eV]")
    own.add_argument("--where", metavar="CONDITION", help="bonds of a store, such as \"kind = 'oxo'\"")
    add_structure_options(parser)
    bond.add_calculation_options(parser)
    bond.add_spread_option(parser)
    parser.set_defaults(handler=run)


def run(chosen: argparse.Namespace) -> str:
    """Calculate or read, draw and write; says what was written."""
    kind = FIGURE_KINDS[chosen.kind]
    if chosen.list and kind.source in ("molecule", "crystal"):
        return listing(chosen)
    form = _checked(chosen, kind)
    from ehmo.report.figures.canvas import CM_PER_INCH, figure_bytes, look_named

    sources: dict[str, Callable[[argparse.Namespace], Drawn]] = {
        "molecule": _molecule, "crystal": _crystal, "scan": _scan, "store": _store,
    }  # fmt: skip
    record, options = sources[kind.source](chosen)
    width = kind.width_mm if chosen.width is None else chosen.width
    figure = kind.draw(record, look=look_named(chosen.look), width_cm=width / 10, **options)
    write_whole(chosen.output, figure_bytes(figure, form))
    across, up = 10 * CM_PER_INCH * figure.get_size_inches()
    return f"{chosen.output}: {kind.words}, {across:.0f} x {up:.0f} mm\n"


def _checked(chosen: argparse.Namespace, kind: FigureKind) -> str:
    """Format of the file, once all that can be told before the calculation is known to be right."""
    from ehmo.report.figures.canvas import figure_format

    if not chosen.output:
        raise InputError("no file to write the figure to", mend="give -o with a name that ends in .svg, .pdf or .png")
    form = figure_format(chosen.output)
    if same_file(chosen.output, chosen.file):
        raise InputError("-o would overwrite the input", place=chosen.output, mend="give another file name")
    if chosen.width is not None and not _NARROWEST_MM <= chosen.width <= _WIDEST_MM:
        raise InputError(
            f"a figure cannot be {chosen.width:g} mm wide", mend=f"give {_NARROWEST_MM:g} to {_WIDEST_MM:g}"
        )
    for name in _OPTIONS:
        if getattr(chosen, name) is not None and name not in kind.options:
            takers = [other.name for other in FIGURE_KINDS.values() if name in other.options]
            raise InputError(f"--{name} is not for the figure {kind.name}", mend=f"it is for {', '.join(takers)}")
    return form


def _molecule(chosen: argparse.Namespace) -> Drawn:
    """Report of the one structure that was chosen."""
    from dataclasses import replace

    from ehmo.calculate import bond_report
    from ehmo.cli.ladder import observed_bands
    from ehmo.orbitals.parameters import parameters_for

    bands = observed_bands(chosen.bands)
    options = replace(
        bond.calculation_options(chosen),
        observed_bands_per_cm=tuple(value for _, value in bands),
        observed_terms=tuple(term for term, _ in bands),
    )
    fragment = _only(chosen_fragments(chosen), chosen)
    table = parameters_for(chosen.params, fragment.symbols)
    if chosen.spread is None:
        report = bond_report(fragment, table, options)
    else:
        from ehmo.studies.spread import spread_report

        report = spread_report(fragment, table, options, draws=chosen.spread)
    options_of: dict[str, Any] = {}
    if chosen.bond is not None:
        labels = [report.bond_label(one) for one in report.coordination.bonds]
        options_of["bond"] = labelled(labels, chosen.bond, chosen.file)
    if chosen.metal is not None:
        metals = report.coordination.metals
        labels = [report.fragment.labels[metal] for metal in metals]
        options_of["metal"] = metals[labelled(labels, chosen.metal, chosen.file, things="metals")]
    return report, options_of


def _crystal(chosen: argparse.Namespace) -> Drawn:
    """Report of the one crystal that was chosen."""
    from ehmo.calculate.crystal_report import crystal_report
    from ehmo.cli.extended import crystal_options, one_set
    from ehmo.orbitals.parameters import load_parameters

    found = extended_crystals(chosen)
    if not found:
        raise InputError(
            "no extended structure is chosen", place=chosen.file, mend="pick one (--list shows what the file holds)"
        )
    contents = _only(found, chosen)
    options = bond.calculation_options(chosen)
    report = crystal_report(contents, load_parameters(one_set(chosen)), options, crystal_options(chosen))
    return report, {} if chosen.window is None else {"window_eV": _window(chosen.window)}


def _scan(chosen: argparse.Namespace) -> Drawn:
    """Scan of a file that ``ehmo scan`` wrote."""
    from ehmo.report.scan_reading import read_scan

    scan = read_scan(chosen.file, max_bytes=chosen.max_bytes)
    return scan, {} if chosen.bond is None else {"bond": labelled(scan.bond_labels, chosen.bond, chosen.file)}


def _store(chosen: argparse.Namespace) -> Drawn:
    """Bonds of a store."""
    from pathlib import PurePath

    from ehmo.report.figures.overview import PlottedBond
    from ehmo.store import condition

    where = None if chosen.where is None else condition(chosen.where)
    names = ("metal", "kind", "length_A", "mayer", "source", "entry", "bond")
    bonds = []
    with open_for_reading(chosen.file, WAIT_S) as store:
        for metal, kind, length, mayer, source, entry, label in store.cells("bonds", where, names):
            if isinstance(length, float) and isinstance(mayer, float):
                name = " ".join(word for word in (PurePath(str(source or "")).name, str(entry or "")) if word)
                bonds.append(PlottedBond(str(metal), str(kind), length, mayer, name, str(label)))
    return bonds, {}


def _only(found: Sequence[Any], chosen: argparse.Namespace) -> Any:
    """The one structure of a list.

    Raises
    ------
    InputError
        If there are several.
    """
    if len(found) != 1:
        raise InputError(
            f"the file holds {len(found)} structures and a figure shows one",
            place=chosen.file,
            mend="choose one with --pick (--list shows them)",
        )
    return found[0]


def _window(words: str) -> tuple[float, float]:
    try:
        low, high = map(float, words.split(","))
    except ValueError:
        low = high = math.nan
    if not (math.isfinite(low) and math.isfinite(high) and low < high):
        raise InputError(f"--window {words!r} is no window of energies", mend="give two energies in eV such as -8,6")
    return low, high
