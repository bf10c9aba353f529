"""Peak memory of a calculation on about 1000 functions, in matrices of that size."""

from __future__ import annotations

import subprocess
import sys

N_FUNCTIONS = 997

# A process of its own: what other work has held counts for nothing. The small calculation loads the libraries.
SCRIPT = """
from pathlib import Path
from benchmarks.bench_calculation import calculation
from ehmo.records.options import Options
options = Options(charge_model="fixed")
calculation(43, options)

def peak():
    # Not ru_maxrss, which a child process inherits from its parent.
    lines = Path("/proc/self/status").read_text().splitlines()
    return 1024 * int(next(line for line in lines if line.startswith("VmHWM")).split()[1])

before = peak()
calculation(N, options)
print(peak() - before)
"""


def bench_peak_memory(benchmark, record_ratio):
    """Growth of the resident set of a fresh process, its result included."""

    def measure() -> float:
        command = [sys.executable, "-c", SCRIPT.replace("N, options", f"{N_FUNCTIONS}, options")]
        done = subprocess.run(command, capture_output=True, text=True, check=True)
        return float(done.stdout)

    grown = benchmark.pedantic(measure, rounds=1)
    record_ratio(f"peak memory at {N_FUNCTIONS} functions, in matrices", grown / (8 * N_FUNCTIONS**2), 12)
