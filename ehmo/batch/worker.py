"""Worker process: items on its standard input, outcomes on its standard output.

It is started as a module, so that a notebook or a script without a main guard can run a batch, and it ends when its
standard input closes, so that none is left behind when the batch is killed.
"""

from __future__ import annotations

import faulthandler
import os
import queue
import sys
import threading
from typing import BinaryIO

GRACE_S = 30.0
"""Time after the limit of an item at which a worker ends itself, should nobody be there to end it."""


def main() -> int:
    """Work until the standard input closes.

    Returns
    -------
    status : int
        0, or 1 if the work could not start.
    """
    # Messages get a stream of their own: whatever else prints here goes to the error stream.
    answers = os.fdopen(os.dup(1), "wb")
    os.dup2(2, 1)
    inbox: queue.SimpleQueue[bytes] = queue.SimpleQueue()
    threading.Thread(target=_listen, args=(sys.stdin.buffer, inbox), daemon=True).start()

    from ehmo.batch.wire import items_of, line_of, message_of, outcome_message, started
    from ehmo.batch.work import Workplace
    from ehmo.errors import EhmoError

    settings, known, memory_limit, time_limit_s = started(message_of(inbox.get()))
    try:
        place = Workplace(settings, known)
        _warm_up()
    except EhmoError as fault:
        _say(answers, line_of({"refused": fault.fault, "place": fault.place, "mend": fault.mend}))
        return 1
    limit_memory(memory_limit)
    _say(answers, line_of({"ready": True}))
    while True:
        for item in items_of(message_of(inbox.get())):
            if time_limit_s is not None:
                # A thread of its own ends the process even where a computation never returns to the interpreter.
                faulthandler.dump_traceback_later(time_limit_s + GRACE_S, exit=True)
            for outcome in place.outcomes(item):
                _say(answers, line_of(outcome_message(outcome)))
                if time_limit_s is not None:
                    faulthandler.dump_traceback_later(time_limit_s + GRACE_S, exit=True)
            faulthandler.cancel_dump_traceback_later()
            _say(answers, line_of({"end": True}))


def _listen(stream: BinaryIO, inbox: queue.SimpleQueue[bytes]) -> None:
    for line in stream:
        inbox.put(line)
    os._exit(0)


def _say(stream: BinaryIO, line: bytes) -> None:
    try:
        stream.write(line)
        stream.flush()
    except OSError:  # nobody listens any more
        os._exit(0)


def _warm_up() -> None:
    """Load what every calculation needs, so that the limits of the first item do not pay for it."""
    import ehmo.calculate
    import ehmo.report.document
    import ehmo.structure.readers  # noqa: F401


def limit_memory(limit: int | None) -> None:
    """Let allocations fail that would take this process over a limit.

    Parameters
    ----------
    limit : int or None
        Address space [byte]; None leaves it as it is. A system that knows no such limit goes without.
    """
    if limit is None:
        return
    try:
        import resource

        _, hard = resource.getrlimit(resource.RLIMIT_AS)
        soft = limit if hard == resource.RLIM_INFINITY else min(limit, hard)
        resource.setrlimit(resource.RLIMIT_AS, (soft, hard))
    except (ImportError, AttributeError, ValueError, OSError):
        return


if __name__ == "__main__":
    sys.exit(main())
