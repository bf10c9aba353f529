"""What is exported of a store, and what came of it."""

from __future__ import annotations

import difflib
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Literal

from ehmo.errors import InputError
from ehmo.store import DONE, FAILED, Condition, Store, StoredRow
from ehmo.store.columns import TABLES, Column

Rows = Literal["bonds", "structures", "records"]


@dataclass(frozen=True, slots=True)
class Selection:
    """What is exported.

    Attributes
    ----------
    rows : "bonds", "structures" or "records"
        One row per bond, per structure, or full records.
    where : Condition or None
        Only what meets it.
    columns : tuple of Column
        Columns of a table, in order; empty for records.
    """

    rows: Rows
    where: Condition | None
    columns: tuple[Column, ...]


@dataclass(frozen=True, slots=True)
class Exported:
    """What came of an export.

    Attributes
    ----------
    rows : int
        Bonds, structures or records written.
    left_out : int
        Failed structures that the format has no place for.
    """

    rows: int
    left_out: int = 0


def chosen_columns(rows: Rows, names: Sequence[str] | None) -> tuple[Column, ...]:
    """Columns of a table by their names, all of them by default.

    Parameters
    ----------
    rows : "bonds", "structures" or "records"
    names : sequence of str or None

    Returns
    -------
    columns : tuple of Column

    Raises
    ------
    InputError
        If there is no such column, one is named twice, or records have none to choose from.
    """
    if rows == "records":
        if names is not None:
            raise InputError("records have no columns to choose from", place="--columns", mend="leave it out")
        return ()
    known = {column.name: column for column in TABLES[rows]}
    if names is None:
        return tuple(known.values())
    for place, name in enumerate(names):
        if name not in known:
            near = difflib.get_close_matches(name, known, 1, 0.5)
            hint = f"perhaps {near[0]}" if near else "README lists the columns"
            raise InputError(f"no column {name!r} in the table of {rows}", place="--columns", mend=hint)
        if name in names[:place]:
            raise InputError(f"the column {name} is named twice", place="--columns", mend="name it once")
    return tuple(known[name] for name in names)


class DoneRows:
    """Full rows of the done structures selected, counted as they pass."""

    def __init__(self, store: Store, selection: Selection) -> None:
        self._store, self._where = store, selection.where
        self._passed = 0

    def __iter__(self) -> Iterator[StoredRow]:
        for row in self._store.rows(self._where, status=DONE):
            self._passed += 1
            yield row

    @property
    def exported(self) -> Exported:
        """Number that passed, and of failed structures selected beside them."""
        failed = sum(status == FAILED for (status,) in self._store.cells("structures", self._where, ("status",)))
        return Exported(self._passed, failed)
