"""A batch from its items to the store; the one that runs it is the only writer."""

from __future__ import annotations

import time
from collections import Counter
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field

from ehmo.batch.engine import Engine, ItemDone
from ehmo.batch.items import BatchSettings, WorkItem
from ehmo.batch.known import KnownKeys, packed_keys
from ehmo.batch.work import Finished, Skipped
from ehmo.errors import StoreError
from ehmo.store import DONE, PackedRow, Store

ROWS_AT_ONCE = 100
"""Rows of one transaction."""
LONGEST_WAIT_S = 2.0
"""Time that a row waits for others."""
MOST_REASONS = 1000


@dataclass(slots=True)
class BatchResult:
    """Counts of a batch, also while it runs.

    Attributes
    ----------
    done, failed, skipped : int
        Rows calculated, rows that say why not, structures that the store had already.
    size_done : int
        Bytes of the sources worked off.
    read_s, calculate_s, record_s : float
        Time of the workers spent in reading, in calculating, and in making the full records [s].
    elapsed_s : float
    workers : int
    reasons : Counter of str
        Failures by their reason.
    """

    done: int = 0
    failed: int = 0
    skipped: int = 0
    size_done: int = 0
    read_s: float = 0.0
    calculate_s: float = 0.0
    record_s: float = 0.0
    elapsed_s: float = 0.0
    workers: int = 1
    reasons: Counter[str] = field(default_factory=Counter)


def run_batch(
    items: Iterator[WorkItem],
    store: Store,
    engine: Engine,
    settings: BatchSettings,
    *,
    retry_failed: bool = False,
    on_progress: Callable[[BatchResult], None] = lambda _: None,
) -> BatchResult:
    """Calculate what the store lacks and keep each outcome in it, failures included.

    Parameters
    ----------
    items : iterator of WorkItem
    store : Store
        Open for writing. Done structures in it are passed over, so that a run that was stopped goes on.
    engine : Engine
    settings : BatchSettings
    retry_failed : bool
        Calculate those again that failed.
    on_progress : callable, optional
        Called often.

    Returns
    -------
    result : BatchResult

    Raises
    ------
    StoreError
        If a row cannot be kept; those before it are.
    """
    result = BatchResult(workers=engine.workers)
    start = time.monotonic()
    writer = _Writer(store)
    known = known_keys(store, retry_failed=retry_failed)
    try:
        for event in engine.events(items, settings, known):
            if isinstance(event, Finished):
                _count(event, result)
                writer.add(event.row)
            elif isinstance(event, Skipped):
                result.skipped += 1
            elif isinstance(event, ItemDone):
                result.size_done += event.size
            writer.flush_if_due()
            result.elapsed_s = time.monotonic() - start
            result.workers = engine.workers
            on_progress(result)
    except StoreError:
        raise
    except BaseException:
        # Stopped from outside: what is finished is kept.
        writer.flush()
        raise
    writer.flush()
    result.elapsed_s = time.monotonic() - start
    return result


def known_keys(store: Store, *, retry_failed: bool = False) -> KnownKeys:
    """Keys of a store that need no work.

    Parameters
    ----------
    store : Store
    retry_failed : bool
        Leave out the failed ones.

    Returns
    -------
    known : KnownKeys
    """
    rows = store.cells("structures", names=("key", "status"))
    return KnownKeys(packed_keys(str(key) for key, status in rows if status == DONE or not retry_failed))


def _count(event: Finished, result: BatchResult) -> None:
    result.read_s += event.read_s
    result.calculate_s += event.calculate_s
    result.record_s += event.record_s
    if event.row.status == DONE:
        result.done += 1
        return
    result.failed += 1
    known = event.reason in result.reasons or len(result.reasons) < MOST_REASONS
    result.reasons[event.reason if known else "other reasons"] += 1


class _Writer:
    """Rows gathered into transactions."""

    def __init__(self, store: Store) -> None:
        self._store = store
        self._rows: list[PackedRow] = []
        self._since = 0.0

    def add(self, row: PackedRow) -> None:
        if not self._rows:
            self._since = time.monotonic()
        self._rows.append(row)

    def flush_if_due(self) -> None:
        if self._rows and (len(self._rows) >= ROWS_AT_ONCE or time.monotonic() - self._since > LONGEST_WAIT_S):
            self.flush()

    def flush(self) -> None:
        rows, self._rows = self._rows, []
        self._store.write(rows)
