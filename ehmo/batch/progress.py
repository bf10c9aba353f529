"""How far a batch is, in words."""

from __future__ import annotations

import time
from typing import TextIO

from ehmo.batch.run import BatchResult

TERMINAL_EVERY_S = 0.25
PLAIN_EVERY_S = 60.0


class Progress:
    """One line that changes on a terminal; elsewhere a plain line a minute, none in a short run.

    Parameters
    ----------
    stream : TextIO
    total_size : int
        Bytes of all sources; 0 if it is not known.
    """

    def __init__(self, stream: TextIO, total_size: int) -> None:
        self._stream, self._total = stream, total_size
        self._terminal = stream.isatty()
        self._last = time.monotonic() if not self._terminal else 0.0

    def show(self, result: BatchResult) -> None:
        """Say how far it is, if it is time to."""
        now = time.monotonic()
        if now - self._last < (TERMINAL_EVERY_S if self._terminal else PLAIN_EVERY_S):
            return
        self._last = now
        line = progress_line(result, self._total)
        self._stream.write(f"\r{line}\x1b[K" if self._terminal else f"{line}\n")
        self._stream.flush()

    def close(self) -> None:
        """Clear the line."""
        if self._terminal:
            self._stream.write("\r\x1b[K")
            self._stream.flush()


def progress_line(result: BatchResult, total_size: int) -> str:
    """Counts, rate and time left.

    Examples
    --------
    >>> progress_line(BatchResult(done=120, failed=3, skipped=7, size_done=500, elapsed_s=10.0), 1000)
    '120 done, 3 failed, 7 known; 12.3 per second; about 10 s left'
    """
    rows = result.done + result.failed
    line = f"{result.done:,} done, {result.failed:,} failed, {result.skipped:,} known"
    if result.elapsed_s > 0:
        line += f"; {rows / result.elapsed_s:.1f} per second"
    share = result.size_done / total_size if total_size else 0.0
    if 0 < share < 1:
        line += f"; about {duration_words(result.elapsed_s * (1 - share) / share)} left"
    return line


def duration_words(seconds: float) -> str:
    """A time in the unit that suits it.

    Examples
    --------
    >>> duration_words(42), duration_words(500), duration_words(9000)
    ('42 s', '8 min', '2.5 h')
    """
    if seconds < 90:
        return f"{seconds:.0f} s"
    return f"{seconds / 60:.0f} min" if seconds < 5400 else f"{seconds / 3600:.1f} h"
