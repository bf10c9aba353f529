"""Command line: one module per command; a handler returns text, printing happens here once."""

from __future__ import annotations

import argparse
import io
import os
import sys
from collections.abc import Callable, Sequence

from ehmo import __version__
from ehmo.cli import batch, bond, calibrate, crosscheck, demo, export, figure, ladder, merge, params, scan, summary
from ehmo.errors import EhmoError, visible

Handler = Callable[[argparse.Namespace], str]

USAGE_ERROR = 2
INTERRUPTED = 130


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command.

    Parameters
    ----------
    arguments : sequence of str, optional
        Command-line words; those of the process by default.

    Returns
    -------
    status : int
        0, or 2 after an error that was explained on the standard error stream.
    """
    for stream in (sys.stdout, sys.stderr):
        # A terminal that cannot show a letter gets a question mark instead of a traceback; a stream put in its place,
        # as notebooks do, takes any letter.
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="replace")
    try:
        chosen = _parser().parse_args(arguments)
        handler: Handler = chosen.handler
        return _show(handler(chosen))
    except EhmoError as error:
        print(f"ehmo: {error}", file=sys.stderr)
        return USAGE_ERROR
    except KeyboardInterrupt:
        return INTERRUPTED


def _show(text: str) -> int:
    """Write the text on the standard output; the status says whether it arrived."""
    try:
        sys.stdout.write(text)
        sys.stdout.flush()
    except BrokenPipeError:
        # The reader of a pipe, such as head, has seen enough.
        _discard_the_rest()
    except OSError as fault:
        _discard_the_rest()
        print(f"ehmo: cannot write the output ({fault.strerror or fault}); choose a place with room", file=sys.stderr)
        return USAGE_ERROR
    return 0


def _discard_the_rest() -> None:
    """Lead what is still buffered nowhere, so that the interpreter has nothing to fail on at exit."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


class _Parser(argparse.ArgumentParser):
    def error(self, message: str) -> None:  # type: ignore[override]
        """One line and the mend, like every other error of the program."""
        print(f"ehmo: {visible(message)}; see {self.prog} --help", file=sys.stderr)
        raise SystemExit(USAGE_ERROR)


def _parser() -> argparse.ArgumentParser:
    parser = _Parser(
        prog="ehmo",
        description="What is this metal-oxygen bond? Bond orders, channels, populations and orbitals.",
    )
    parser.add_argument("--version", action="version", version=f"ehmo {__version__}")
    commands = parser.add_subparsers(metavar="COMMAND", required=True)
    for module in (bond, ladder, crosscheck, scan, batch, summary, export, merge, figure, demo, params, calibrate):
        module.add_command(commands)
    return parser
