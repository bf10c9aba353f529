"""How rows get into the tables."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from itertools import islice
from typing import NamedTuple, TypeVar

from ehmo.store.database import Session
from ehmo.store.packing import PackedRow
from ehmo.store.records import DONE
from ehmo.store.schema import BOND_NAMES, STRUCTURE_NAMES, insertion

KEYS_AT_ONCE = 500
"""Keys looked up by one statement."""

Item = TypeVar("Item")


class Known(NamedTuple):
    """What the store has of a key."""

    id: int
    status: str
    started_utc: str


class Written(NamedTuple):
    """What became of the rows of one call: number of new keys, of replaced rows, and of rows that stayed."""

    added: int
    replaced: int
    kept: int

    def __add__(self, other: object) -> Written:
        if not isinstance(other, Written):
            return NotImplemented
        return Written(self.added + other.added, self.replaced + other.replaced, self.kept + other.kept)


def groups(items: Iterable[Item], size: int) -> Iterator[list[Item]]:
    """Items in lists of that size, the last one shorter.

    Yields
    ------
    some : list
    """
    left = iter(items)
    while some := list(islice(left, size)):
        yield some


def known_rows(session: Session, keys: Sequence[str]) -> dict[str, Known]:
    """What the store has of these keys, at most `KEYS_AT_ONCE`."""
    names = {f"key{k}": key for k, key in enumerate(keys)}
    places = ", ".join(f":{name}" for name in names)
    found = session.select(f"SELECT key, id, status, started_utc FROM structures WHERE key IN ({places})", names)
    return {str(key): Known(int(id_), str(status), str(start)) for key, id_, status, start in found}


def write_rows(session: Session, rows: Sequence[PackedRow]) -> Written:
    """Write those rows that are new or better than what is there; a replaced row keeps its place."""
    known: dict[str, Known] = {}
    keys = dict.fromkeys(row.key for row in rows)
    for some in groups(keys, KEYS_AT_ONCE):
        known |= known_rows(session, some)
    taken = _better(rows, known)
    stale = [{"id": known[key].id} for key in taken if key in known]
    for table in ("bonds", "documents", "structures") if stale else ():
        session.execute(f"DELETE FROM {table} WHERE id = :id", stale)
    (last,) = session.select("SELECT coalesce(max(id), 0) FROM structures")[0]
    fresh = iter(range(int(last) + 1, int(last) + 1 + len(taken)))
    _insert(session, {known[key].id if key in known else next(fresh): row for key, row in taken.items()})
    return Written(len(taken) - len(stale), len(stale), len(keys) - len(taken))


def _better(rows: Sequence[PackedRow], known: dict[str, Known]) -> dict[str, PackedRow]:
    """Rows to write by key: done ones stay, of two failed ones the later is kept."""
    best = {key: (entry.status, entry.started_utc) for key, entry in known.items()}
    taken: dict[str, PackedRow] = {}
    for row in rows:
        before = best.get(row.key)
        if before is None or (before[0] != DONE and (row.status == DONE or row.started_utc > before[1])):
            taken[row.key] = row
            best[row.key] = (row.status, row.started_utc)
    return taken


def _insert(session: Session, rows: dict[int, PackedRow]) -> None:
    structures = [{"id": id_, **row.structure} for id_, row in rows.items()]
    bonds = [{"id": id_, "place": k, **bond} for id_, row in rows.items() for k, bond in enumerate(row.bonds)]
    documents = [{"id": id_, "document": row.document} for id_, row in rows.items() if row.document is not None]
    for table, names, cells in (
        ("structures", ("id", *STRUCTURE_NAMES), structures),
        ("bonds", ("id", "place", *BOND_NAMES), bonds),
        ("documents", ("id", "document"), documents),
    ):
        if cells:
            session.execute(insertion(table, names), cells)
