"""The rows of one store into another."""

from __future__ import annotations

from ehmo.store.store import Store
from ehmo.store.writing import Written, groups

ROWS_AT_ONCE = 100
"""Rows of one transaction."""


def merge(into: Store, source: Store) -> Written:
    """Copy the rows of a store into another, page by page.

    A key that is there already is kept once: a done row stays, a failed one gives way to a done or a later one. An
    interrupted merge can be run again.

    Parameters
    ----------
    into : Store
        Open for writing.
    source : Store

    Returns
    -------
    written : Written
        Number of keys added, of rows replaced and of rows that were there already.

    Raises
    ------
    StoreError
        As for `Store.write`.
    """
    written = Written(0, 0, 0)
    for rows in groups(source.packed(), ROWS_AT_ONCE):
        written += into.write(rows)
    return written
