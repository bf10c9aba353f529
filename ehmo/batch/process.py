"""One worker process as the batch sees it: what it was given, what it is at, and what it said."""

from __future__ import annotations

import contextlib
import os
import queue
import signal
import subprocess
import sys
import threading
import time
from collections import deque
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import IO

from ehmo.batch.items import WorkItem
from ehmo.batch.wire import Message, items_message, line_of

SINGLE_THREADED = dict.fromkeys(("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"), "1")
"""Workers share the processors among themselves; threads within them would only get into each other's way."""


@dataclass(slots=True)
class Job:
    """An item on its way, and how many processes have died over it."""

    item: WorkItem
    deaths: int = 0


class WorkerProcess:
    """A worker process with threads that carry messages, so that nothing here ever waits for it.

    Parameters
    ----------
    start : Message
        What it is told first.
    inbox : queue
        Takes pairs of this worker and a line it said; None in place of the line when it has ended.
    """

    def __init__(self, start: Message, inbox: queue.SimpleQueue[tuple[WorkerProcess, bytes | None]]) -> None:
        self.jobs: deque[Job] = deque()
        self.begun: tuple[str, str] | None = None
        self.finished_keys: list[str] = []
        self.ready = False
        self.too_slow = False
        self.since = time.monotonic()
        self._outbox: queue.SimpleQueue[bytes | None] = queue.SimpleQueue()
        # The program's own folder goes first, as it did here, wherever the worker starts.
        path = os.pathsep.join(filter(None, (str(Path(__file__).parents[2]), os.environ.get("PYTHONPATH"))))
        self._process = subprocess.Popen(
            [sys.executable, "-m", "ehmo.batch.worker"],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=subprocess.DEVNULL,
            env={**os.environ, **SINGLE_THREADED, "PYTHONPATH": path},
            start_new_session=True,  # an interrupt from the keyboard is for the batch alone
        )
        assert self._process.stdin is not None
        assert self._process.stdout is not None
        for work, stream in ((self._carry_in, self._process.stdin), (self._carry_out, self._process.stdout)):
            threading.Thread(target=work, args=(stream, inbox), daemon=True).start()
        self._outbox.put(line_of(start))

    @property
    def pid(self) -> int:
        """Number of the process."""
        return self._process.pid

    def give(self, jobs: Sequence[Job]) -> None:
        """Hand items over, to be worked off in this order after those it has."""
        if not self.jobs:
            self.since = time.monotonic()
        self.jobs.extend(jobs)
        self._outbox.put(line_of(items_message([job.item for job in jobs])))

    def end_item(self) -> Job:
        """Take note that the first item is worked off."""
        self.begun = None
        self.finished_keys.clear()
        self.since = time.monotonic()
        return self.jobs.popleft()

    def seconds(self) -> float:
        """Time since it last said something or was given something to do [s]."""
        return time.monotonic() - self.since

    def end(self) -> str:
        """End the process, whatever it does, and say how it ended."""
        self._outbox.put(None)
        with contextlib.suppress(OSError):
            self._process.kill()
        status = self._process.wait()
        if status >= 0:
            return f"exit status {status}"
        try:
            return f"signal {signal.Signals(-status).name}"
        except ValueError:
            return f"signal {-status}"

    def ended(self) -> str:
        """How a process ended that has closed its output."""
        with contextlib.suppress(subprocess.TimeoutExpired):
            self._process.wait(5.0)
        return self.end()

    def _carry_in(self, stream: IO[bytes], _: object) -> None:
        with contextlib.suppress(OSError, ValueError), stream:
            while (line := self._outbox.get()) is not None:
                stream.write(line)
                stream.flush()

    def _carry_out(self, stream: IO[bytes], inbox: queue.SimpleQueue[tuple[WorkerProcess, bytes | None]]) -> None:
        with stream:
            for line in stream:
                if line.endswith(b"\n"):  # a last line without its end was cut by the death of the process
                    inbox.put((self, line))
        inbox.put((self, None))
