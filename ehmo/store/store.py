"""The store: write rows, look keys up, read rows back."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from functools import partial
from typing import TYPE_CHECKING, Any

import numpy as np

from ehmo.errors import StoreError
from ehmo.store.columns import TABLES, Cell, Column
from ehmo.store.database import Database, Session
from ehmo.store.packing import PackedRow, pack
from ehmo.store.reading import (
    all_names,
    bond_names,
    bond_pages,
    failures,
    full_rows,
    made_by,
    packed_rows,
    select,
    table_cells,
)
from ehmo.store.records import StoredRow
from ehmo.store.schema import SCHEMA_VERSION
from ehmo.store.versions import prepare
from ehmo.store.where import Condition, condition
from ehmo.store.writing import KEYS_AT_ONCE, Written, groups, known_rows, write_rows

if TYPE_CHECKING:
    from types import TracebackType


class Store:
    """Results of many calculations, one row per key.

    Made by `open_store`, used in a ``with`` statement. Reading takes a page of rows at a time, so that memory stays
    flat and other programs may write meanwhile.

    Attributes
    ----------
    name : str
        Where it lies, without secrets.
    """

    def __init__(self, database: Database, *, create: bool, read_only: bool) -> None:
        self._database = database
        self._read_only = read_only
        self.name = database.name
        self._version = prepare(database, create=create, read_only=read_only)

    def __enter__(self) -> Store:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, fault: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def close(self) -> None:
        """Let go of the file or the connection."""
        self._database.close()

    def write(self, rows: Sequence[StoredRow | PackedRow]) -> Written:
        """Keep rows, all or none of them, in one transaction.

        A done row replaces a failed one of the same key and is never replaced itself; of two failed rows the one that
        started later is kept.

        Parameters
        ----------
        rows : sequence of StoredRow or PackedRow
            Those packed by `pack` where they were made spare the writer the work.

        Returns
        -------
        written : Written
            Number of keys added, of rows replaced and of rows that stayed as they were.

        Raises
        ------
        StoreError
            If the disk is full, the store is locked by another writer, or the database is gone; nothing of this call
            is kept then.
        """
        if self._read_only:
            raise StoreError("the store is open for reading only", place=self.name, mend="open it for writing")
        packed = [pack(row) if isinstance(row, StoredRow) else row for row in rows]
        return self._database.run(partial(_write, packed), write=True) if packed else Written(0, 0, 0)

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
        found: dict[str, str] = {}
        for some in groups(keys, KEYS_AT_ONCE):
            known = self._database.run(partial(_known, some))
            found |= {key: entry.status for key, entry in known.items()}
        return found

    def counts(self) -> dict[str, int]:
        """Number of rows by status."""
        query = "SELECT status, count(*) FROM structures GROUP BY status ORDER BY status"
        return {str(status): int(count) for status, count in select(self._database, query)}

    def rows(self, where: Condition | str | None = None, *, status: str | None = None) -> Iterator[StoredRow]:
        """Full rows in the order in which they came.

        Parameters
        ----------
        where : Condition or str, optional
            Only structures that meet it; those with at least one bond that meets it, if it speaks of bonds.
        status : str, optional
            Only "done" or only "failed" ones.

        Returns
        -------
        rows : iterator of StoredRow
        """
        if where is not None:
            self._must_be_current()
        return full_rows(self._database, _condition(where), status)

    def cells(
        self, table: str, where: Condition | str | None = None, names: Sequence[str] = ()
    ) -> Iterator[tuple[Cell, ...]]:
        """Rows of a table as plain values.

        Parameters
        ----------
        table : "structures" or "bonds"
        where : Condition or str, optional
            Only bonds, or structures, that meet it.
        names : sequence of str, optional
            Columns, all of the table by default.

        Returns
        -------
        rows : iterator of tuple
        """
        self._must_be_current()
        return table_cells(self._database, table, _condition(where), names or all_names(table))

    def bond_pages(self, names: Sequence[str], where: Condition | str | None = None) -> Iterator[list[tuple[Any, ...]]]:
        """Bonds, many at a time, for statistics over all of them.

        Parameters
        ----------
        names : sequence of str
            Columns.
        where : Condition or str, optional
            Only bonds that meet it.

        Returns
        -------
        pages : iterator of list of tuple
            Id of the structure in this store, number of the bond in it, and cells.
        """
        self._must_be_current()
        return bond_pages(self._database, _condition(where), names)

    def made_by(self, where: Condition | str | None = None) -> list[tuple[Any, ...]]:
        """Structures by what made them and what came of it; see `reading.made_by`."""
        self._must_be_current()
        return made_by(self._database, _condition(where))

    def failures(self, where: Condition | str | None = None) -> Iterator[tuple[Any, ...]]:
        """Source, entry and message of failed structures."""
        self._must_be_current()
        return failures(self._database, _condition(where))

    def bond_names(self, places: Sequence[tuple[int, int]]) -> list[tuple[str, str, str, str]]:
        """Key, source and entry of the structure, and label, of bonds as `bond_pages` numbers them."""
        return bond_names(self._database, places)

    def table(self, name: str, where: Condition | str | None = None) -> dict[str, np.ndarray[Any, Any]]:
        """Columns of a table, as `pandas.DataFrame` takes them.

        Parameters
        ----------
        name : "structures" or "bonds"
            One row per structure, or per bond.
        where : Condition or str, optional
            Only rows that meet it.

        Returns
        -------
        columns : dict of str to (n,) ndarray
            Numbers as floats with NaN for what is missing, whole ones as integers where none is missing; text as
            objects, None where it is missing.
        """
        rows = list(self.cells(name, where))
        values: Iterable[Sequence[Cell]] = zip(*rows, strict=True) if rows else ((),) * len(TABLES[name])
        return {column.name: _array(column, cells) for column, cells in zip(TABLES[name], values, strict=True)}

    def packed(self) -> Iterator[PackedRow]:
        """Rows for another store, those of an older version brought forward.

        Returns
        -------
        rows : iterator of PackedRow
        """
        if self._version < SCHEMA_VERSION:
            return map(pack, self.rows())
        return packed_rows(self._database)

    def _must_be_current(self) -> None:
        if self._version < SCHEMA_VERSION:
            raise StoreError(
                f"the store has the older version {self._version} and is open for reading only",
                place=self.name,
                mend="make a copy of the present version with ehmo merge NEW OLD",
            )


def _condition(where: Condition | str | None) -> Condition | None:
    return condition(where) if isinstance(where, str) else where


def _write(rows: Sequence[PackedRow], session: Session) -> Written:
    return write_rows(session, rows)


def _known(keys: Sequence[str], session: Session) -> dict[str, Any]:
    return dict(known_rows(session, keys))


def _array(column: Column, cells: Sequence[Cell]) -> np.ndarray[Any, Any]:
    if column.kind == "text":
        return np.array(cells, dtype=object)
    if column.kind == "integer" and None not in cells:
        return np.array(cells, dtype=np.int64)
    return np.array([np.nan if cell is None else cell for cell in cells], dtype=np.float64)
