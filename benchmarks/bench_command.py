"""The command from cold against the libraries that any such program loads."""

from __future__ import annotations

import os
import subprocess
import sys

from ase import Atoms
from ase.io import write

from benchmarks.pairs import timed_in_turn
from benchmarks.systems import VANADYL
from tests.geometries import SPECIES


def bench_cold_command(tmp_path, benchmark, record_ratio):
    """``ehmo bond`` on aqua vanadyl, interpreter start included."""
    species = SPECIES[VANADYL]
    path = tmp_path / "vanadyl.xyz"
    write(path, Atoms(species.symbols, species.positions_A, info={"charge": 2, "unpaired": 1}))
    environment = {**os.environ, "OMP_NUM_THREADS": "1"}

    def call(*words: str) -> None:
        subprocess.run([sys.executable, *words], env=environment, check=True, stdout=subprocess.DEVNULL)

    def ours() -> None:
        call("-m", "ehmo", "bond", str(path))

    def libraries() -> None:
        call("-c", "import scipy.linalg, ase")

    ours()
    command, bare = timed_in_turn(ours, libraries, rounds=10)
    benchmark.pedantic(ours, rounds=5)
    record_ratio("ehmo bond from cold, in `python -c 'import scipy.linalg, ase'`", command / bare, 2.5)
