"""Many structures: sources to work items, items to rows of a store, on one machine or a cluster."""

from ehmo.batch.engine import Engine, InProcess
from ehmo.batch.items import BatchSettings, WorkItem
from ehmo.batch.keys import RESULTS_EDITION
from ehmo.batch.pool import LocalPool
from ehmo.batch.run import BatchResult, run_batch
from ehmo.batch.sources import work_items

__all__ = [
    "RESULTS_EDITION",
    "BatchResult",
    "BatchSettings",
    "Engine",
    "InProcess",
    "LocalPool",
    "WorkItem",
    "run_batch",
    "work_items",
]
