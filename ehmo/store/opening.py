"""Open a store by its location."""

from __future__ import annotations

from pathlib import Path

from ehmo.errors import StoreError
from ehmo.store.database import Database
from ehmo.store.location import is_database, masked
from ehmo.store.store import Store

USUAL_WAIT_S = 30.0


def open_store(
    location: str | Path, *, create: bool = False, read_only: bool = False, wait_s: float = USUAL_WAIT_S
) -> Store:
    """Open a store, to be used in a ``with`` statement.

    Parameters
    ----------
    location : str or Path
        Path of a SQLite file, or address of a PostgreSQL database, ``postgresql://host/name``.
    create : bool
        Make it if it does not exist.
    read_only : bool
        Never write to it.
    wait_s : float
        Time to wait for another writer, or for a database that restarts [s].

    Returns
    -------
    store : Store

    Raises
    ------
    StoreError
        If there is none, it is no store, it is damaged, locked, or written by a newer version of the program.
    """
    database: Database
    if is_database(location):
        database = _postgres(str(location), read_only=read_only, wait_s=wait_s)
    else:
        database = _sqlite(Path(location), create=create, read_only=read_only, wait_s=wait_s)
    try:
        return Store(database, create=create, read_only=read_only)
    except BaseException:
        database.close()
        raise


def _postgres(address: str, *, read_only: bool, wait_s: float) -> Database:
    try:
        from ehmo.store.postgres import PostgresDatabase

        return PostgresDatabase(address, read_only=read_only, wait_s=wait_s)
    except ImportError:
        raise StoreError(
            "SQLAlchemy and psycopg are not installed", place=masked(address), mend="pip install 'ehmo[postgres]'"
        ) from None


def _sqlite(path: Path, *, create: bool, read_only: bool, wait_s: float) -> Database:
    from ehmo.store.sqlite import SqliteDatabase

    try:
        present, folder = path.exists(), path.is_dir()
    except (OSError, ValueError) as fault:
        raise StoreError(f"cannot be opened ({fault})", place=str(path), mend="give another path") from None
    if folder:
        raise StoreError("is a folder", place=str(path), mend="give the path of a file")
    if not present and (read_only or not create):
        raise StoreError("no such store", place=str(path), mend="give the file that ehmo batch --store wrote")
    return SqliteDatabase(path, read_only=read_only, wait_s=wait_s)
