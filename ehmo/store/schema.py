"""Tables of the store in the form that SQLite and PostgreSQL both take."""

from __future__ import annotations

from collections.abc import Sequence

from ehmo.store.columns import BOND_COLUMNS, PROVENANCE_COLUMNS, STRUCTURE_COLUMNS, Column

SCHEMA_VERSION = 2
"""Rises with every change of tables or columns; `versions` brings older stores forward."""

FACTS_TABLE = "ehmo_store"
"""Name and value of facts on the store itself, its version among them."""

STRUCTURE_NAMES = tuple(column.name for column in (*PROVENANCE_COLUMNS, *STRUCTURE_COLUMNS))
BOND_NAMES = tuple(column.name for column in BOND_COLUMNS)

_SQL_TYPES = {"text": "TEXT", "integer": "BIGINT", "real": "DOUBLE PRECISION"}


def creation(blob: str) -> list[str]:
    """Statements that make the tables.

    Parameters
    ----------
    blob : str
        Type of binary data in this database.

    Returns
    -------
    statements : list of str
    """
    return [
        f"CREATE TABLE {FACTS_TABLE} (name TEXT PRIMARY KEY, value TEXT NOT NULL)",
        f"CREATE TABLE structures (id INTEGER PRIMARY KEY, {declared((*PROVENANCE_COLUMNS, *STRUCTURE_COLUMNS))})",
        f"CREATE TABLE bonds (id INTEGER, place INTEGER, {declared(BOND_COLUMNS)}, PRIMARY KEY (id, place))",
        f"CREATE TABLE documents (id INTEGER PRIMARY KEY, document {blob} NOT NULL)",
        "CREATE UNIQUE INDEX structures_by_key ON structures (key)",
    ]


def declared(columns: Sequence[Column]) -> str:
    """Declaration of columns, names quoted."""
    return ", ".join(f'"{column.name}" {_SQL_TYPES[column.kind]}' for column in columns)


def listed(names: Sequence[str], table: str = "") -> str:
    """Names quoted and joined by commas, each after its table if one is given."""
    before = f"{table}." if table else ""
    return ", ".join(f'{before}"{name}"' for name in names)


def insertion(table: str, names: Sequence[str]) -> str:
    """Statement that inserts one row with bound values."""
    return f"INSERT INTO {table} ({listed(names)}) VALUES ({', '.join(f':{name}' for name in names)})"


def assigned(names: Sequence[str]) -> str:
    """Assignments of bound values to columns."""
    return ", ".join(f'"{name}" = :{name}' for name in names)
