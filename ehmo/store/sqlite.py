"""A store in one SQLite file."""

from __future__ import annotations

import contextlib
import sqlite3
from collections.abc import Callable, Iterator, Mapping, Sequence
from pathlib import Path
from typing import Any, TypeVar
from urllib.parse import quote

from ehmo.errors import StoreError
from ehmo.store.database import Session

Result = TypeVar("Result")

_MENDS = {
    "SQLITE_BUSY": ("another program is writing to it", "wait for it to end, or stop it"),
    "SQLITE_LOCKED": ("another program is writing to it", "wait for it to end, or stop it"),
    "SQLITE_FULL": ("the disk is full", "make room and run the same command again: what was stored is kept"),
    "SQLITE_READONLY": ("it cannot be written to", "choose a place that is writable"),
    "SQLITE_CANTOPEN": ("it cannot be opened", "choose a folder that exists and is readable"),
    "SQLITE_NOTADB": ("it is no store", "give the file that ehmo batch wrote"),
    "SQLITE_CORRUPT": ("it is damaged", "take a copy of it, or calculate again into a new store"),
    "SQLITE_IOERR": (
        "reading or writing failed",
        "see whether the disk is full or gone, and run it again",
    ),
}


class SqliteDatabase:
    """A SQLite file in write-ahead mode.

    Parameters
    ----------
    path : Path
    read_only : bool
        Never write, not even beside the file where that can be avoided.
    wait_s : float
        Time to wait for another writer [s].

    Raises
    ------
    StoreError
        If the file cannot be opened or is no database.
    """

    blob = "BLOB"

    def __init__(self, path: Path, *, read_only: bool, wait_s: float) -> None:
        self.name = str(path)
        self._connection: sqlite3.Connection | None = None
        with self._explained():
            self._connection = _read_only_connection(path, wait_s) if read_only else _connection(path, wait_s)

    def run(self, work: Callable[[Session], Result], *, write: bool = False) -> Result:
        """Do the work in one transaction; a writer takes its place in the queue at the start."""
        with self._explained():
            connection = self._open()
            connection.execute("BEGIN IMMEDIATE" if write else "BEGIN")
            try:
                result = work(_Session(connection))
                connection.execute("COMMIT")
            except BaseException:
                with contextlib.suppress(sqlite3.Error):
                    connection.execute("ROLLBACK")
                raise
            return result

    def tables(self, session: Session) -> set[str]:
        """Names of the tables."""
        return {str(row[0]) for row in session.select("SELECT name FROM sqlite_master WHERE type = 'table'")}

    def columns(self, session: Session, table: str) -> set[str]:
        """Names of the columns of a table."""
        return {str(row[0]) for row in session.select("SELECT name FROM pragma_table_info(:table)", {"table": table})}

    def close(self) -> None:
        """Close the file; the last to close it folds the write-ahead file back."""
        if self._connection is not None:
            with self._explained():
                self._connection.close()
            self._connection = None

    def _open(self) -> sqlite3.Connection:
        if self._connection is None:
            raise StoreError("the store is closed", place=self.name, mend="open it again")
        return self._connection

    @contextlib.contextmanager
    def _explained(self) -> Iterator[None]:
        """SQLite's errors as errors of the store."""
        try:
            yield
        except sqlite3.Error as fault:
            code = getattr(fault, "sqlite_errorname", None) or ""
            found = next((words for name, words in _MENDS.items() if code.startswith(name)), None)
            words, mend = found or ("SQLite refuses", "see the message")
            raise StoreError(f"{words} ({fault})", place=self.name, mend=mend) from fault


class _Session:
    def __init__(self, connection: sqlite3.Connection) -> None:
        self._connection = connection

    def select(self, text: str, values: Mapping[str, Any] | None = None) -> list[tuple[Any, ...]]:
        return self._connection.execute(text, values or {}).fetchall()

    def execute(self, text: str, values: Sequence[Mapping[str, Any]] | None = None) -> None:
        if values is None:
            self._connection.execute(text)
        else:
            self._connection.executemany(text, values)


def _connection(path: Path, wait_s: float) -> sqlite3.Connection:
    connection = sqlite3.connect(path, timeout=wait_s, isolation_level=None)
    try:
        # Where the file system has no shared memory, SQLite answers with the mode it keeps instead; both are safe.
        connection.execute("PRAGMA journal_mode = WAL")
        connection.execute("PRAGMA synchronous = FULL")
        connection.execute("SELECT count(*) FROM sqlite_master")
    except BaseException:
        connection.close()
        raise
    return connection


_UNWRITABLE = ("SQLITE_CANTOPEN", "SQLITE_READONLY")


def _read_only_connection(path: Path, wait_s: float) -> sqlite3.Connection:
    """Connection that takes no writing statement.

    A connection that could write takes its files away at the end. Where the folder cannot be written to, one that
    cannot is used, and where it can make no write-ahead index either, it takes it that nobody writes.
    """
    address = f"file:{quote(str(path.absolute()))}"
    waiting = path.with_name(path.name + "-wal")
    try:
        return _tried(f"{address}?mode=rw", wait_s)
    except sqlite3.OperationalError as fault:
        if not _unwritable(fault):
            raise
    try:
        return _tried(f"{address}?mode=ro", wait_s)
    except sqlite3.OperationalError as fault:
        if not _unwritable(fault) or (waiting.exists() and waiting.stat().st_size):
            raise
        return _tried(f"{address}?mode=ro&immutable=1", wait_s)


def _unwritable(fault: sqlite3.OperationalError) -> bool:
    return (getattr(fault, "sqlite_errorname", None) or "").startswith(_UNWRITABLE)


def _tried(address: str, wait_s: float) -> sqlite3.Connection:
    connection = sqlite3.connect(address, uri=True, timeout=wait_s, isolation_level=None)
    try:
        connection.execute("PRAGMA query_only = ON")
        connection.execute("SELECT count(*) FROM sqlite_master")
    except BaseException:
        connection.close()
        raise
    return connection
