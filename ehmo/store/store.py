"""The store: write rows, look keys up, read rows back."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from itertools import islice
from typing import TYPE_CHECKING, Any, TypeVar

from ehmo.errors import StoreError
from ehmo.store.database import Database, Session
from ehmo.store.packing import PackedRow, pack, row_of
from ehmo.store.records import DONE, StoredRow
from ehmo.store.schema import BOND_NAMES, STRUCTURE_NAMES, insertion, listed
from ehmo.store.versions import prepare

if TYPE_CHECKING:
    from types import TracebackType

    from ehmo.store.where import Condition

PAGE = 200
"""Rows read at a time."""
KEYS_AT_ONCE = 500
"""Keys looked up by one statement."""

Item = TypeVar("Item")


class Store:
    """Results of many calculations, one row per key.

    Made by `open_store`, used in a ``with`` statement. Each call is one transaction; reading takes a page of rows at a
    time, so that memory stays flat.

    Attributes
    ----------
    name : str
        Where it lies, without secrets.
    """

    def __init__(self, database: Database, *, create: bool, read_only: bool) -> None:
        self._database = database
        self._read_only = read_only
        self.name = database.name
        prepare(database, create=create, read_only=read_only)

    def __enter__(self) -> Store:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, fault: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def close(self) -> None:
        """Let go of the file or the connection."""
        self._database.close()

    def write(self, rows: Sequence[StoredRow | PackedRow]) -> None:
        """Keep rows, all or none of them.

        A done row replaces a failed one of the same key and is never replaced itself; of two failed rows the one that
        started later is kept.

        Parameters
        ----------
        rows : sequence of StoredRow or PackedRow
            Those packed by `pack` where they were made spare the writer the work.

        Raises
        ------
        StoreError
            If the disk is full, the store is locked by another writer, or the database is gone; nothing of this call
            is kept then.
        """
        if self._read_only:
            raise StoreError("the store is open for reading only", place=self.name, mend="open it for writing")
        packed = [pack(row) if isinstance(row, StoredRow) else row for row in rows]
        if packed:
            self._database.run(lambda session: _write(session, packed), write=True)

    def statuses(self, keys: Iterable[str]) -> dict[str, str]:
        """Status of each key that the store has.

        Parameters
        ----------
        keys : iterable of str

        Returns
        -------
        statuses : dict of str to str
            "done" or "failed" by key; keys that are not stored are left out.
        """
        wanted = iter(dict.fromkeys(keys))
        found: dict[str, str] = {}
        for some in _groups(wanted, KEYS_AT_ONCE):
            known = self._database.run(lambda session, some=some: _known(session, some))  # type: ignore[misc]
            found |= {key: status for key, (_, status, _) in known.items()}
        return found

    def rows(self, where: Condition | None = None, *, status: str | None = None) -> Iterator[StoredRow]:
        """Full rows in the order in which they came.

        Parameters
        ----------
        where : Condition, optional
            Only structures that meet it; those with at least one bond that meets it, if it speaks of bonds.
        status : str, optional
            Only "done" or only "failed" ones.

        Yields
        ------
        row : StoredRow
        """
        if where is not None:
            raise StoreError("conditions are not available yet", place=self.name)
        last, filtered = -1, "" if status is None else "AND status = :status"
        query = (
            f"SELECT structures.id, document, {listed(STRUCTURE_NAMES)} FROM structures "
            f"LEFT JOIN documents ON documents.id = structures.id "
            f"WHERE structures.id > :last {filtered} ORDER BY structures.id LIMIT {PAGE}"
        )
        while True:
            values: dict[str, Any] = {"last": last} | ({} if status is None else {"status": status})
            page = self._database.run(lambda session, values=values: session.select(query, values))  # type: ignore[misc]
            for _, document, *cells in page:
                yield row_of(dict(zip(STRUCTURE_NAMES, cells, strict=True)), document, self.name)
            if len(page) < PAGE:
                return
            last = page[-1][0]

    def counts(self) -> dict[str, int]:
        """Number of rows by status."""
        query = "SELECT status, count(*) FROM structures GROUP BY status ORDER BY status"
        return {str(status): int(count) for status, count in self._database.run(lambda session: session.select(query))}


def _groups(items: Iterator[Item], size: int) -> Iterator[list[Item]]:
    while some := list(islice(items, size)):
        yield some


def _known(session: Session, keys: Sequence[str]) -> dict[str, tuple[int, str, str]]:
    """Place, status and start of the rows that are there, by key."""
    names = {f"key{k}": key for k, key in enumerate(keys)}
    places = ", ".join(f":{name}" for name in names)
    found = session.select(f"SELECT key, id, status, started_utc FROM structures WHERE key IN ({places})", names)
    return {str(key): (int(id_), str(status), str(start)) for key, id_, status, start in found}


def _write(session: Session, rows: Sequence[PackedRow]) -> None:
    wanted = list(dict.fromkeys(str(row.structure["key"]) for row in rows))
    known: dict[str, tuple[int, str, str]] = {}
    for some in _groups(iter(wanted), KEYS_AT_ONCE):
        known |= _known(session, some)
    replaced = {key: place for key, (place, _, _) in known.items()}
    taken: dict[str, PackedRow] = {}
    for row in rows:
        key, status, start = (str(row.structure[name]) for name in ("key", "status", "started_utc"))
        before = known.get(key)
        if before is None or (before[1] != DONE and (status == DONE or start >= before[2])):
            taken[key] = row
            known[key] = (0, status, start)
    if not taken:
        return
    stale = [{"id": replaced[key]} for key in taken if key in replaced]
    for table in ("bonds", "documents", "structures") if stale else ():
        session.execute(f"DELETE FROM {table} WHERE id = :id", stale)
    (last,) = session.select("SELECT coalesce(max(id), 0) FROM structures")[0]
    fresh = iter(range(int(last) + 1, int(last) + len(taken) + 1))
    _insert(session, {replaced.get(key) or next(fresh): row for key, row in taken.items()})


def _insert(session: Session, rows: dict[int, PackedRow]) -> None:
    session.execute(
        insertion("structures", ("id", *STRUCTURE_NAMES)), [{"id": id_, **row.structure} for id_, row in rows.items()]
    )
    bonds = [{"id": id_, "place": k, **bond} for id_, row in rows.items() for k, bond in enumerate(row.bonds)]
    documents = [{"id": id_, "document": row.document} for id_, row in rows.items() if row.document is not None]
    if bonds:
        session.execute(insertion("bonds", ("id", "place", *BOND_NAMES)), bonds)
    if documents:
        session.execute(insertion("documents", ("id", "document")), documents)
