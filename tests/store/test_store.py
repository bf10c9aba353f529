"""What is written is read back; one row per key."""

from ehmo.store import open_store
from tests.store.rows import done, failed, key, provenance


def test_rows_come_back_as_they_went_in(location):
    rows = [done(1), failed(2), done(3, "MnO4 -", tags=(), entry="frame 2")]
    with open_store(location, create=True) as store:
        store.write(rows)
    with open_store(location, read_only=True) as store:
        assert list(store.rows()) == rows
        assert list(store.rows(status="failed")) == [rows[1]]
        assert store.counts() == {"done": 2, "failed": 1}


def test_statuses_of_many_keys(location):
    with open_store(location, create=True) as store:
        store.write([failed(number) for number in range(1500)])
        store.write([done(1600)])
        known = store.statuses(key(number) for number in range(2000))
    assert known == {key(number): "failed" for number in range(1500)} | {key(1600): "done"}


def test_a_done_row_stays(location):
    with open_store(location, create=True) as store:
        store.write([done(1)])
        store.write([failed(1, started_utc="2027-01-01T00:00:00Z"), done(1, source="other.xyz")])
        assert list(store.rows()) == [done(1)]


def test_a_done_row_replaces_a_failed_one_in_its_place(location):
    with open_store(location, create=True) as store:
        store.write([failed(1), failed(2)])
        store.write([done(1)])
        assert list(store.rows()) == [done(1), failed(2)]


def test_the_later_of_two_failures_is_kept(location):
    later = failed(1, "time limit", started_utc="2026-12-02T00:00:00Z")
    with open_store(location, create=True) as store:
        store.write([later])
        store.write([failed(1)])
        assert list(store.rows()) == [later]


def test_one_key_twice_in_one_call(location):
    with open_store(location, create=True) as store:
        store.write([failed(1), done(1), failed(1)])
        assert list(store.rows()) == [done(1)]


def test_more_rows_than_a_page(location):
    rows = [failed(number, source=f"{number}.xyz") for number in range(450)]
    with open_store(location, create=True) as store:
        store.write(rows)
        assert list(store.rows()) == rows


def test_text_that_no_database_takes_is_escaped(location):
    with open_store(location, create=True) as store:
        store.write([failed(1, "null \x00", source="name \udcff", tags=("a\x00",))])
        (row,) = store.rows()
    assert (row.message, row.provenance) == ("null \\x00", provenance(source="name \\udcff", tags=("a\\x00",)))
