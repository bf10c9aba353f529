"""A store of 100,000 structures: seconds of summary and resume check, memory of an export."""

from __future__ import annotations

import hashlib
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

import ehmo
from benchmarks.pairs import seconds
from benchmarks.systems import VANADYL
from ehmo.report.document import bond_document
from ehmo.report.summary_text import summary_text
from ehmo.store import DONE, PackedRow, StoredRow, open_store, pack, summarise
from ehmo.store.packing import compressed
from tests.geometries import SPECIES
from tests.store.rows import provenance

STRUCTURES = 100_000
PART = 20_000
LIMIT_S = 5.0
_AT_ONCE = 2_000

PEAK = """
import sys
from pathlib import Path
from ehmo.cli import main
assert main(["export", sys.argv[1], "--to", sys.argv[2]]) == 0
# Not ru_maxrss, which a child process inherits from its parent.
lines = Path("/proc/self/status").read_text().splitlines()
sys.stderr.write(next(line for line in lines if line.startswith("VmHWM")).split()[1])
"""


def key_of(number: int) -> str:
    return hashlib.sha256(str(number).encode()).hexdigest()


def fill(path: Path, structures: int) -> None:
    """Six bonds to a structure, lengths and orders of aqua vanadyl scattered, one structure in twenty failed."""
    whole = bond_document(ehmo.bond_report(SPECIES[VANADYL].fragment()))
    model = pack(StoredRow(key_of(0), DONE, "", whole, provenance()))
    failed = pack(StoredRow(key_of(0), "failed", "x.xyz, line 3: no metal; give a complex", None, provenance()))
    small = compressed({"fragment": {}})  # neither reads full records
    rng = np.random.default_rng(1)
    with open_store(path, create=True) as store:
        for first in range(0, structures, _AT_ONCE):
            rows = []
            for number, scatter in enumerate(rng.standard_normal((_AT_ONCE, 6)).tolist(), start=first):
                one = failed if number % 20 == 0 else model
                bonds = tuple(
                    dict(bond) | {"mayer": bond["mayer"] - 0.1 * s, "length_A": bond["length_A"] + 0.02 * s}
                    for bond, s in zip(one.bonds, scatter, strict=False)
                )
                structure = dict(one.structure) | {"key": key_of(number), "source": f"set/{number}.xyz"}
                rows.append(PackedRow(structure, bonds, None if one is failed else small))
            store.write(rows)


@pytest.fixture(scope="module")
def stores(tmp_path_factory) -> dict[int, Path]:
    """Stores by their number of structures."""
    folder = tmp_path_factory.mktemp("stores")
    paths = {count: folder / f"{count}.sqlite" for count in (PART, STRUCTURES)}
    for count, path in paths.items():
        fill(path, count)
    return paths


def bench_summary(benchmark, record_ratio, stores):
    def work() -> None:
        with open_store(stores[STRUCTURES], read_only=True) as store:
            assert "V      oxo" in summary_text(summarise(store))

    taken = benchmark.pedantic(lambda: seconds(work), rounds=3)
    record_ratio(f"seconds of a summary of {STRUCTURES} structures", taken, LIMIT_S)


def bench_resume_check(benchmark, record_ratio, stores):
    keys = [key_of(number) for number in range(STRUCTURES)]

    def work() -> None:
        with open_store(stores[STRUCTURES], read_only=True) as store:
            assert len(store.statuses(keys)) == STRUCTURES

    taken = benchmark.pedantic(lambda: seconds(work), rounds=3)
    record_ratio(f"seconds to look up {STRUCTURES} keys", taken, LIMIT_S)


def bench_export_memory(benchmark, record_ratio, stores):
    def peak(count: int) -> float:
        words = [sys.executable, "-c", PEAK, str(stores[count]), str(stores[count].with_suffix(".csv"))]
        return float(subprocess.run(words, capture_output=True, text=True, check=True).stderr)

    grown = benchmark.pedantic(lambda: peak(STRUCTURES) / peak(PART), rounds=1)
    record_ratio(f"peak memory of exporting {STRUCTURES} structures, in that of {PART}", grown, 1.1)
