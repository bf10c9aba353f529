"""``ehmo calibrate``: fit a parameter set to published and computed numbers."""

from __future__ import annotations

import argparse
import sys
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ehmo.cli.output import same_file, write_whole
from ehmo.errors import InputError

if TYPE_CHECKING:
    from ehmo.records.calibration import CalibrationSpec
    from ehmo.studies.calibration import Progress


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    parser = commands.add_parser(
        "calibrate",
        help="fit a parameter set to published and computed numbers",
        description="Least squares of chosen parameters against chosen observables, with errors of left-out species.",
    )
    parser.add_argument("spec", metavar="SPEC.toml", help="what is fitted to what")
    parser.add_argument("--table", metavar="PATH", help="where the parameter table goes (NAME.csv)")
    parser.add_argument("--json", metavar="PATH", help="also write everything as JSON; - prints it")
    parser.add_argument("--progress", metavar="PATH", help="keep each step there, and go on from what is there")
    parser.add_argument("--no-left-out", action="store_true", help="no fits without each species in turn")
    parser.add_argument("--quiet", action="store_true", help="no progress on the error stream")
    parser.set_defaults(handler=run)


def run(chosen: argparse.Namespace) -> str:
    """Text of the calibration; the table is written once everything is done."""
    from ehmo.report.calibration_text import calibration_json, calibration_text
    from ehmo.studies.calibration import calibrate, read_spec

    for name in ("table", "json", "progress"):
        if getattr(chosen, name) == "":
            raise InputError(f"--{name} needs a path", mend="give a file name")
    spec = read_spec(chosen.spec)
    target = chosen.table or f"{spec.name}.csv"
    for path in (target, chosen.json, chosen.progress):
        if same_file(chosen.spec, path):
            raise InputError("this would overwrite the specification", place=str(path), mend="give another file name")
    if not Path(target).resolve().parent.is_dir():
        raise InputError("no such folder", place=str(target), mend="give --table a path in one that exists")
    path = None if chosen.progress is None else Path(chosen.progress)
    done = _done(path, spec)
    shown = not chosen.quiet

    def say(line: str) -> None:
        if shown:
            end = "\x1b[K" if sys.stderr.isatty() else "\n"
            sys.stderr.write(f"\r{line}{end}" if sys.stderr.isatty() else f"{line}{end}")
            sys.stderr.flush()

    def keep(progress: Progress) -> None:
        if path is not None:
            write_whole(path, progress.text())

    found = calibrate(spec, leave_out=not chosen.no_left_out, progress=done, say=say, keep=keep)
    if shown and sys.stderr.isatty():
        sys.stderr.write("\r\x1b[K")
    write_whole(target, found.table_text)
    if chosen.json not in (None, "-"):
        write_whole(chosen.json, calibration_json(found))
    return calibration_json(found) if chosen.json == "-" else calibration_text(found)


def _done(path: Path | None, spec: CalibrationSpec) -> Progress | None:
    """What an earlier run left in the file."""
    from ehmo.studies.calibration import read_progress

    if path is None or not path.exists():
        return None
    try:
        text = path.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise InputError(f"cannot be read ({error})", place=str(path), mend="give another --progress file") from None
    return read_progress(text, str(path), spec)
