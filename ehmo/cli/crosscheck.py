"""``ehmo crosscheck``: a bond report beside a minimal-basis run of the same fragment in PySCF."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ehmo.cli import bond
from ehmo.cli.output import write_whole
from ehmo.cli.pages import add_page_option, check_page, check_view, write_page
from ehmo.errors import EhmoError, InputError, visible

if TYPE_CHECKING:
    from ehmo.records.crosscheck import Crosscheck

_NO_CACHE = "off"


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    parser = commands.add_parser(
        "crosscheck",
        help="bond report beside a minimal-basis run in PySCF, with a verdict on each bond",
        description="Runs each structure of a file in PySCF in a minimal basis and sets both results side by side.",
    )
    parser.add_argument("file", metavar="FILE", help="XYZ, extended XYZ or CIF file")
    run_options = parser.add_argument_group("minimal-basis run")
    run_options.add_argument(
        "--theory",
        choices=("pbe", "b3lyp", "hf"),
        default="pbe",
        help="functional, or hf for restricted (open-shell) Hartree-Fock (default: pbe)",
    )
    run_options.add_argument(
        "--timeout", type=float, default=900.0, metavar="S", help="stop a run after this many seconds (900)"
    )
    run_options.add_argument(
        "--cache",
        metavar="DIR|off",
        help="folder of earlier runs (default: ehmo in the user's cache folder); off neither reads nor keeps any",
    )
    bond.add_calculation_options(parser)
    parser.add_argument(
        "--json", metavar="PATH", help="also write the comparison as JSON; - prints it instead of the text"
    )
    add_page_option(parser)
    parser.set_defaults(handler=run)


def run(chosen: argparse.Namespace) -> str:
    """Comparison of each structure in the file."""
    from ehmo.calculate import bond_report
    from ehmo.orbitals.parameters import parameters_for
    from ehmo.structure import read_frames
    from ehmo.studies.crosscheck import crosscheck

    if chosen.json == "":
        raise InputError("--json needs a path", mend="give a file name, or - for the standard output")
    options, cache = bond.calculation_options(chosen), _cache(chosen.cache)
    fragments = read_frames(chosen.file, max_atoms=chosen.max_atoms, max_bytes=chosen.max_bytes)
    if chosen.page is not None:
        check_page(chosen, len(fragments), "give a file with one")
        check_view()
    found = []
    for fragment in fragments:
        report = bond_report(fragment, chosen.params, options)
        try:
            found.append(crosscheck(report, chosen.theory, cache=cache, timeout_s=chosen.timeout, progress=_tell))
        except EhmoError as error:
            error.place = error.place or fragment.source
            raise
    if chosen.page is not None:
        table = parameters_for(chosen.params, fragments[0].symbols)
        write_page(chosen, found[0].report, table, crosscheck=found[0])
    return _shown(found, chosen.json)


def _shown(found: list[Crosscheck], json_path: str | None) -> str:
    from ehmo.report.crosscheck_document import crosscheck_json
    from ehmo.report.crosscheck_text import crosscheck_text

    if json_path == "-":
        return crosscheck_json(found)
    if json_path is not None:
        write_whole(json_path, crosscheck_json(found))
    rule = "\n" + "=" * 100 + "\n\n"
    return rule.join(crosscheck_text(one) for one in found)


def _cache(words: str | None) -> Path | None:
    from ehmo.studies.crosscheck import default_cache

    if words == "":
        raise InputError("--cache needs a folder", mend="give one, or off")
    return None if words == _NO_CACHE else default_cache() if words is None else Path(words)


def _tell(line: str) -> None:
    """Progress goes to the error stream, so that the output can be piped."""
    sys.stderr.write(f"ehmo: {visible(line)}\n")
    sys.stderr.flush()
