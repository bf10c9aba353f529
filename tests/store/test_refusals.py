"""Stores and targets that cannot be used: one line with place and mend, status 2, nothing left behind."""

from __future__ import annotations

import resource
import sqlite3
from contextlib import closing

import pytest

from ehmo.store import open_store
from tests.store.rows import done
from tests.store.servers import QUOTED

COMMANDS = [("export", "STORE", "--to", "a.csv"), ("summary", "STORE")]


def words(command: tuple[str, ...], store: str) -> list[str]:
    return [store if word == "STORE" else word for word in command]


@pytest.fixture(params=COMMANDS, ids=lambda command: command[0])
def command(request) -> tuple[str, ...]:
    return request.param


@pytest.fixture
def store(tmp_path) -> str:
    path = str(tmp_path / "a.sqlite")
    with open_store(path, create=True) as opened:
        opened.write([done(1)])
    return path


STRANGERS = {"a text": b"no store", "an empty file": b"", "half a database": b"SQLite format 3\0" + bytes(60)}


@pytest.mark.parametrize("name", STRANGERS)
def test_files_that_are_no_store(refused, put, command, name):
    put(STRANGERS[name], "a.sqlite")
    assert "a.sqlite: " in refused(*words(command, "a.sqlite"))


@pytest.mark.parametrize(
    ("location", "fault"),
    [("absent.sqlite", "no such store"), (".", "is a folder"), ("", "has no name"), ("no\0name", "no such store")],
)
def test_places_without_a_store(refused, command, location, fault):
    assert fault in refused(*words(command, location))


def test_a_newer_store(refused, command, store):
    with closing(sqlite3.connect(store)) as raw:
        raw.execute("UPDATE ehmo_store SET value = '99'")
        raw.commit()
    line = refused(*words(command, store))
    assert "the store has version 99" in line
    assert "install a newer ehmo" in line


def test_a_database_of_something_else(refused, command, tmp_path):
    with closing(sqlite3.connect(tmp_path / "a.sqlite")) as raw:
        raw.execute("CREATE TABLE notes (text)")
    assert "it is no store" in refused(*words(command, "a.sqlite"))


def test_a_locked_store(refused, command, store):
    with closing(sqlite3.connect(store, isolation_level=None)) as writer:
        writer.execute("PRAGMA locking_mode = EXCLUSIVE")
        writer.execute("BEGIN EXCLUSIVE")
        assert "another program is writing to it" in refused(*words(command, store), "--wait", "0.1")
        writer.execute("ROLLBACK")


def test_a_store_with_damaged_pages(refused, command, store):
    with open(store, "r+b") as file:  # noqa: PTH123
        file.seek(4096)
        file.write(b"\xff" * 4096)
    assert "a.sqlite: " in refused(*words(command, store))


@pytest.mark.parametrize(
    ("condition", "fault"),
    [
        ("mayr > 1", "perhaps mayer"),
        ("mayer >", "a value is expected"),
        ("", "ends too early"),
        ("x" * 100_001, "longer"),
    ],
)
def test_conditions_that_are_not_understood(refused, command, store, condition, fault):
    assert fault in refused(*words(command, store), "--where", condition)


@pytest.mark.parametrize("wait", ["-1", "nan", "long", "1e9"])
def test_times_to_wait(refused, command, store, wait):
    assert "no number of seconds" in refused(*words(command, store), f"--wait={wait}")


@pytest.mark.parametrize(
    ("more", "fault"),
    [
        (["--to", "a.txt"], "no format has the suffix '.txt'; use .csv"),
        (["--to", "a"], "no format has the suffix ''"),
        (["--to", ""], "--to needs a path"),
        (["--to", "a.csv", "--rows", "records"], "CSV has no rows of records; use bonds or structures"),
        (["--to", "a.xyz", "--rows", "bonds"], "extended XYZ has no rows of bonds; use records"),
        (["--to", "a.csv", "--columns", "bond,mayr"], "no column 'mayr' in the table of bonds; perhaps mayer"),
        (
            ["--to", "a.csv", "--rows", "structures", "--columns", "mayer"],
            "no column 'mayer' in the table of structures",
        ),
        (["--to", "a.csv", "--columns", "mayer,mayer"], "named twice"),
        (["--to", "a.csv", "--columns", ""], "no column ''"),
        (["--to", "a.xyz", "--columns", "mayer"], "records have no columns"),
        (["--to", "absent/a.csv"], "cannot write the file"),
        (["--to", "absent/a.db"], "cannot write the file"),
        (["--to", "x" * 300 + ".csv"], "cannot write the file"),
        (["--to", "no\0name.csv"], "cannot write the file"),
    ],
)
def test_exports_that_cannot_be(refused, store, more, fault):
    assert fault in refused("export", store, *more)


@pytest.mark.parametrize(
    ("more", "fault"),
    [
        (["--json", ""], "--json needs a path"),
        (["--json", "absent/a.json"], "cannot write the file"),
        (["--json", "./a.sqlite"], "that is the store itself"),
    ],
)
def test_summaries_that_cannot_be(refused, store, more, fault):
    assert fault in refused("summary", "a.sqlite", *more)


@pytest.mark.parametrize("target", ["a.csv", "a.parquet", "a.json", "a.xyz", "a.db"])
def test_a_full_disk_leaves_the_old_file(refused, put, database, target):
    # A limit on the size of files stands for the end of the disk; it would strike SQLite's own files as well.
    with open_store(database, create=True) as opened:
        opened.write([done(number) for number in range(40)])
    put("the old export", target)
    kept = resource.getrlimit(resource.RLIMIT_FSIZE)
    resource.setrlimit(resource.RLIMIT_FSIZE, (2000, kept[1]))
    try:
        assert f"{target}: cannot write the file" in refused("export", database, "--to", target)
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, kept)


def test_the_store_is_not_replaced_by_its_export(refused, tmp_path):
    with open_store(tmp_path / "a.db", create=True) as opened:
        opened.write([done(1)])
    assert "that is the store itself" in refused("export", "a.db", "--to", "./a.db")


def test_a_missing_library_is_named(refused, store, monkeypatch):
    monkeypatch.setitem(__import__("sys").modules, "pyarrow", None)
    assert "pip install 'ehmo[tables]'" in refused("export", store, "--to", "a.parquet")


def test_databases_that_do_not_answer(refused, server, command):
    absent = server.address("absent")
    wrong = server.address("postgres").replace(QUOTED, "oh%2Fso%20wrong")
    away = server.address("postgres").replace(f":{server.port}/", ":1/")
    for address, fault in ((absent, "does not exist"), (wrong, "authentication failed"), (away, "cannot be reached")):
        line = refused(*words(command, address), "--wait", "0")
        assert fault in line
        assert "***" in line
        for secret in (QUOTED, "not/so secret", "oh%2Fso", "oh/so"):
            assert secret not in line


def test_credentials_are_in_no_export(ehmo, database, tmp_path):
    with open_store(database, create=True) as opened:
        opened.write([done(1)])
    for target in ("a.json", "a.parquet", "a.csv", "a.db", "a.xyz"):
        ran = ehmo("export", database, "--to", target)
        assert ran.status == 0
        for secret in (QUOTED, "not/so secret"):
            assert secret not in ran.out
            assert secret.encode() not in (tmp_path / target).read_bytes()


def test_an_empty_database_is_no_store(refused, command, database):
    assert "it is no store" in refused(*words(command, database))
