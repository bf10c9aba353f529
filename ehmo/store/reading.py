"""How rows come out of the tables: page by page, so that memory stays flat and no transaction stays open."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from functools import partial
from typing import TYPE_CHECKING, Any

from ehmo.store.columns import PROVENANCE_COLUMNS, TABLES, Cell
from ehmo.store.database import Database, Session
from ehmo.store.packing import PackedRow, row_of
from ehmo.store.records import FAILED, StoredRow
from ehmo.store.schema import BOND_NAMES, STRUCTURE_NAMES, listed
from ehmo.store.writing import KEYS_AT_ONCE, groups

if TYPE_CHECKING:
    from ehmo.store.where import Condition

PAGE = 200
"""Full rows read at a time."""
WINDOW = 1000
"""Structures whose cells, or whose bonds' cells, are read at a time; more take longer to sort into columns."""

Row = tuple[Any, ...]


def select(database: Database, query: str, values: Mapping[str, Any] | None = None) -> list[Row]:
    """Rows of one query, in a transaction of its own."""
    return database.run(partial(_select, query, values))


def full_rows(database: Database, where: Condition | None, status: str | None) -> Iterator[StoredRow]:
    """Full rows in the order in which they came.

    Yields
    ------
    row : StoredRow
    """
    names = tuple(column.name for column in PROVENANCE_COLUMNS)
    for page in _pages(database, names, where, status):
        for _, document, *cells in page:
            yield row_of(dict(zip(names, cells, strict=True)), document, database.name)


def packed_rows(database: Database) -> Iterator[PackedRow]:
    """Rows as they lie in a store of the present version.

    Yields
    ------
    row : PackedRow
    """
    query = f"SELECT id, {listed(BOND_NAMES)} FROM bonds WHERE id BETWEEN :first AND :last ORDER BY id, place"
    for page in _pages(database, STRUCTURE_NAMES, None, None):
        bonds: dict[int, list[dict[str, Cell]]] = {}
        for id_, *cells in select(database, query, {"first": page[0][0], "last": page[-1][0]}):
            bonds.setdefault(id_, []).append(dict(zip(BOND_NAMES, cells, strict=True)))
        for id_, document, *cells in page:
            yield PackedRow(dict(zip(STRUCTURE_NAMES, cells, strict=True)), tuple(bonds.get(id_, ())), document)


def table_cells(database: Database, table: str, where: Condition | None, names: Sequence[str]) -> Iterator[Row]:
    """Cells of a table of `columns.TABLES`.

    Yields
    ------
    cells : tuple
    """
    for rows in _windows(database, table, where, [_qualified(name) for name in names]):
        yield from rows


def bond_pages(database: Database, where: Condition | None, names: Sequence[str]) -> Iterator[list[Row]]:
    """Bonds, many at a time: id of the structure, number of the bond in it, and cells.

    Yields
    ------
    rows : list of tuple
        Not empty.
    """
    wanted = ["bonds.id", "bonds.place", *(_qualified(name) for name in names)]
    yield from filter(None, _windows(database, "bonds", where, wanted))


def made_by(database: Database, where: Condition | None) -> list[Row]:
    """Structures by what made them and what came of it.

    Returns
    -------
    rows : list of tuple
        Parameter set, its hash, program version, results edition, status, number of rows, number with warnings, first
        and last start, and seconds in all.
    """
    group = listed(("parameter_set", "parameter_sha256", "program_version", "results_edition", "status"), "structures")
    query = (
        f"SELECT {group}, count(*), sum(CASE WHEN structures.warnings > 0 THEN 1 ELSE 0 END), "
        "min(structures.started_utc), max(structures.started_utc), sum(structures.duration_s) "
        f"FROM structures WHERE true{_restriction(where, of_bonds=False)} GROUP BY {group}"
    )
    return select(database, query, {} if where is None else where.values)


def failures(database: Database, where: Condition | None) -> Iterator[Row]:
    """Source, entry and message of failed structures.

    Yields
    ------
    cells : tuple
    """
    wanted = [_qualified(name) for name in ("source", "entry", "message")]
    for rows in _windows(database, "structures", where, wanted, status=FAILED):
        yield from rows


def bond_names(database: Database, places: Sequence[tuple[int, int]]) -> list[tuple[str, str, str, str]]:
    """Key, source and entry of the structure, and label, of bonds given by id and number."""
    found: dict[tuple[int, int], tuple[str, str, str, str]] = {}
    for some in groups(dict.fromkeys(id_ for id_, _ in places), KEYS_AT_ONCE):
        values = {f"id{k}": id_ for k, id_ in enumerate(some)}
        query = (
            "SELECT structures.id, bonds.place, structures.key, structures.source, structures.entry, bonds.bond "
            "FROM structures JOIN bonds ON bonds.id = structures.id "
            f"WHERE structures.id IN ({', '.join(f':{name}' for name in values)})"
        )
        for id_, place, *names in select(database, query, values):
            key, source, entry, label = map(str, names)
            found[int(id_), int(place)] = (key, source, entry, label)
    return [found[place] for place in places]


def _windows(
    database: Database, table: str, where: Condition | None, wanted: Sequence[str], *, status: str | None = None
) -> Iterator[list[Row]]:
    """Rows of a table, a window of structures at a time."""
    of_bonds = table == "bonds"
    used = " ".join((*wanted, "" if where is None else where.clause))
    joined = "structures JOIN bonds ON bonds.id = structures.id" if "structures." in used else "bonds"
    query = (
        f"SELECT {', '.join(wanted)} FROM {joined if of_bonds else 'structures'} "
        f"WHERE {table}.id BETWEEN :first AND :last{_restriction(where, of_bonds=of_bonds)}"
        f"{'' if status is None else ' AND structures.status = :status'} "
        f"ORDER BY {table}.id{', bonds.place' if of_bonds else ''}"
    )
    values: dict[str, Any] = {} if where is None else dict(where.values)
    if status is not None:
        values["status"] = status
    (last,) = select(database, "SELECT coalesce(max(id), 0) FROM structures")[0]
    for first in range(0, int(last) + 1, WINDOW):
        yield select(database, query, values | {"first": first, "last": first + WINDOW - 1})


def _select(query: str, values: Mapping[str, Any] | None, session: Session) -> list[Row]:
    return session.select(query, values)


def _pages(
    database: Database, names: Sequence[str], where: Condition | None, status: str | None
) -> Iterator[list[Row]]:
    """Pages of place, compressed document and cells."""
    query = (
        f"SELECT structures.id, documents.document, {listed(names, 'structures')} FROM structures "
        "LEFT JOIN documents ON documents.id = structures.id WHERE structures.id > :last"
        f"{'' if status is None else ' AND structures.status = :status'}{_restriction(where, of_bonds=False)} "
        f"ORDER BY structures.id LIMIT {PAGE}"
    )
    values: dict[str, Any] = {} if where is None else dict(where.values)
    if status is not None:
        values["status"] = status
    last = -1
    while page := select(database, query, values | {"last": last}):
        yield page
        last = page[-1][0]


def _qualified(name: str) -> str:
    of_bond = name not in STRUCTURE_NAMES and name in BOND_NAMES
    return f'{"bonds" if of_bond else "structures"}."{name}"'


def _restriction(where: Condition | None, *, of_bonds: bool) -> str:
    """Rest of a query that keeps what meets the condition: bonds, or structures with such a bond."""
    if where is None:
        return ""
    if of_bonds or not where.of_bonds:
        return f" AND ({where.clause})"
    return f" AND EXISTS (SELECT 1 FROM bonds WHERE bonds.id = structures.id AND ({where.clause}))"


def all_names(table: str) -> tuple[str, ...]:
    """Columns of a table of `columns.TABLES`."""
    return tuple(column.name for column in TABLES[table])
