"""Engine on a cluster: chunks of items go to workers of a dask scheduler, outcomes come back here to the one writer."""

from __future__ import annotations

import asyncio
import contextlib
import itertools
import queue
import threading
import time
from collections import deque
from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING, Any

from ehmo.batch.engine import Event, ItemDone
from ehmo.batch.items import BatchSettings, WorkItem
from ehmo.batch.known import KnownKeys
from ehmo.batch.pool import LocalPool
from ehmo.batch.wire import (
    items_message,
    items_of,
    line_of,
    message_of,
    outcome_message,
    outcome_of,
    settings_message,
    settings_of_message,
)
from ehmo.batch.work import Finished, Skipped, Workplace
from ehmo.errors import BatchError, EhmoError

if TYPE_CHECKING:
    from distributed import Client, Future

TICK_S = 0.2
CHUNK_S = 3.0
"""Work of one chunk; a scheduler needs about a millisecond for each."""
MOST_ITEMS, MOST_CHARACTERS = 500, 4_000_000
COUNT_EVERY_S = 2.0

_OWN = threading.local()
"""In a worker of the cluster: the process that works for this thread."""


class ClusterEngine:
    """Engine on the workers of a dask scheduler.

    Every thread of a worker has a process of its own for the work, with limits and replacement as on one machine, so
    that a structure that crashes or hangs harms no worker.

    Parameters
    ----------
    client : distributed.Client
        Connected; closed with the engine.
    time_limit_s : float, optional
        Time allowed for a structure [s].
    memory_limit : int, optional
        Address space allowed to each process that works [byte].
    most_workers : int
        Workers to prepare work for, even if fewer are there yet.
    also_close : sequence of objects with a method ``close``
        What else ends with the engine, such as the cluster itself.
    """

    def __init__(
        self,
        client: Client,
        *,
        time_limit_s: float | None = None,
        memory_limit: int | None = None,
        most_workers: int = 1,
        also_close: Sequence[Any] = (),
    ) -> None:
        self.workers = 0
        self._client, self._also_close = client, also_close
        self._limits = {"time_limit_s": time_limit_s, "memory_limit": memory_limit}
        self._most_workers = most_workers
        self._arrived: queue.SimpleQueue[Future] = queue.SimpleQueue()
        self._under_way: dict[str, tuple[Future, list[WorkItem]]] = {}
        self._item_s = CHUNK_S
        self._counted = -COUNT_EVERY_S

    def close(self) -> None:
        """Give up what is under way and disconnect."""
        for one in (self._client, *self._also_close):
            # A scheduler that is gone already cannot be taken leave of.
            with contextlib.suppress(OSError, RuntimeError, TimeoutError, asyncio.CancelledError):
                one.close()

    def events(self, items: Iterator[WorkItem], settings: BatchSettings, known: KnownKeys) -> Iterator[Event]:
        """As for `Engine`."""
        # As the result of a task, what all chunks need is made again should the worker that holds it be lost.
        shared = self._client.submit(bytes, settings_message(settings, known, self._limits), pure=False)
        again: deque[list[WorkItem]] = deque()
        place = Workplace(settings)
        while True:
            self._count_workers()
            while len(self._under_way) < 2 * max(self.workers, self._most_workers) + 1:
                chunk = again.popleft() if again else self._chunk(items)
                if not chunk:
                    break
                self._send(chunk, shared)
            if not self._under_way:
                return
            try:
                future = self._arrived.get(timeout=TICK_S)
            except queue.Empty:
                self._refuse_if_gone()
                yield None
            else:
                yield from self._received(future, again, place)

    def _chunk(self, items: Iterator[WorkItem]) -> list[WorkItem]:
        chunk: list[WorkItem] = []
        count, characters = max(1, min(MOST_ITEMS, int(CHUNK_S / self._item_s))), 0
        for item in itertools.islice(items, count):
            chunk.append(item)
            characters += len(item.text)
            if characters >= MOST_CHARACTERS:
                break
        return chunk

    def _send(self, chunk: list[WorkItem], shared: Future) -> None:
        try:
            future = self._client.submit(work_off, line_of(items_message(chunk)), shared, pure=False)
        except (RuntimeError, OSError) as fault:
            raise _gone() from fault
        self._under_way[future.key] = (future, chunk)
        future.add_done_callback(self._arrived.put)

    def _received(self, future: Future, again: deque[list[WorkItem]], place: Workplace) -> Iterator[Event]:
        entry = self._under_way.pop(future.key, None)
        if entry is None:
            return
        chunk = entry[1]
        fault = _fault_of(future)
        if fault is None:
            yield from self._outcomes(future, chunk)
        elif isinstance(fault, EhmoError):
            raise fault
        elif type(fault).__name__ != "KilledWorker":
            self._refuse_if_gone()
            raise BatchError(f"a worker of the cluster failed ({type(fault).__name__}: {fault})", mend=_SAME_VERSION)
        elif len(chunk) > 1:
            middle = len(chunk) // 2
            again += [chunk[:middle], chunk[middle:]]
        else:
            words = "several workers of the cluster ended over it; look at it alone with ehmo bond"
            yield place.failed(chunk[0], None, chunk[0].entry, words, 0.0)
            yield ItemDone(chunk[0].size)

    def _outcomes(self, future: Future, chunk: list[WorkItem]) -> Iterator[Event]:
        try:
            lines = future.result()
        except Exception as fault:
            raise _gone() from fault
        seconds = 0.0
        for line in lines:
            outcome = outcome_of(message_of(line))
            if isinstance(outcome, Finished):
                seconds += outcome.read_s + outcome.calculate_s
            if isinstance(outcome, (Finished, Skipped)):
                yield outcome
        self._item_s = max(1e-3, 0.5 * self._item_s + 0.5 * seconds / len(chunk))
        yield ItemDone(sum(item.size for item in chunk))

    def _count_workers(self) -> None:
        if time.monotonic() - self._counted < COUNT_EVERY_S:
            return
        self._counted = time.monotonic()
        try:
            self.workers = sum(self._client.nthreads().values())
        except (OSError, RuntimeError, TimeoutError) as fault:
            raise _gone() from fault

    def _refuse_if_gone(self) -> None:
        if self._client.status != "running":
            raise _gone()


_SAME_VERSION = "see whether all machines have the same versions of the program and of its libraries"


def _gone() -> BatchError:
    return BatchError(
        "the scheduler is gone",
        place="cluster",
        mend="start it and run the same command again: what was finished is in the store",
    )


def _fault_of(future: Future) -> BaseException | None:
    if future.status == "cancelled":
        raise _gone()
    fault: BaseException | None = future.exception()
    return fault


def work_off(items: bytes, shared: bytes) -> list[bytes]:
    """Work off a chunk in a worker of the cluster.

    Parameters
    ----------
    items, shared : bytes
        Messages of `ehmo.batch.wire`.

    Returns
    -------
    outcomes : list of bytes
        Messages too: plain data, read here and there by the same rules.
    """
    settings, known, limits = settings_of_message(message_of(shared))
    pool = _own_pool(limits)
    events = pool.events(iter(items_of(message_of(items))), settings, known)
    return [line_of(outcome_message(event)) for event in events if isinstance(event, (Finished, Skipped))]


def _own_pool(limits: dict[str, Any]) -> LocalPool:
    """Process of this thread, which stays for the next chunk."""
    if getattr(_OWN, "limits", None) != limits:
        if hasattr(_OWN, "pool"):
            _OWN.pool.close()
        _OWN.pool, _OWN.limits = LocalPool(1, **limits), limits
    pool: LocalPool = _OWN.pool
    return pool
