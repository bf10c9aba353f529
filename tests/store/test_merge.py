"""Stores of several runs become one: every row once, whatever they shared."""

from __future__ import annotations

import sqlite3
from contextlib import closing

import pytest

from ehmo.store import merge, open_store
from tests.store.rows import done, failed, key
from tests.store.version_1 import VERSION_1

FIRST = [done(1), failed(2), failed(3, started_utc="2026-12-01T12:00:00Z"), failed(6)]
SECOND = [
    done(1, source="other.xyz"),
    done(2),
    failed(3, "later", started_utc="2026-12-02T12:00:00Z"),
    done(4),
    failed(6),
]


@pytest.fixture
def shards(tmp_path) -> list[str]:
    paths = [str(tmp_path / "first.sqlite"), str(tmp_path / "second.sqlite")]
    for path, rows in zip(paths, (FIRST, SECOND), strict=True):
        with open_store(path, create=True) as store:
            store.write(rows)
    return paths


def test_every_key_once_and_the_better_row(ehmo, location, shards):
    ran = ehmo("merge", location, *shards)
    assert (ran.status, ran.err) == (0, "")
    with open_store(location, read_only=True) as store:
        assert list(store.rows()) == [FIRST[0], SECOND[1], SECOND[2], FIRST[3], SECOND[3]]
        assert store.table("bonds")["key"].tolist() == [key(k) for k in (1, 2, 4) for _ in range(6)]
    lines = [line.split() for line in ran.out.splitlines()]
    assert lines[1][1:] == ["4", "4", "0", "0"]
    assert lines[2][1:] == ["5", "1", "2", "2"]
    assert ran.out.endswith(" has 3 done rows and 2 failed rows.\n")


def test_merging_again_changes_nothing(ehmo, location, shards):
    ehmo("merge", location, *shards)
    with open_store(location, read_only=True) as store:
        before = list(store.rows())
    ran = ehmo("merge", location, *shards)
    assert [line.split()[2:] for line in ran.out.splitlines()[1:3]] == [["0", "0", "4"], ["0", "0", "5"]]
    with open_store(location, read_only=True) as store:
        assert list(store.rows()) == before


def test_from_a_database_into_a_file(ehmo, database, tmp_path):
    with open_store(database, create=True) as store:
        store.write(SECOND)
    assert ehmo("merge", "new.sqlite", database).status == 0
    with open_store(tmp_path / "new.sqlite") as store:
        assert list(store.rows()) == SECOND


def test_more_rows_than_a_transaction(tmp_path):
    rows = [failed(number) for number in range(250)]
    with open_store(tmp_path / "a", create=True) as source, open_store(tmp_path / "b", create=True) as into:
        source.write(rows)
        assert merge(into, source) == (250, 0, 0)
        assert merge(into, source) == (0, 0, 250)
        assert list(into.rows()) == rows


def test_an_older_store_is_brought_forward_on_the_way(ehmo, tmp_path):
    old = tmp_path / "old.sqlite"
    with closing(sqlite3.connect(old)) as raw:
        raw.executescript(VERSION_1)
    ran = ehmo("merge", "new.sqlite", "old.sqlite")
    assert ran.out.endswith("new.sqlite has no rows.\n")
    with closing(sqlite3.connect(old)) as raw:
        assert raw.execute("SELECT value FROM ehmo_store").fetchall() == [("1",)]


@pytest.mark.parametrize(
    ("words", "fault"),
    [
        (["first.sqlite", "first.sqlite"], "into itself"),
        (["first.sqlite", "./first.sqlite"], "into itself"),
        (["new.sqlite", "first.sqlite", "first.sqlite"], "named twice"),
        (["new.sqlite", "first.sqlite", "../{folder}/first.sqlite"], "named twice"),
        (["new.sqlite", "first.sqlite", "absent.sqlite"], "no such store"),
        (["new.sqlite", "first.sqlite", "."], "is a folder"),
        (["new.sqlite", ""], "has no name"),
        (["", "first.sqlite"], "has no name"),
        (["absent/new.sqlite", "first.sqlite"], "cannot be opened"),
        (["new.sqlite"], "required"),
    ],
)
def test_what_cannot_be_merged(refused, shards, tmp_path, words, fault):
    assert fault in refused("merge", *[word.format(folder=tmp_path.name) for word in words])


def test_a_newer_source_is_refused_before_anything_is_written(refused, shards):
    with closing(sqlite3.connect(shards[1])) as raw:
        raw.execute("UPDATE ehmo_store SET value = '99'")
        raw.commit()
    assert "version 99" in refused("merge", "new.sqlite", *shards)


def test_a_newer_target_is_refused(refused, shards):
    with closing(sqlite3.connect(shards[0])) as raw:
        raw.execute("UPDATE ehmo_store SET value = '99'")
        raw.commit()
    assert "version 99" in refused("merge", *shards)


def test_a_target_that_another_program_writes_to(refused, shards):
    with closing(sqlite3.connect(shards[0], isolation_level=None)) as writer:
        writer.execute("BEGIN IMMEDIATE")
        assert "another program is writing to it" in refused("merge", *shards, "--wait", "0.1")
        writer.execute("ROLLBACK")
