"""PostgreSQL: passwords from the environment, a restart in the middle of the work."""

from __future__ import annotations

import pytest

from ehmo.errors import StoreError
from ehmo.store import merge, open_store, summarise
from tests.store.rows import done, failed
from tests.store.servers import PASSWORD, QUOTED

ROWS = [*(done(k, "MnO4 -") for k in range(10)), failed(20)]


@pytest.fixture
def filled_database(database) -> str:
    with open_store(database, create=True) as store:
        store.write(ROWS)
    return database


def test_password_from_the_environment(ehmo, filled_database, monkeypatch):
    address = filled_database.replace(f":{QUOTED}@", "@")
    monkeypatch.setenv("PGPASSWORD", PASSWORD)
    for words in (("summary", address), ("export", address, "--to", "a.csv"), ("merge", "a.sqlite", address)):
        ran = ehmo(*words)
        assert (ran.status, ran.err) == (0, "")
        assert PASSWORD not in ran.out


def test_password_from_a_file(ehmo, filled_database, monkeypatch, put, server):
    path = put(f"127.0.0.1:{server.port}:*:tester:{PASSWORD}\n", "passwords")
    path.chmod(0o600)
    monkeypatch.setenv("PGPASSFILE", str(path))
    ran = ehmo("summary", filled_database.replace(f":{QUOTED}@", "@"))
    assert ran.status == 0
    assert "10 structures done, 1 failed; 40 metal-donor bonds" in ran.out


@pytest.mark.parametrize("how", ["fast", "immediate"])
def test_a_restart_between_pages(filled_database, server, monkeypatch, how):
    monkeypatch.setattr("ehmo.store.reading.PAGE", 4)
    with open_store(filled_database, read_only=True) as store:
        rows = store.rows()
        found = [next(rows)]
        server.stop(how)
        server.start()
        found += rows
        server.stop(how)
        server.start()
        assert summarise(store).done == 10
    assert found == ROWS


def test_a_restart_in_the_middle_of_a_merge(filled_database, server, tmp_path, monkeypatch):
    monkeypatch.setattr("ehmo.store.merging.ROWS_AT_ONCE", 2)
    with open_store(tmp_path / "a.sqlite", create=True) as source:
        source.write([*ROWS, *(failed(k) for k in range(30, 40))])
    with open_store(tmp_path / "a.sqlite", read_only=True) as source, open_store(filled_database) as into:
        write = into.write

        def interrupted(rows):
            if rows[0].key == failed(30).key:
                server.stop("immediate")
                server.start()
            return write(rows)

        monkeypatch.setattr(into, "write", interrupted)
        assert merge(into, source) == (10, 0, 11)
        assert list(into.rows()) == list(source.rows())


def test_a_database_that_stays_away_is_told_in_time(filled_database, server):
    with open_store(filled_database, read_only=True, wait_s=1.0) as store:
        server.stop()
        try:
            with pytest.raises(StoreError, match=r"cannot be reached|shut down") as refused:
                list(store.rows())
        finally:
            server.start()
    assert PASSWORD not in str(refused.value)
