"""Version of a store: made, checked, brought forward."""

from __future__ import annotations

from ehmo.errors import StoreError
from ehmo.store.database import Database, Session
from ehmo.store.schema import FACTS_TABLE, SCHEMA_VERSION, creation


def prepare(database: Database, *, create: bool, read_only: bool) -> None:
    """Make the tables, or see that those that are there can be used, and bring older ones forward.

    Raises
    ------
    StoreError
        If the database holds something else, or a store of a newer version.
    """
    version = database.run(lambda session: _version(database, session))
    if version == SCHEMA_VERSION:
        return
    if version is None:
        if read_only or not create:
            raise _no_store(database)
        database.run(lambda session: _make(database, session), write=True)
        return
    if version > SCHEMA_VERSION:
        raise StoreError(
            f"the store has version {version}; this ehmo reads up to {SCHEMA_VERSION}",
            place=database.name,
            mend="install a newer ehmo",
        )
    raise StoreError(f"the store has version {version}", place=database.name, mend="calculate again")


def _version(database: Database, session: Session) -> int | None:
    """Version of the store in the database; None if the database is empty."""
    tables = database.tables(session)
    if not tables:
        return None
    if FACTS_TABLE not in tables:
        raise _no_store(database)
    found = session.select(f"SELECT value FROM {FACTS_TABLE} WHERE name = 'version'")
    if not found or not str(found[0][0]).isdecimal():
        raise _no_store(database)
    return int(found[0][0])


def _make(database: Database, session: Session) -> None:
    if _version(database, session) is not None:  # another program was faster
        return
    for statement in creation(database.blob):
        session.execute(statement)
    session.execute(
        f"INSERT INTO {FACTS_TABLE} (name, value) VALUES ('version', :version)", [{"version": str(SCHEMA_VERSION)}]
    )


def _no_store(database: Database) -> StoreError:
    return StoreError("it is no store", place=database.name, mend="give the one that ehmo batch --store wrote")
