"""Batches on a real dask scheduler with real workers."""

from __future__ import annotations

import os
import signal
from contextlib import closing
from pathlib import Path

import pytest

from ehmo.batch import run_batch, work_items
from ehmo.batch.connecting import TlsFiles, checked_address, connected_engine
from ehmo.errors import BatchError, InputError
from ehmo.store import open_store
from tests.batch.dask_programs import DaskPrograms
from tests.batch.files import many_frames, put, xyz_text
from tests.batch.test_faults import SETTINGS, assert_right, rows, titled

pytest.importorskip("distributed", reason="dask is not installed: pip install 'ehmo[cluster]'")


@pytest.fixture
def programs(tmp_path):
    """Starter of a scheduler, stopped afterwards."""
    started = []

    def start(workers: int = 2, **words) -> DaskPrograms:
        folder = tmp_path / f"dask{len(started)}"
        folder.mkdir()
        started.append(DaskPrograms(folder, **words))
        for _ in range(workers):
            started[-1].add_worker()
        return started[-1]

    yield start
    for one in started:
        one.stop()


def batch(path, location, address, tls=None, on_progress=lambda _: None, **limits):
    with closing(connected_engine(address, tls, **limits)) as engine, open_store(location, create=True) as store:
        return run_batch(work_items([str(path)]), store, engine, SETTINGS, on_progress=on_progress)


def test_workers_of_a_cluster_give_what_this_machine_gives(tmp_path, programs):
    path, location = put(tmp_path, "a.xyz", many_frames(20)), str(tmp_path / "r.sqlite")
    cluster = programs()
    result = batch(path, location, cluster.address)
    assert (result.done, result.failed) == (20, 0)
    assert result.size_done == path.stat().st_size
    assert_right(location, path, every=5)
    assert batch(path, location, cluster.address).skipped == 20


def test_a_worker_that_is_lost_costs_nothing(tmp_path, programs):
    path, location = put(tmp_path, "a.xyz", many_frames(50)), str(tmp_path / "r.sqlite")
    cluster = programs(workers=0)
    first = cluster.add_worker(nanny=False)
    lost = []

    def lose(result):
        if result.done >= 5 and not lost:
            lost.append(first.pid)
            cluster.add_worker(nanny=False)
            os.kill(first.pid, signal.SIGKILL)

    result = batch(path, location, cluster.address, on_progress=lose)
    assert lost
    assert (result.done, result.failed) == (50, 0)
    assert_right(location, path, every=20)


def test_crashing_and_hanging_structures_get_their_rows(tmp_path, programs):
    text = many_frames(2) + titled(xyz_text("CrO4 2-"), "KILLS") + titled(xyz_text("WO4 2-"), "HANGS") + many_frames(4)
    path, location = put(tmp_path, "a.xyz", text), str(tmp_path / "r.sqlite")
    poison = f"{Path(__file__).parent / 'poison'}{os.pathsep}{Path(__file__).parents[2]}"
    environment = {"PYTHONPATH": poison, "POISON_MARKER": str(tmp_path / "marker")}
    cluster = programs(workers=1, environment=environment)
    result = batch(path, location, cluster.address, time_limit_s=8.0)
    # Two of the last four frames are the first two again: a structure has one row.
    assert result.failed == 2
    messages = {row.provenance.entry: row.message for row in rows(location) if row.status == "failed"}
    assert "its process ended twice (signal SIGKILL)" in messages["frame 3"]
    assert "not finished after 8 s" in messages["frame 4"]
    assert len([row for row in rows(location) if row.status == "done"]) == 4


def test_a_scheduler_that_goes_ends_the_run_in_words_and_a_rerun_completes(tmp_path, programs):
    path, location = put(tmp_path, "a.xyz", many_frames(60)), str(tmp_path / "r.sqlite")
    cluster = programs(workers=1)

    def stop(result):
        if result.done >= 4:
            cluster.scheduler.kill()

    with pytest.raises(BatchError, match="the scheduler is gone; start it and run the same command again"):
        batch(path, location, cluster.address, on_progress=stop)
    kept = len(rows(location))
    assert 4 <= kept < 60
    again = programs(workers=2)
    result = batch(path, location, again.address)
    assert (result.done, result.skipped) == (60 - kept, kept)
    assert_right(location, path, every=20)


# Encryption.


@pytest.fixture(scope="module")
def authority(tmp_path_factory):
    """Writes certificate and key of an authority of its own into files."""
    distributed = pytest.importorskip("distributed")

    def make(name: str) -> TlsFiles:
        security = distributed.Security.temporary()
        folder = tmp_path_factory.mktemp(name)
        texts = (security.tls_ca_file, security.tls_client_cert, security.tls_client_key)
        paths = [put(folder, f"{part}.pem", text) for part, text in zip(("ca", "cert", "key"), texts, strict=True)]
        return TlsFiles(*map(str, paths))

    return make


def test_encrypted_connections_need_the_same_authority(tmp_path, programs, authority):
    path, location = put(tmp_path, "a.xyz", many_frames(4)), str(tmp_path / "r.sqlite")
    ours, foreign = authority("ours"), authority("foreign")
    words = ["--tls-ca-file", ours.authority, "--tls-cert", ours.certificate, "--tls-key", ours.key]
    cluster = programs(workers=1, tls=words)
    assert cluster.address.startswith("tls://127.0.0.1:")
    assert batch(path, location, cluster.address, ours).done == 4
    with pytest.raises(BatchError, match="no scheduler answers"):
        connected_engine(cluster.address, foreign)
    with pytest.raises(BatchError, match="no scheduler answers"):
        connected_engine(cluster.address.replace("tls", "tcp"))


@pytest.mark.parametrize(
    ("address", "words"),
    [
        ("tcp://192.0.2.7:8786", "whatever anyone sends"),
        ("tcp://scheduler.example:8786", "whatever anyone sends"),
        ("tls://127.0.0.1:8786", "needs certificates"),
        ("127.0.0.1:8786", "no address"),
        ("inproc://127.0.0.1/1", "no address"),
        ("tcp://127.0.0.1", "no address"),
        ("tcp://127.0.0.1:99999", "no address"),
        ("tcp://[::1", "no address"),
    ],
)
def test_unsafe_addresses_are_refused(address, words):
    with pytest.raises(InputError, match=words):
        checked_address(address, None)


@pytest.mark.parametrize("address", ["tcp://127.0.0.1:8786", "tcp://localhost:1", "tcp://[::1]:8786"])
def test_loopback_needs_no_encryption(address):
    checked_address(address, None)


def test_nobody_at_the_address_is_said_in_words(refused, tmp_path, monkeypatch):
    monkeypatch.setattr("ehmo.batch.connecting.CONNECT_LIMIT_S", 0.5)
    put(tmp_path, "a.xyz", xyz_text("OsO4"))
    line = refused("batch", "a.xyz", "--store", "r.sqlite", "--scheduler", "tcp://127.0.0.1:9")
    assert "no scheduler answers" in line


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("--scheduler", "tcp://127.0.0.1:9", "--workers", "2"), "exclude each other"),
        (("--slurm", "p.toml", "--scheduler", "tcp://127.0.0.1:9"), "exclude each other"),
        (("--tls-ca", "a.pem"), "go together"),
        (("--scheduler", "tls://h:1", "--tls-ca", "a", "--tls-cert", "b", "--tls-key", "c"), "no such file"),
        (("--workers", "-1"), "--workers -1"),
        (("--time-limit", "0"), "--time-limit 0"),
        (("--memory-limit", "0.1"), "--memory-limit 0.1"),
        (("--print-job",), "--slurm PROFILE.toml"),
    ],
)
def test_refusals(refused, tmp_path, words, said):
    put(tmp_path, "a.xyz", xyz_text("OsO4"))
    assert said in refused("batch", "a.xyz", "--store", "r.sqlite", *words)


def test_sources_and_store_are_asked_for(refused):
    assert "nothing to calculate" in refused("batch", "--store", "r.sqlite")
    assert "--store FILE.sqlite" in refused("batch", "a.xyz")
