"""Faults of a long run, made to happen: every other row is right, none comes twice, the cause is on its row."""

from __future__ import annotations

import json
import os
import re
import resource
import signal
import sqlite3
import subprocess
import sys
import threading
import time
from contextlib import closing
from pathlib import Path

import pytest

import ehmo as package
from ehmo.batch import BatchSettings, LocalPool, run_batch, work_items
from ehmo.batch.items import with_parameters
from ehmo.errors import BatchError, StoreError
from ehmo.report.document import bond_document
from ehmo.store import open_store
from tests.batch.files import many_frames, put, xyz_text

ROOT = Path(__file__).parents[2]
SETTINGS = with_parameters(BatchSettings(), "standard")


@pytest.fixture
def poison(tmp_path, monkeypatch):
    """Worker processes in which structures do as their title says."""
    monkeypatch.setenv("PYTHONPATH", f"{Path(__file__).parent / 'poison'}{os.pathsep}{ROOT}")
    monkeypatch.setenv("POISON_MARKER", str(tmp_path / "marker"))


def titled(text: str, title: str) -> str:
    return text.replace(text.split("\n")[1].split(" ")[0], title, 1)


def batch(path, location, workers=2, settings=SETTINGS, on_progress=lambda *_: None, **limits):
    pool = LocalPool(workers, **limits)
    with closing(pool), open_store(location, create=True) as store:
        return run_batch(work_items([str(path)]), store, pool, settings, on_progress=lambda r: on_progress(pool, r))


def rows(location):
    with open_store(location, read_only=True) as store:
        return list(store.rows())


def assert_right(location, path, failed=(), every=1):
    """Every structure has one row, and done rows (or every so many) hold what a single calculation gives."""
    found = {row.provenance.entry: row for row in rows(location)}
    fragments = package.read_frames(path)
    assert len(found) == len(rows(location)) == len(fragments)
    for k, fragment in enumerate(fragments, 1):
        row = found[f"frame {k}"]
        if k in failed:
            assert row.status == "failed"
            continue
        assert (row.status, row.message) == ("done", "")
        if k % every == 0:
            assert row.document == json.loads(json.dumps(bond_document(package.bond_report(fragment))))


def test_processes_give_what_this_process_gives(tmp_path):
    path, location = put(tmp_path, "a.xyz", many_frames(24)), str(tmp_path / "r.sqlite")
    result = batch(path, location)
    assert (result.done, result.failed, result.skipped) == (24, 0, 0)
    assert result.size_done == path.stat().st_size
    assert_right(location, path)
    again = batch(path, location)
    assert (again.done, again.skipped) == (0, 24)


def test_a_worker_killed_in_the_middle_costs_nothing(tmp_path):
    path, location = put(tmp_path, "a.xyz", many_frames(40)), str(tmp_path / "r.sqlite")
    killed = []

    def kill(pool, result):
        if len(killed) < 3 and result.done >= 10 * (len(killed) + 1):
            killed.append(pool.pids[0])
            os.kill(pool.pids[0], signal.SIGKILL)

    result = batch(path, location, on_progress=kill)
    assert len(set(killed)) == 3
    assert (result.done, result.failed) == (40, 0)
    assert_right(location, path, every=4)


@pytest.mark.parametrize(("title", "signal_name"), [("KILLS", "SIGKILL"), ("CRASHES", "SIGABRT")])
def test_a_structure_that_kills_its_process_is_found_and_named(tmp_path, poison, title, signal_name):
    text = many_frames(7) + titled(xyz_text("CrO4 2-"), title) + many_frames(6, ["WO4 2-", "ReO4 -"])
    path, location = put(tmp_path, "a.xyz", text), str(tmp_path / "r.sqlite")
    count = len(package.read_frames(path))
    result = batch(path, location)
    assert (result.done, result.failed) == (count - 1, 1)
    assert_right(location, path, failed={8})
    (row,) = (row for row in rows(location) if row.status == "failed")
    assert row.provenance.entry == "frame 8"
    assert re.fullmatch(rf"{path}, frame 8: its process ended twice \(signal {signal_name}\); .*", row.message)
    assert batch(path, location).skipped == count, "the culprit is left alone in the next run"


def test_a_structure_over_which_a_process_died_once_by_chance_is_done(tmp_path, poison):
    text = many_frames(3) + titled(xyz_text("CrO4 2-"), "ONCE") + many_frames(1, ["OsO4"])
    path, location = put(tmp_path, "a.xyz", text), str(tmp_path / "r.sqlite")
    result = batch(path, location)
    assert (tmp_path / "marker").exists()
    assert (result.done, result.failed) == (5, 0)


def test_a_structure_that_hangs_is_ended_at_the_limit(tmp_path, poison):
    text = many_frames(4) + titled(xyz_text("CrO4 2-"), "HANGS") + many_frames(3, ["OsO4", "MnO4 -", "WO4 2-"])
    path, location = put(tmp_path, "a.xyz", text), str(tmp_path / "r.sqlite")
    result = batch(path, location, time_limit_s=8.0)
    assert (result.done, result.failed) == (7, 1)
    assert_right(location, path, failed={5})
    (row,) = (row for row in rows(location) if row.status == "failed")
    assert row.message == f"{path}, frame 5: not finished after 8 s; raise --time-limit"
    assert row.provenance.duration_s == pytest.approx(8.0, abs=4.0)


def test_what_a_library_prints_is_no_answer(tmp_path, poison):
    path = put(tmp_path, "a.xyz", many_frames(2) + titled(xyz_text("CrO4 2-"), "PRINTS"))
    result = batch(path, str(tmp_path / "r.sqlite"))
    assert (result.done, result.failed) == (3, 0)


def block_of_water(count: int) -> str:
    """Aqua vanadyl among waters on a lattice: as large a calculation as wanted."""
    ion = xyz_text("[VO(OH2)5]2+").split("\n")[2:-1]
    places = sorted(
        ((x, y, z) for x in range(-9, 10) for y in range(-9, 10) for z in range(-9, 10)), key=lambda p: sum(map(abs, p))
    )
    far = [place for place in places if sum(k * k for k in place) > 9][:count]
    for x, y, z in far:
        a, b, c = 3.1 * x, 3.1 * y, 3.1 * z
        ion += [f"O {a} {b} {c}", f"H {a + 0.76} {b + 0.59} {c}", f"H {a - 0.76} {b + 0.59} {c}"]
    return f"{len(ion)}\nblock charge=2 unpaired=1\n" + "\n".join(ion) + "\n"


def test_a_structure_that_eats_memory_is_refused_it(tmp_path):
    # 600 waters make 3600 functions: one matrix takes 0.1 GB, and a calculation holds about ten.
    path = put(tmp_path, "a.xyz", many_frames(2) + block_of_water(600) + many_frames(1, ["OsO4"]))
    location = str(tmp_path / "r.sqlite")
    result = batch(path, location, workers=1, memory_limit=800_000_000, time_limit_s=300.0)
    assert (result.done, result.failed) == (3, 1)
    (row,) = (row for row in rows(location) if row.status == "failed")
    assert row.provenance.entry == "frame 3"
    assert "memory" in row.message
    assert "--memory-limit" in row.message


def test_workers_that_cannot_start_end_the_run_with_the_reason(tmp_path):
    path = put(tmp_path, "a.xyz", many_frames(2))
    # Memory for the interpreter, not for the libraries: the limit is set before they are loaded.
    poor = put(tmp_path, "poor/sitecustomize.py", "import sys\nif 'ehmo.batch.worker' in sys.orig_argv: sys.exit(3)\n")
    before = os.environ.get("PYTHONPATH", "")
    os.environ["PYTHONPATH"] = f"{poor.parent}{os.pathsep}{before}"
    try:
        with pytest.raises(BatchError, match=r"end as they start \(exit status \d+\)"):
            batch(path, str(tmp_path / "r.sqlite"))
    finally:
        os.environ["PYTHONPATH"] = before


# The writer.


def command(*words: object) -> list[str]:
    return [sys.executable, "-m", "ehmo", "batch", *map(str, words)]


def environment() -> dict[str, str]:
    return {**os.environ, "PYTHONPATH": str(ROOT)}


def children_of(pid: int) -> list[int]:
    tasks = Path(f"/proc/{pid}/task").iterdir()
    return [int(word) for task in tasks for word in (task / "children").read_text().split()]


def count(location: Path) -> int:
    if not location.exists():
        return 0
    try:
        with closing(sqlite3.connect(f"file:{location}?mode=ro", uri=True)) as connection:
            return int(connection.execute("SELECT count(*) FROM structures").fetchone()[0])
    except sqlite3.Error:
        return 0


def waited(condition, limit_s=120.0) -> bool:
    end = time.monotonic() + limit_s
    while time.monotonic() < end:
        if condition():
            return True
        time.sleep(0.02)
    return False


def running_until(location: Path, rows_wanted: int, *words: object) -> subprocess.Popen[str]:
    """A batch in a process of its own that has stored that many rows."""
    process = subprocess.Popen(
        command(*words, "--store", location),
        env=environment(),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )
    assert waited(lambda: count(location) >= rows_wanted or process.poll() is not None)
    return process


def test_the_writer_killed_loses_nothing_that_it_stored_and_a_rerun_completes(tmp_path):
    path, location = put(tmp_path, "a.xyz", many_frames(400)), tmp_path / "r.sqlite"
    process = running_until(location, 50, path, "--workers", 2)
    workers = children_of(process.pid)
    assert process.poll() is None, "it must still have been at work"
    assert len(workers) == 2
    process.kill()
    process.communicate()
    kept = {row.key: row.provenance.started_utc for row in rows(location)}
    assert 50 <= len(kept) < 400
    assert waited(lambda: not any(Path(f"/proc/{pid}").exists() for pid in workers), 30.0), "workers end by themselves"
    result = batch(path, str(location))
    assert (result.done, result.skipped) == (400 - len(kept), len(kept))
    after = {row.key: row.provenance.started_utc for row in rows(location)}
    assert len(after) == 400
    assert {key: after[key] for key in kept} == kept
    with closing(sqlite3.connect(location)) as connection:
        assert connection.execute("PRAGMA integrity_check").fetchone() == ("ok",)


def test_a_request_to_end_keeps_what_is_finished(tmp_path):
    path, location = put(tmp_path, "a.xyz", many_frames(400)), tmp_path / "r.sqlite"
    process = running_until(location, 20, path, "--workers", 1)
    process.send_signal(signal.SIGTERM)
    out, err = process.communicate(timeout=60)
    assert process.returncode == 130
    assert out == ""
    assert "the same command goes on from there" in err
    assert 20 <= count(location) < 400


def test_a_full_disk_ends_the_run_in_words_and_a_rerun_completes(tmp_path):
    path, location = put(tmp_path, "a.xyz", many_frames(300)), tmp_path / "r.sqlite"

    def small_disk():
        # Files of this process cannot grow beyond this, which SQLite meets as it meets a full disk. Hundred rows, the
        # longest transaction, take 1.3 MB.
        resource.setrlimit(resource.RLIMIT_FSIZE, (2_000_000, 2_000_000))

    done = subprocess.run(
        command(path, "--store", location, "--workers", 1),
        env=environment(),
        preexec_fn=small_disk,
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 2
    assert re.search(r"disk is (full|full or gone)|reading or writing failed", done.stderr)
    assert "Traceback" not in done.stderr
    kept = count(location)
    assert 0 < kept < 300
    assert batch(path, str(location)).skipped == kept
    assert_right(str(location), path, every=30)


def test_a_locked_store_is_waited_for_and_then_given_up_in_words(tmp_path):
    path, location = put(tmp_path, "a.xyz", many_frames(3)), tmp_path / "r.sqlite"
    open_store(location, create=True).close()
    other = sqlite3.connect(location, isolation_level=None, check_same_thread=False)
    other.execute("BEGIN IMMEDIATE")
    pool = LocalPool(1)
    with closing(pool), open_store(location, wait_s=0.3) as store, pytest.raises(StoreError, match="another program"):
        run_batch(work_items([str(path)]), store, pool, SETTINGS)
    assert pool.pids == []
    threading.Timer(2.0, other.execute, ("ROLLBACK",)).start()
    assert batch(path, str(location), workers=1).done == 3
    other.close()
    assert_right(str(location), path)


def test_a_database_that_restarts_is_waited_for(tmp_path, server, database):
    path = put(tmp_path, "a.xyz", many_frames(250))
    restarted = []

    def restart(_, result):
        if result.done >= 110 and not restarted:
            restarted.append(result.done)
            server.stop("immediate")
            threading.Timer(1.0, server.start).start()

    result = batch(path, database, on_progress=restart)
    assert restarted
    assert (result.done, result.failed) == (250, 0)
    assert_right(database, path, every=25)
