"""``ehmo scan``: orders, charges and levels along a bond length or an angle."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ehmo.cli import bond
from ehmo.cli.output import write_whole
from ehmo.errors import InputError

if TYPE_CHECKING:
    from ehmo.records.scan import Scan, ScanPoint


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    parser = commands.add_parser(
        "scan",
        help="orders, charges and levels along a bond length or an angle",
        description="Scan of one metal-donor length, or of one donor-metal-donor angle, with the rest held or relaxed.",
    )
    parser.add_argument("file", metavar="FILE", help="XYZ, extended XYZ or CIF file with one structure")
    which = parser.add_mutually_exclusive_group(required=True)
    which.add_argument("--bond", metavar="M-X", help="labels of the bond, such as V1-O2")
    which.add_argument("--angle", metavar="X-M-Y", help="labels of the angle, such as O2-V1-O3")
    parser.add_argument("--from", dest="first", type=float, required=True, metavar="A", help="first value [Å, degree]")
    parser.add_argument("--to", dest="last", type=float, required=True, metavar="B", help="last value [Å, degree]")
    parser.add_argument("--steps", type=int, default=33, metavar="N", help="points, ends included (33)")
    parser.add_argument(
        "--relax", action="store_true", help="relax the rest at each point, with a set that is calibrated for its bonds"
    )
    parser.add_argument(
        "--isotopes", metavar="O2=18,...", help="mass numbers by atom or element, for the stretching wavenumbers"
    )
    bond.add_calculation_options(parser)
    parser.add_argument(
        "--json", metavar="PATH", help="write each point as it comes, continue a file that is there; - prints the JSON"
    )
    parser.add_argument("--csv", metavar="PATH", help="also write one row per point")
    parser.add_argument("--quiet", action="store_true", help="no progress on the error stream")
    parser.set_defaults(handler=run)


def run(chosen: argparse.Namespace) -> str:
    """Text of the scan; the JSON file grows point by point, so that a run that was stopped can go on."""
    from ehmo.calculate import bond_report
    from ehmo.orbitals.parameters import parameters_for
    from ehmo.report.scan_document import scan_csv, scan_text_json
    from ehmo.report.scan_text import progress_line, scan_text
    from ehmo.structure import assign_electrons, perceive, read
    from ehmo.studies.scan import angle_plan, bond_plan, empty_scan, run_scan

    for name in ("json", "csv"):
        if getattr(chosen, name) == "":
            raise InputError(f"--{name} needs a path", mend="give a file name")
    options = bond.calculation_options(chosen)
    fragment = read(chosen.file, max_atoms=chosen.max_atoms, max_bytes=chosen.max_bytes)
    table = parameters_for(chosen.params, fragment.symbols)
    coordination = perceive(fragment)
    electrons = assign_electrons(
        fragment, coordination, options.charge, options.unpaired_electrons, options.oxidation_state
    )
    if electrons.spin_candidates:
        electrons = bond_report(fragment, table, options).electrons
    fragment = fragment.with_electrons(electrons.charge, electrons.unpaired_electrons)
    make_plan = bond_plan if chosen.bond else angle_plan
    words = chosen.bond or chosen.angle
    plan = make_plan(fragment, coordination, words, chosen.first, chosen.last, chosen.steps, relax=chosen.relax)
    isotopes = _isotopes(chosen.isotopes)
    start = empty_scan(fragment, coordination, electrons, plan, table, options)
    path = None if chosen.json in (None, "-") else Path(chosen.json)
    done = _done(path, start)
    points: list[ScanPoint] = list(done)

    def keep(point: ScanPoint) -> None:
        points.append(point)
        if path is not None:
            write_whole(path, scan_text_json(_with_points(start, points)))
        if not chosen.quiet and sys.stderr.isatty():
            sys.stderr.write(f"\r{progress_line(point, len(points), len(plan.values))}\x1b[K")

    scan = run_scan(
        fragment, coordination, electrons, plan, table, options, done=done, on_point=keep, isotopes=isotopes
    )
    if not chosen.quiet and sys.stderr.isatty():
        sys.stderr.write("\r\x1b[K")
    if chosen.json == "-":
        return scan_text_json(scan)
    if path is not None:
        write_whole(path, scan_text_json(scan))
    if chosen.csv is not None:
        write_whole(chosen.csv, scan_csv(scan))
    return scan_text(scan, fragment.source)


def _isotopes(text: str | None) -> dict[str, int]:
    """Mass numbers by atom or element, of words such as ``O2=18,V=51``."""
    found: dict[str, int] = {}
    for word in (text or "").split(",") if text is not None else ():
        name, _, number = (part.strip() for part in word.partition("="))
        if not name or not (number.isascii() and number.isdigit() and len(number) < 4):
            raise InputError(f"--isotopes {word!r} names no isotope", mend="write atoms or elements, as O2=18,V=51")
        if name in found:
            raise InputError(f"--isotopes names {name} twice", mend="keep one")
        found[name] = int(number)
    return found


def _with_points(scan: Scan, points: list[ScanPoint]) -> Scan:
    from dataclasses import replace

    return replace(scan, points=tuple(sorted(points, key=lambda point: point.value)))


def _done(path: Path | None, start: Scan) -> tuple[ScanPoint, ...]:
    """Points that an earlier run left in the file."""
    from ehmo.report.scan_document import points_done

    if path is None or not path.is_file():
        return ()
    try:
        text = path.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise InputError(f"cannot be read ({error})", place=str(path), mend="give another --json file") from None
    return points_done(text, str(path), start)
