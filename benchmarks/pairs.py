"""Two pieces of work timed in turn, so that a change of the machine's load strikes both."""

from __future__ import annotations

from collections.abc import Callable
from statistics import median
from time import perf_counter
from typing import Any


def seconds(work: Callable[[], Any]) -> float:
    """Wall time of one call."""
    start = perf_counter()
    work()
    return perf_counter() - start


def timed_in_turn(*works: Callable[[], Any], rounds: int) -> tuple[float, ...]:
    """Median wall time of each piece of work over rounds in which each runs once."""
    times = [[seconds(work) for work in works] for _ in range(rounds)]
    return tuple(median(column) for column in zip(*times, strict=True))
