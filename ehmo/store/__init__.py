"""The store: results of many calculations, keyed by their input, in SQLite or PostgreSQL."""

from ehmo.store.location import masked
from ehmo.store.merging import merge
from ehmo.store.opening import open_store
from ehmo.store.packing import PackedRow, pack
from ehmo.store.records import DONE, FAILED, Provenance, StoredRow
from ehmo.store.store import Store
from ehmo.store.summary import summarise
from ehmo.store.where import Condition, condition

__all__ = [
    "DONE",
    "FAILED",
    "Condition",
    "PackedRow",
    "Provenance",
    "Store",
    "StoredRow",
    "condition",
    "masked",
    "merge",
    "open_store",
    "pack",
    "summarise",
]
