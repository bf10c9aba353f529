"""A store in a PostgreSQL database, by SQLAlchemy and psycopg."""

from __future__ import annotations

import time
from collections.abc import Callable, Mapping, Sequence
from typing import TYPE_CHECKING, Any, TypeVar
from urllib.parse import unquote

from ehmo.errors import StoreError
from ehmo.store.database import Session
from ehmo.store.location import masked

if TYPE_CHECKING:
    from sqlalchemy import URL, Connection, Engine
    from sqlalchemy.exc import SQLAlchemyError

Result = TypeVar("Result")

CONNECT_TIMEOUT_S = 10
PAUSE_S = 0.5

_GONE = ("08", "57P01", "57P02", "57P03")
"""Connection lost, server shut down, crashed or starting: worth another try."""
_MENDS = {
    "55P03": ("another program is writing to it", "wait for it to end, or stop it"),
    "53100": ("the disk of the database is full", "make room and run the same command again: what was stored is kept"),
    "53": ("the database has no room for more", "try again later"),
    "28": ("the database refuses this user", "see user, password (PGPASSWORD or ~/.pgpass) and pg_hba.conf"),
    "3D": ("there is no such database", "make it with createdb"),
    "42501": ("this user may not do that", "ask for the right to create and write tables"),
    "08": (
        "the database cannot be reached",
        "see that it runs, and host, port, name, user and PGPASSWORD (or ~/.pgpass)",
    ),
    "22P05": ("the database cannot hold some character", "make it with encoding UTF8"),
    "22021": ("the database cannot hold some character", "make it with encoding UTF8"),
    "57": ("the database shut down", "run the same command again when it is back: what was stored is kept"),
}


class PostgresDatabase:
    """A PostgreSQL database.

    Work whose connection is lost, because the database restarts, is done again once it is back.

    Parameters
    ----------
    address : str
        ``postgresql://[user[:password]@]host[:port]/name``; what is left out comes from PGUSER, PGPASSWORD and so on.
    read_only : bool
    wait_s : float
        Time to wait for another writer, or for a database that restarts [s].

    Raises
    ------
    StoreError
        If it cannot be reached.
    """

    blob = "BYTEA"

    def __init__(self, address: str, *, read_only: bool, wait_s: float) -> None:
        from sqlalchemy.exc import SQLAlchemyError

        self.name = masked(address)
        self._secrets: tuple[str, ...] = ()
        self._wait_s = wait_s
        url = self._url(address)
        self._engine: Engine = _engine(url, read_only=read_only)
        try:
            self._once(lambda session: session.select("SELECT 1"), write=False)
        except SQLAlchemyError as fault:
            self._engine.dispose()
            raise self._explained(fault) from None

    def run(self, work: Callable[[Session], Result], *, write: bool = False) -> Result:
        """Do the work in one transaction; one writer at a time."""
        from sqlalchemy.exc import SQLAlchemyError

        until = time.monotonic() + self._wait_s
        while True:
            try:
                return self._once(work, write=write)
            except SQLAlchemyError as fault:
                if not _gone(fault) or time.monotonic() + PAUSE_S > until:
                    raise self._explained(fault) from None
            time.sleep(PAUSE_S)

    def tables(self, session: Session) -> set[str]:
        """Names of the tables in the schema that is searched first."""
        query = "SELECT tablename FROM pg_tables WHERE schemaname = current_schema()"
        return {str(row[0]) for row in session.select(query)}

    def columns(self, session: Session, table: str) -> set[str]:
        """Names of the columns of a table."""
        query = (
            "SELECT column_name FROM information_schema.columns "
            "WHERE table_schema = current_schema() AND table_name = :table"
        )
        return {str(row[0]) for row in session.select(query, {"table": table})}

    def close(self) -> None:
        """Close the connection."""
        self._engine.dispose()

    def _once(self, work: Callable[[Session], Result], *, write: bool) -> Result:
        from sqlalchemy import text

        with self._engine.connect() as connection, connection.begin():
            if write:
                connection.execute(text(f"SET LOCAL lock_timeout = {max(1, int(self._wait_s * 1000))}"))
                connection.execute(text("SELECT pg_advisory_xact_lock(hashtext('ehmo store ' || current_schema()))"))
            return work(_Session(connection))

    def _url(self, address: str) -> URL:
        from sqlalchemy import make_url

        try:
            url = make_url(address).set(drivername="postgresql+psycopg")
        except Exception:  # noqa: BLE001  # its message may hold the password
            raise StoreError(
                "the address is not understood", place=self.name, mend="write postgresql://user@host:port/name"
            ) from None
        given = [url.password, *(url.query.get(name) for name in ("password", "sslpassword"))]
        self._secrets = tuple(text for secret in given if secret for text in (str(secret), unquote(str(secret))))
        return url

    def _explained(self, fault: SQLAlchemyError) -> StoreError:
        """Error of the store in place of one of the database, whatever it says of secrets left out."""
        code = _code(fault) or ("08" if _gone(fault) else "")
        found = next((words for start, words in _MENDS.items() if code.startswith(start)), None)
        words, mend = found or ("the database refuses", "see the message")
        reason = str(getattr(fault, "orig", None) or fault).strip().partition("\n")[0]
        for secret in self._secrets:
            reason = reason.replace(secret, "***")
        return StoreError(f"{words} ({reason})", place=self.name, mend=mend)


class _Session:
    def __init__(self, connection: Connection) -> None:
        self._connection = connection

    def select(self, text: str, values: Mapping[str, Any] | None = None) -> list[tuple[Any, ...]]:
        from sqlalchemy import text as statement

        return [tuple(row) for row in self._connection.execute(statement(text), dict(values or {}))]

    def execute(self, text: str, values: Sequence[Mapping[str, Any]] | None = None) -> None:
        from sqlalchemy import text as statement

        if values is None:
            self._connection.execute(statement(text))
        elif values:
            self._connection.execute(statement(text), [dict(some) for some in values])


def _engine(url: URL, *, read_only: bool) -> Engine:
    from sqlalchemy import create_engine

    options = "-c default_transaction_read_only=on" if read_only else ""
    given = url.query.get("options")
    if given:
        options = f"{given if isinstance(given, str) else ' '.join(given)} {options}"
    arguments: dict[str, Any] = {"connect_timeout": CONNECT_TIMEOUT_S, "client_encoding": "utf8"} | (
        {"options": options} if options else {}
    )
    return create_engine(
        url, pool_size=1, max_overflow=0, hide_parameters=True, connect_args=arguments, isolation_level="READ COMMITTED"
    )


def _code(fault: BaseException) -> str:
    return str(getattr(getattr(fault, "orig", None), "sqlstate", None) or "")


def _gone(fault: BaseException) -> bool:
    """Whether the connection was lost or could not be made."""
    from sqlalchemy.exc import OperationalError

    code = _code(fault)
    if code:
        return code.startswith(_GONE)
    lost = bool(getattr(fault, "connection_invalidated", False))
    return lost or isinstance(fault, OperationalError)
