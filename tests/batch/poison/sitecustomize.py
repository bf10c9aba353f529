"""Makes structures kill or hang the process that works on them, as their titles say; loaded by workers of the tests."""

import os
import re
import signal
import sys
from pathlib import Path


def _poisoned(function):
    def report(structure, *rest):
        word = structure.title.split("-")[0].strip()
        if word == "KILLS":
            os.kill(os.getpid(), signal.SIGKILL)
        elif word == "CRASHES":
            os.abort()
        elif word == "HANGS":
            # Inside one call of C code that holds the interpreter: neither a thread nor a signal handler gets a turn.
            re.match(r"(a+)+$", "a" * 64 + "b")
        elif word == "PRINTS":
            sys.stdout.write('{"end": true}\n')
            sys.stdout.flush()
            os.write(1, b"\xff\x00 no message\n")
        elif word == "ONCE" and not (marker := Path(os.environ["POISON_MARKER"])).exists():
            marker.touch()
            os.kill(os.getpid(), signal.SIGKILL)
        return function(structure, *rest)

    return report


if os.environ.get("POISON_MARKER"):
    import ehmo.batch.work

    ehmo.batch.work._report = _poisoned(ehmo.batch.work._report)
