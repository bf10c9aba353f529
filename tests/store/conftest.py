"""Stores to test: a file, and a database of a real PostgreSQL server."""

from __future__ import annotations

import itertools
from collections.abc import Iterator

import pytest

from ehmo.store import open_store
from tests.cli.conftest import ehmo, put, refused
from tests.store.rows import done, failed
from tests.store.servers import Server, server_programs

__all__ = ["ehmo", "put", "refused"]

_NUMBERS = itertools.count()


@pytest.fixture(scope="session")
def server() -> Iterator[Server]:
    """A PostgreSQL server, started for the tests."""
    pytest.importorskip("psycopg", reason="psycopg is not installed: pip install 'ehmo[postgres]'")
    pytest.importorskip("sqlalchemy", reason="SQLAlchemy is not installed: pip install 'ehmo[postgres]'")
    programs = server_programs()
    if programs is None:
        pytest.skip("PostgreSQL is not installed (Debian: apt-get install postgresql)")
    running = Server(programs)
    yield running
    running.remove()


@pytest.fixture
def database(server) -> str:
    """Address of an empty part of a database of its own name."""
    name = f"store{next(_NUMBERS)}"
    server.run_sql(f"CREATE SCHEMA {name}")
    return f"{server.address('postgres')}?options=-csearch_path%3D{name}"


@pytest.fixture(params=["sqlite", "postgresql"])
def location(request, tmp_path) -> str:
    """A place for a store that is not there yet, of either kind."""
    if request.param == "sqlite":
        return str(tmp_path / "results.sqlite")
    return request.getfixturevalue("database")


@pytest.fixture
def filled(location) -> str:
    """A store with four species and a failure."""
    with open_store(location, create=True) as store:
        store.write(
            [
                done(1, source="folder/aqua vanadyl.xyz", entry="frame 1"),
                done(2, "MnO4 -", tags=()),
                done(3, "VOCl3", source="=cmd|' /C calc'!A0", tags=('+"',)),
                failed(4, "a.xyz: no metal; give a complex"),
                done(5, "UO2 2+", source="7"),
            ]
        )
    return location
