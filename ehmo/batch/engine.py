"""What a batch asks of an engine, and the simplest one: this process."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Protocol

from ehmo.batch.items import BatchSettings, WorkItem
from ehmo.batch.known import KnownKeys
from ehmo.batch.work import Begun, Finished, Outcome, Skipped, Workplace


class ItemDone:
    """An item of which nothing more will come."""

    __slots__ = ("size",)

    def __init__(self, size: int) -> None:
        self.size = size


Event = Finished | Skipped | ItemDone | None
"""What an engine reports; None now and then while there is nothing to report."""


class Engine(Protocol):
    """Something that turns items into rows."""

    workers: int
    """How many work at the same time, as far as that is known."""

    def events(self, items: Iterator[WorkItem], settings: BatchSettings, known: KnownKeys) -> Iterator[Event]:
        """Work off the items.

        Parameters
        ----------
        items : iterator of WorkItem
            Taken as they are needed.
        settings : BatchSettings
        known : KnownKeys
            Structures that have their rows already.

        Yields
        ------
        event : Finished, Skipped, ItemDone or None
        """

    def close(self) -> None:
        """Let go of processes and connections."""


class InProcess:
    """Work in this process, one structure after another: no limits of time and memory are kept."""

    workers = 1

    def events(self, items: Iterator[WorkItem], settings: BatchSettings, known: KnownKeys) -> Iterator[Event]:
        """As for `Engine`."""
        place = Workplace(settings, known)
        for item in items:
            outcome: Outcome
            for outcome in place.outcomes(item):
                if not isinstance(outcome, Begun):
                    yield outcome
            yield ItemDone(item.size)

    def close(self) -> None:
        """Nothing to let go of."""
