"""The store: results of many calculations, keyed by their input, in SQLite or PostgreSQL."""

from ehmo.store.location import masked
from ehmo.store.opening import open_store
from ehmo.store.packing import PackedRow, pack
from ehmo.store.records import DONE, FAILED, Provenance, StoredRow
from ehmo.store.store import Store

__all__ = ["DONE", "FAILED", "PackedRow", "Provenance", "Store", "StoredRow", "masked", "open_store", "pack"]
