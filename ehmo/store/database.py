"""What the store asks of a database."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any, Protocol, TypeVar

Result = TypeVar("Result")


class Session(Protocol):
    """Statements within one transaction. Values are always bound, named ``:name`` in the text."""

    def select(self, text: str, values: Mapping[str, Any] | None = None) -> list[tuple[Any, ...]]:
        """All rows of a query."""

    def execute(self, text: str, values: Sequence[Mapping[str, Any]] | None = None) -> None:
        """Run a statement once, or once for each of the values."""


class Database(Protocol):
    """A database: SQLite or PostgreSQL."""

    name: str
    """Where it lies, without secrets."""
    blob: str
    """Its type of binary data."""

    def run(self, work: Callable[[Session], Result], *, write: bool = False) -> Result:
        """Do the work in one transaction: all of it or nothing. Work may be repeated if the connection is lost."""

    def tables(self, session: Session) -> set[str]:
        """Names of the tables."""

    def columns(self, session: Session, table: str) -> set[str]:
        """Names of the columns of a table."""

    def close(self) -> None:
        """Let go of the database."""
