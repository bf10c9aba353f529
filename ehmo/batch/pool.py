"""Worker processes on this machine; those that die or take too long are replaced, and the structure is named."""

from __future__ import annotations

import itertools
import queue
import time
from collections import deque
from collections.abc import Iterator
from dataclasses import replace

from ehmo.batch.engine import Event, ItemDone
from ehmo.batch.items import BatchSettings, WorkItem
from ehmo.batch.known import KnownKeys
from ehmo.batch.process import Job, WorkerProcess
from ehmo.batch.wire import Message, message_of, outcome_of, start_message
from ehmo.batch.work import Begun, Skipped, Workplace
from ehmo.errors import BatchError

TICK_S = 0.2
"""Longest time without a look at clocks."""
CHUNK_S = 0.25
"""Work that a process is given ahead."""
MOST_ITEMS, MOST_CHARACTERS = 200, 4_000_000
"""Largest chunk."""
START_LIMIT_S = 300.0
MOST_FAILED_STARTS = 3
DEATHS_OF_A_CULPRIT = 2
"""A structure over which that many processes died is not tried again."""


class LocalPool:
    """Engine of worker processes.

    A process that dies takes nothing with it but the structure it was at, since outcomes come back one by one. That
    structure is tried once more in a process that has nothing else to do; if that dies too, it is the culprit.

    Parameters
    ----------
    workers : int
        Number of processes.
    time_limit_s : float, optional
        Time allowed for a structure, reading included [s].
    memory_limit : int, optional
        Address space allowed to each process [byte].
    """

    def __init__(self, workers: int, *, time_limit_s: float | None = None, memory_limit: int | None = None) -> None:
        self.workers = workers
        self._time_limit_s, self._memory_limit = time_limit_s, memory_limit
        self._processes: list[WorkerProcess] = []
        self._inbox: queue.SimpleQueue[tuple[WorkerProcess, bytes | None]] = queue.SimpleQueue()
        self._start: Message = {}
        self._failed_starts = 0
        self._item_s = 1.0

    @property
    def pids(self) -> list[int]:
        """Numbers of the processes."""
        return [process.pid for process in self._processes]

    def close(self) -> None:
        """End all processes."""
        for process in self._processes:
            process.end()
        self._processes = []

    def events(self, items: Iterator[WorkItem], settings: BatchSettings, known: KnownKeys) -> Iterator[Event]:
        """As for `Engine`; the processes stay for a next call with the same settings."""
        start = start_message(settings, known, self._memory_limit, self._time_limit_s)
        if start != self._start:
            self.close()
            self._start = start
        work = _Work(items)
        place = Workplace(settings, known)
        try:
            while True:
                self._staff()
                busy = [self._feed(process, work) for process in self._processes]
                if not any(busy) and work.over:
                    return
                yield from self._next_events(work, place)
        except BaseException:
            self.close()
            raise

    def _staff(self) -> None:
        while len(self._processes) < self.workers:
            self._processes.append(WorkerProcess(self._start, self._inbox))

    def _feed(self, process: WorkerProcess, work: _Work) -> bool:
        """Give a process work if it has little left; whether it has any then."""
        ahead = max(1, min(MOST_ITEMS, int(CHUNK_S / self._item_s)))
        if process.ready and len(process.jobs) <= ahead // 2 and not any(job.deaths for job in process.jobs):
            jobs = work.take(ahead - len(process.jobs), alone=not process.jobs)
            if jobs:
                process.give(jobs)
        return bool(process.jobs)

    def _next_events(self, work: _Work, place: Workplace) -> Iterator[Event]:
        try:
            process, line = self._inbox.get(timeout=TICK_S)
        except queue.Empty:
            self._look_at_clocks()
            yield None
        else:
            if process in self._processes:
                if line is None:
                    yield from self._bury(process, work, place)
                else:
                    yield from self._hear(process, message_of(line))
            if self._inbox.empty():
                # Else the clocks could be those of answers that wait here while rows are written.
                self._look_at_clocks()

    def _hear(self, process: WorkerProcess, message: Message) -> Iterator[Event]:
        if "refused" in message:
            raise BatchError(message["refused"], place=message["place"], mend=message["mend"])
        if "ready" in message:
            process.ready, self._failed_starts = True, 0
        elif "end" in message:
            self._item_s = 0.9 * self._item_s + 0.1 * process.seconds() if process.seconds() > 0 else self._item_s
            yield ItemDone(process.end_item().item.size)
        else:
            yield from self._outcome(process, message)

    def _outcome(self, process: WorkerProcess, message: Message) -> Iterator[Event]:
        outcome = outcome_of(message)
        item = process.jobs[0].item
        if isinstance(outcome, Begun):
            process.begun = (outcome.key, outcome.entry)
        elif isinstance(outcome, Skipped):
            if outcome.key not in item.left_out:
                process.finished_keys.append(outcome.key)
                yield outcome
        else:
            process.begun = None
            process.finished_keys.append(outcome.row.key)
            self._item_s = 0.9 * self._item_s + 0.1 * process.seconds()
            process.since = time.monotonic()
            yield outcome

    def _bury(self, process: WorkerProcess, work: _Work, place: Workplace) -> Iterator[Event]:
        """What becomes of the items of a process that has ended."""
        self._processes.remove(process)
        how, seconds = process.ended(), process.seconds()
        if not process.ready:
            self._failed_starts += 1
            if self._failed_starts >= MOST_FAILED_STARTS:
                raise BatchError(
                    f"worker processes end as they start ({how})",
                    place="batch",
                    mend="raise --memory-limit, or see what --workers 0 says",
                )
            return
        if not process.jobs:
            return
        culprit, *others = process.jobs
        work.give_back(others)
        item = replace(culprit.item, left_out=(*culprit.item.left_out, *process.finished_keys))
        if process.too_slow:
            message = f"not finished after {self._time_limit_s:g} s; raise --time-limit"
        elif culprit.deaths + 1 < DEATHS_OF_A_CULPRIT:
            work.suspect(Job(item, culprit.deaths + 1))
            return
        else:
            message = f"its process ended twice ({how}); look at it alone with --workers 0"
        key, entry = process.begun or (None, item.entry)
        failure = place.failed(item, key, entry, message, seconds)
        yield failure
        if key is None:
            yield ItemDone(item.size)
        else:
            # Other structures of the same piece may still be fine.
            work.suspect(Job(replace(item, left_out=(*item.left_out, key)), 1))

    def _look_at_clocks(self) -> None:
        for process in self._processes:
            if not process.ready:
                too_slow = process.seconds() > START_LIMIT_S
            else:
                too_slow = bool(
                    process.jobs and self._time_limit_s is not None and process.seconds() > self._time_limit_s
                )
            if too_slow and not process.too_slow:
                process.too_slow = True
                process.end()  # its closed output then tells that it is gone


class _Work:
    """Items to give out: suspects one by one, those that came back, then new ones."""

    def __init__(self, items: Iterator[WorkItem]) -> None:
        self._items = items
        self._back: deque[Job] = deque()
        self._suspects: deque[Job] = deque()
        self._exhausted = False

    @property
    def over(self) -> bool:
        """Whether nothing is left to give out."""
        return self._exhausted and not self._back and not self._suspects

    def give_back(self, jobs: list[Job]) -> None:
        self._back.extend(jobs)

    def suspect(self, job: Job) -> None:
        self._suspects.append(job)

    def take(self, count: int, *, alone: bool) -> list[Job]:
        """Jobs for a process; a suspect only for one that has no others."""
        if alone and self._suspects:
            return [self._suspects.popleft()]
        jobs: list[Job] = []
        characters = 0
        while len(jobs) < count and characters < MOST_CHARACTERS:
            job = self._back.popleft() if self._back else self._fresh()
            if job is None:
                break
            jobs.append(job)
            characters += len(job.item.text)
        return jobs

    def _fresh(self) -> Job | None:
        for item in itertools.islice(self._items, 1):
            return Job(item)
        self._exhausted = True
        return None
