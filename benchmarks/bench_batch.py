"""Batches: what goes to reading and calculating, what a second worker brings, what a full store costs."""

from __future__ import annotations

import hashlib
import resource
from collections.abc import Iterator
from contextlib import closing
from dataclasses import replace
from itertools import count
from pathlib import Path
from time import perf_counter, process_time

import pytest

from benchmarks.pairs import timed_in_turn
from ehmo.batch import BatchResult, BatchSettings, Engine, InProcess, LocalPool, run_batch, work_items
from ehmo.batch.items import with_parameters
from ehmo.batch.run import known_keys
from ehmo.store import PackedRow, open_store, pack
from tests.batch.files import SMALL, many_frames
from tests.store.rows import done

COMPLEXES = ("[Co(NH3)6]3+", "Ti(NMe2)4", "Ti(OCH3)4", "[Cr(OH2)6]3+", "Cr(CO)5(C(OMe)Me)", "W(CCH3)(OCH3)3")
"""20 to 37 atoms."""
SETTINGS = with_parameters(BatchSettings(), "standard")
STORED = 100_000
MEGABYTE = 1 << 20

_NUMBERS = count()


def batch(path: Path, engine: Engine) -> BatchResult:
    """A batch into a store of its own."""
    with open_store(path.with_name(f"{next(_NUMBERS)}.sqlite"), create=True) as store:
        return run_batch(work_items([str(path)]), store, engine, SETTINGS)


@pytest.fixture
def complexes(tmp_path) -> Path:
    """Structures that all differ."""
    path = tmp_path / "complexes.xyz"
    path.write_text(many_frames(60, COMPLEXES))
    return path


def bench_one_process(complexes, benchmark, record_ratio):
    batch(complexes, InProcess())
    start = process_time()
    result = benchmark.pedantic(batch, (complexes, InProcess()), rounds=1)
    processor_s, working = process_time() - start, result.read_s + result.calculate_s
    share = working / result.elapsed_s
    record_ratio("one-process batch, share of reading and calculating", share, 0.9, more_is_better=True)
    record_ratio("the same with making the full records", (working + result.record_s) / result.elapsed_s)
    record_ratio("structures of 20 to 37 atoms per second of one processor", result.done / processor_s)


def bench_second_worker(complexes, benchmark, record_ratio):
    with closing(LocalPool(1)) as one, closing(LocalPool(2)) as two:
        for engine in (one, two):
            batch(complexes, engine)  # processes start here, and stay
        single, double = timed_in_turn(lambda: batch(complexes, one), lambda: batch(complexes, two), rounds=3)
        benchmark.pedantic(batch, (complexes, two), rounds=1)
    record_ratio("two workers on two cores, times one", single / double, 1.8, more_is_better=True)


def many_rows() -> Iterator[list[PackedRow]]:
    """Copies of a real row under keys of their own, in portions."""
    row = pack(done(0))
    for start in range(0, STORED, 1000):
        keys = (hashlib.sha256(str(k).encode()).hexdigest() for k in range(start, start + 1000))
        yield [replace(row, structure={**row.structure, "key": key}) for key in keys]


def bench_known_keys_of_a_full_store(tmp_path, benchmark, record_ratio):
    """What a rerun does first: the keys of 100,000 rows, and whether each of them is there."""
    with open_store(tmp_path / "full.sqlite", create=True) as store:
        for rows in many_rows():
            store.write(rows)
        keys = [hashlib.sha256(str(k).encode()).hexdigest() for k in range(STORED)]

        def check() -> int:
            known = known_keys(store)
            return sum(key in known for key in keys)

        start = perf_counter()
        assert check() == STORED
        record_ratio(f"resume check of {STORED:,} rows, in seconds", perf_counter() - start, 5.0)
        benchmark.pedantic(check, rounds=1)


def resident_megabytes() -> float:
    """Memory that this process holds."""
    pages = int(Path("/proc/self/statm").read_text().split()[1])
    return pages * resource.getpagesize() / MEGABYTE


@pytest.mark.skipif(not Path("/proc/self/statm").exists(), reason="the memory in use is read from /proc")
def bench_memory_stays_flat(tmp_path, benchmark, record_ratio):
    """Memory after few and after many structures: calculated ones, and 20,000 that are read and refused."""
    path = tmp_path / "many.xyz"
    path.write_text(many_frames(100, SMALL))
    batch(path, InProcess())
    before = resident_megabytes()
    path.write_text(many_frames(600, SMALL))
    benchmark.pedantic(batch, (path, InProcess()), rounds=1)
    record_ratio("growth of memory over 600 calculations, in megabytes", resident_megabytes() - before, 20.0)
    water = "3\ncharge=0\nO 0 0 0\nH 0 0 {:.6f}\nH 0.93 0 -0.24\n"
    path.write_text("".join(water.format(0.95 + 1e-6 * k) for k in range(2000)))
    batch(path, InProcess())
    before = resident_megabytes()
    path.write_text("".join(water.format(0.95 + 1e-6 * k) for k in range(20_000)))
    assert batch(path, InProcess()).failed == 20_000
    record_ratio("growth of memory over 20,000 items, in megabytes", resident_megabytes() - before, 20.0)
