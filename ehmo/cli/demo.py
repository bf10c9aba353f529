"""``ehmo demo``: the main job on a built-in invented complex."""

from __future__ import annotations

import argparse
from dataclasses import replace
from importlib import resources
from typing import Any

from ehmo.cli import bond

STORY = """\
An imaginary pottery fires a blue-green glaze. The film is taken to hold the complex VO(OCH3)Cl(OH2)2: one oxo,
one methoxo, one chlorido and two aqua ligands on one vanadium. Geometry and story are invented. The same report
for a file of your own: ehmo bond FILE

"""


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    parser = commands.add_parser(
        "demo",
        help="bond report of a built-in invented complex",
        description="Runs the main job on a built-in invented complex.",
    )
    bond.add_calculation_options(parser)
    bond.add_spread_option(parser)
    parser.add_argument("--json", metavar="PATH", help="also write the report as JSON; - prints it instead")
    parser.set_defaults(handler=run)


def run(chosen: argparse.Namespace) -> str:
    """Story and report."""
    from ehmo.structure import read

    with resources.as_file(resources.files("ehmo.cli").joinpath("data", "demo.xyz")) as path:
        fragment = replace(read(path), source="built-in example")
    text = bond.report_on([fragment], chosen)
    return text if chosen.json == "-" else STORY + text
