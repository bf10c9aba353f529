"""Version of a store: made, checked, brought forward."""

from __future__ import annotations

from ehmo.errors import StoreError
from ehmo.store.columns import BOND_COLUMNS, PROVENANCE_COLUMNS, STRUCTURE_COLUMNS, Column
from ehmo.store.database import Database, Session
from ehmo.store.packing import cells_of, unfolded
from ehmo.store.schema import FACTS_TABLE, SCHEMA_VERSION, assigned, creation, declared

PAGE = 200
"""Documents read at a time while columns are filled."""


def prepare(database: Database, *, create: bool, read_only: bool) -> int:
    """Make the tables, or see that those that are there can be used, and bring older ones forward.

    Returns
    -------
    version : int
        Version of the tables, older than `SCHEMA_VERSION` only if the store is opened for reading.

    Raises
    ------
    StoreError
        If the database holds something else, or a store of a newer version.
    """
    version = database.run(lambda session: _version(database, session))
    if version is None:
        if read_only or not create:
            raise _no_store(database)
        database.run(lambda session: _make(database, session), write=True)
        return SCHEMA_VERSION
    if version > SCHEMA_VERSION:
        raise StoreError(
            f"the store has version {version}, and this ehmo reads up to {SCHEMA_VERSION}",
            place=database.name,
            mend="install a newer ehmo",
        )
    if version < SCHEMA_VERSION and not read_only:
        database.run(lambda session: _bring_forward(database, session), write=True)
        return SCHEMA_VERSION
    return version


def _version(database: Database, session: Session) -> int | None:
    """Version of the store in the database; None if the database is empty."""
    tables = database.tables(session)
    if not tables:
        return None
    if FACTS_TABLE not in tables:
        raise _no_store(database)
    found = session.select(f"SELECT value FROM {FACTS_TABLE} WHERE name = 'version'")
    version = str(found[0][0]) if found else ""
    if not (version.isascii() and version.isdecimal()) or int(version) < 1:
        raise _no_store(database)
    return int(version)


def _make(database: Database, session: Session) -> None:
    if _version(database, session) is not None:  # another program was faster
        return
    for statement in creation(database.blob):
        session.execute(statement)
    session.execute(
        f"INSERT INTO {FACTS_TABLE} (name, value) VALUES ('version', :version)", [{"version": str(SCHEMA_VERSION)}]
    )


def _bring_forward(database: Database, session: Session) -> None:
    """Add the columns that an older store lacks and fill them from its documents."""
    if _version(database, session) == SCHEMA_VERSION:  # another program was faster
        return
    _add_columns(database, session, "structures", (*PROVENANCE_COLUMNS, *STRUCTURE_COLUMNS))
    _add_columns(database, session, "bonds", BOND_COLUMNS)
    last = -1
    while page := session.select(
        f"SELECT id, document FROM documents WHERE id > :last ORDER BY id LIMIT {PAGE}", {"last": last}
    ):
        _fill(session, [(int(id_), bytes(document)) for id_, document in page], database.name)
        last = page[-1][0]
    session.execute(
        f"UPDATE {FACTS_TABLE} SET value = :version WHERE name = 'version'", [{"version": str(SCHEMA_VERSION)}]
    )


def _add_columns(database: Database, session: Session, table: str, columns: tuple[Column, ...]) -> None:
    present = database.columns(session, table)
    for column in columns:
        if column.name not in present:
            session.execute(f"ALTER TABLE {table} ADD COLUMN {declared((column,))}")


def _fill(session: Session, documents: list[tuple[int, bytes]], place: str) -> None:
    structures, bonds = [], []
    for id_, data in documents:
        of_structure, of_bonds = cells_of(unfolded(data, place))
        structures.append({"id": id_, **of_structure})
        bonds += [{"id": id_, "place": k, **cells} for k, cells in enumerate(of_bonds)]
    names = tuple(column.name for column in STRUCTURE_COLUMNS)
    session.execute(f"UPDATE structures SET {assigned(names)} WHERE id = :id", structures)
    if bonds:
        names = tuple(column.name for column in BOND_COLUMNS)
        session.execute(f"UPDATE bonds SET {assigned(names)} WHERE id = :id AND place = :place", bonds)


def _no_store(database: Database) -> StoreError:
    return StoreError("it is no store", place=database.name, mend="give the one that ehmo batch --store wrote")
