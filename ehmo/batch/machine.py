"""What this machine has to offer."""

from __future__ import annotations

import os

LEAST_MEMORY = 2_000_000_000
"""Address space below which the libraries themselves may not fit [byte]."""


def processors() -> int:
    """Processors that this process may use."""
    try:
        return len(os.sched_getaffinity(0))
    except AttributeError:  # not known outside of Linux
        return os.cpu_count() or 1


def memory_share(workers: int) -> int | None:
    """Part of 80 % of the memory for each of some workers, at least `LEAST_MEMORY` [byte]; None if it is not known."""
    try:
        whole = os.sysconf("SC_PAGE_SIZE") * os.sysconf("SC_PHYS_PAGES")
    except (AttributeError, ValueError, OSError):
        return None
    return max(LEAST_MEMORY, int(0.8 * whole / workers))
