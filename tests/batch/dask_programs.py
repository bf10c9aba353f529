"""A real scheduler and real workers of dask in processes of their own, on the loopback interface."""

from __future__ import annotations

import json
import os
import subprocess
import sys
import time
from collections.abc import Mapping, Sequence
from pathlib import Path

ROOT = Path(__file__).parents[2]
LIMIT_S = 90.0


class DaskPrograms:
    """Scheduler with some workers, started as their own command lines.

    Parameters
    ----------
    folder : Path
        For logs, and the file that tells the address.
    tls : sequence of str
        Words that make the connections encrypted.
    environment : mapping of str to str
        Added to that of the workers.
    """

    def __init__(self, folder: Path, tls: Sequence[str] = (), environment: Mapping[str, str] | None = None) -> None:
        self._folder, self._tls = folder, list(tls)
        self._file = folder / "scheduler.json"
        self._environment = {"PYTHONPATH": str(ROOT), **(environment or {})}
        self.workers: list[subprocess.Popen[bytes]] = []
        words = [
            "--host",
            "127.0.0.1",
            "--port",
            "0",
            "--no-dashboard",
            "--dashboard-address",
            "127.0.0.1:0",
            "--scheduler-file",
            str(self._file),
        ]
        self.scheduler = self._started("dask_scheduler", [*words, *(["--protocol", "tls"] if tls else [])])
        self.address = self._address()

    def add_worker(self, *, nanny: bool = True) -> subprocess.Popen[bytes]:
        words = ["--nthreads", "1", "--no-dashboard", "--death-timeout", "60", "--host", "127.0.0.1"]
        words += ["--local-directory", str(self._folder), "--scheduler-file", str(self._file)]
        worker = self._started("dask_worker", [*words, "--nanny" if nanny else "--no-nanny"])
        self.workers.append(worker)
        return worker

    def stop(self) -> None:
        for process in (*self.workers, self.scheduler):
            process.terminate()
        for process in (*self.workers, self.scheduler):
            try:
                process.wait(10.0)
            except subprocess.TimeoutExpired:
                process.kill()
                process.wait()

    def _started(self, program: str, words: Sequence[str]) -> subprocess.Popen[bytes]:
        log = (self._folder / f"{program}.log").open("ab")
        with log:
            return subprocess.Popen(
                [sys.executable, "-m", f"distributed.cli.{program}", *words, *self._tls],
                env={**os.environ, **self._environment},
                stdout=log,
                stderr=log,
                stdin=subprocess.DEVNULL,
            )

    def _address(self) -> str:
        end = time.monotonic() + LIMIT_S
        while time.monotonic() < end and self.scheduler.poll() is None:
            try:
                return str(json.loads(self._file.read_text())["address"])
            except (OSError, ValueError, KeyError):
                time.sleep(0.1)
        raise AssertionError((self._folder / "dask_scheduler.log").read_text())
