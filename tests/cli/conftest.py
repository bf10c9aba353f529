"""A way to run the command line inside the test process, and structure files to run it on."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from ehmo.cli import main

VOCL3 = """5
VOCl3 charge=0 unpaired=0
V 0 0 0
O 0 0 1.57
Cl 2.04 0 -0.65
Cl -1.02 1.767 -0.65
Cl -1.02 -1.767 -0.65
"""
"""Trichloridooxidovanadium, V=O 1.57, V-Cl 2.14 (rounded from Oberhammer, Straehle 1975, gas; memory)."""


@dataclass(frozen=True)
class Ran:
    """Exit status and both streams of one run."""

    status: int
    out: str
    err: str


Command = Callable[..., Ran]


@pytest.fixture
def ehmo(capsys, tmp_path, monkeypatch) -> Command:
    """Run ``ehmo`` with the words given, in an empty folder."""
    monkeypatch.chdir(tmp_path)

    def run(*words: str) -> Ran:
        capsys.readouterr()
        try:
            status = main([str(word) for word in words])
        except SystemExit as leaving:
            status = int(leaving.code or 0)
        return Ran(status, *capsys.readouterr())

    return run


@pytest.fixture
def refused(ehmo, tmp_path) -> Callable[..., str]:
    """Run ``ehmo`` where it must refuse: one line on the error stream, status 2, nothing else left behind."""

    def run(*words: str) -> str:
        before = {path: path.read_bytes() for path in tmp_path.rglob("*") if path.is_file()}
        ran = ehmo(*words)
        assert ran.status == 2
        assert ran.out == ""
        assert ran.err.startswith("ehmo: ")
        assert ran.err.endswith("\n")
        line = ran.err[:-1]
        assert line.isprintable()
        assert "Traceback" not in line
        assert "; " in line or ": " in line
        assert {path: path.read_bytes() for path in tmp_path.rglob("*") if path.is_file()} == before
        return line

    return run


@pytest.fixture
def put(tmp_path) -> Callable[..., Path]:
    """Write a file into the folder of the run."""

    def write(text: str | bytes = VOCL3, name: str = "a.xyz") -> Path:
        path = tmp_path / name
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
        return path

    return write
