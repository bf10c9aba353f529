"""The process that runs PySCF: cache, time limit, failures, and its end with its parent. Water keeps it quick."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from ehmo.errors import ConvergenceError, InputError, LimitError
from ehmo.records.fragment import Fragment
from ehmo.studies.crosscheck import default_cache, recipe, reference, reference_run, worker
from tests.studies.direct_pyscf import direct_energy, without_open_file_warnings

ROOT = Path(__file__).parents[2]
WATER = Fragment(("O", "H", "H"), [[0, 0, 0], [0, 0.757, 0.587], [0, -0.757, 0.587]], 0, 0)
"""Bent, O-H 0.96 (memory)."""

OXYGEN = Fragment(("O", "O"), [[0, 0, 0], [0, 0, 1.21]], 0, 2)
"""Triplet, O-O 1.21 (memory)."""


@pytest.mark.parametrize("theory", ["pbe", "b3lyp", "hf"])
def test_theory_is_the_one_asked_for(theory):
    assert reference_run(WATER, theory).energy_hartree == pytest.approx(direct_energy(WATER, theory), abs=1e-8)


def test_restricted_open_shell_hartree_fock_has_the_spin_asked_for():
    run = reference_run(OXYGEN, "hf")
    assert run.spin_squared == 2.0
    seen = run.densities @ run.overlap
    # O2 triplet: two unpaired electrons, 16 in all (law).
    assert [part.trace() for part in seen] == pytest.approx([9, 7])
    assert run.occupations.sum() == pytest.approx(16)


def test_progress_is_told_step_by_step():
    said: list[str] = []
    reference_run(WATER, progress=said.append)
    assert any("7 functions, 10 electrons" in line for line in said)
    assert any(line.startswith("DIIS, cycle 1:") for line in said)
    assert any("stability" in line for line in said)


def test_second_run_comes_from_the_cache(tmp_path, monkeypatch):
    first = reference_run(WATER, cache=tmp_path)
    assert [path.name for path in tmp_path.iterdir()] == [f"{first.key}.npz"]
    monkeypatch.setattr(reference, "_run", lambda *_: pytest.fail("ran again"))
    said: list[str] = []
    second = reference_run(WATER, cache=tmp_path, progress=said.append)
    assert (first.from_cache, second.from_cache) == (False, True)
    assert "cache" in said[0]
    assert (second.densities == first.densities).all()
    assert second.tried == first.tried


@pytest.mark.parametrize(
    "change",
    [
        {"charge": 1, "unpaired_electrons": 1},
        {"unpaired_electrons": 2},
        {"positions_A": WATER.positions_A + np.array([[0], [0], [1e-9]])},
        {"symbols": ("S", "H", "H")},
    ],
    ids=["charge", "spin", "place", "element"],
)
def test_any_other_input_has_another_key(change, tmp_path, monkeypatch):
    keys = []

    def notice(job, *_):
        keys.append(job["key"])
        raise ConvergenceError("stop")

    monkeypatch.setattr(reference, "_run", notice)
    for fragment, theory in ((WATER, "pbe"), (WATER, "hf"), (replace(WATER, **change), "pbe")):
        with pytest.raises(ConvergenceError):
            reference_run(fragment, theory, cache=tmp_path)
    assert len(set(keys)) == 3


@pytest.mark.parametrize("content", [b"", b"not an archive", None], ids=["empty", "garbage", "of another input"])
def test_file_in_the_cache_that_is_of_no_use_is_replaced(content, tmp_path):
    run = reference_run(OXYGEN, "hf", cache=tmp_path)
    path = tmp_path / f"{run.key}.npz"
    if content is None:
        worker.write_arrays(path, "another key", {"tried": [], "doubts": []})
    else:
        path.write_bytes(content)
    again = reference_run(OXYGEN, "hf", cache=tmp_path)
    assert not again.from_cache
    assert reference_run(OXYGEN, "hf", cache=tmp_path).from_cache


def test_cache_cannot_smuggle_in_code(tmp_path):
    # A pickle in the archive is refused, not run.
    run = reference_run(OXYGEN, "hf", cache=tmp_path)
    np.savez(tmp_path / f"{run.key}.npz", words=np.array({"key": run.key}, dtype=object))
    assert not reference_run(OXYGEN, "hf", cache=tmp_path).from_cache


def test_time_limit_stops_the_process_and_says_so(tmp_path, monkeypatch):
    started = []
    real = subprocess.Popen

    def notice(*words, **settings):
        started.append(real(*words, **settings))
        return started[-1]

    monkeypatch.setattr(subprocess, "Popen", notice)
    with pytest.raises(LimitError, match=r"stopped after 0\.01 s.*--timeout"):
        reference_run(WATER, cache=tmp_path, timeout_s=0.01)
    assert started[0].poll() is not None
    assert list(tmp_path.iterdir()) == []


def test_worker_ends_with_its_parent(tmp_path):
    job = {"symbols": ["U", "O"], "positions_A": [[0, 0, 0], [0, 0, 1.8]], "charge": 0, "unpaired_electrons": 2}
    path = tmp_path / "job.json"
    path.write_text(json.dumps({**job, "theory": "pbe", "key": "k"}))
    process = subprocess.Popen(
        [sys.executable, "-m", "ehmo.studies.crosscheck.worker", str(path), str(tmp_path / "out.npz")],
        stdin=subprocess.DEVNULL,  # what a child reads whose parent is gone
        stdout=subprocess.DEVNULL,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
    )
    assert process.wait(timeout=60) == worker.ORPHANED
    assert not (tmp_path / "out.npz").exists()


def test_run_that_does_not_converge_is_no_result_and_says_what_was_tried(monkeypatch):
    monkeypatch.setattr(recipe, "DIIS_CYCLES", 1)
    monkeypatch.setattr(recipe, "NEWTON_CYCLES", 0)
    job = recipe.Job(WATER.symbols, WATER.positions_A, 0, 0, "hf")
    said: list[str] = []
    with without_open_file_warnings():
        try:
            recipe.run_recipe(job, said.append)
        except recipe.NotConvergedError as failure:
            tried = failure.tried
    assert len(tried) == 3
    assert all("not converged" in step for step in tried)


def failing(outcome: dict):
    def watched(words, errors, timeout_s, say):
        if outcome:
            key = json.loads(Path(words[0]).read_text())["key"]
            worker.write_arrays(Path(words[1]), key, outcome)
        errors.write("Out of memory\n")
        return (0 if outcome else -9), "DIIS, cycle 1"

    return watched


@pytest.mark.parametrize(
    ("outcome", "said"),
    [
        ({"failed": "not converged", "tried": ["DIIS: not converged", "second-order: not converged"]}, "second-order"),
        ({"failed": "PySCF raised ValueError: no", "tried": []}, "PySCF raised ValueError: no"),
        ({}, "status -9: Out of memory; last step: DIIS, cycle 1"),
    ],
    ids=["not converged", "raised", "killed"],
)
def test_failure_of_the_process_is_one_line_and_not_kept(outcome, said, tmp_path, monkeypatch):
    monkeypatch.setattr(reference, "_watched", failing(outcome))
    with pytest.raises(ConvergenceError) as failure:
        reference_run(WATER, cache=tmp_path)
    assert said in str(failure.value)
    assert list(tmp_path.iterdir()) == []


def test_closed_shell_that_would_unpair_is_doubted():
    # Stretched H2: the restricted closed shell is unstable against unpairing beyond 1.2 A or so (Coulson, Fischer
    # 1949, memory).
    stretched = Fragment(("H", "H"), [[0, 0, 0], [0, 0, 2.5]], 0, 0)
    run = reference_run(stretched, "hf")
    assert any("unpairing" in doubt for doubt in run.doubts)
    assert not reference_run(WATER, "hf").doubts


def test_cache_is_where_the_user_keeps_caches(monkeypatch, tmp_path):
    monkeypatch.setenv("XDG_CACHE_HOME", str(tmp_path))
    assert default_cache() == tmp_path / "ehmo"
    monkeypatch.setenv("XDG_CACHE_HOME", "relative")
    assert default_cache() == Path.home() / ".cache" / "ehmo"


@pytest.mark.parametrize("timeout", [0.0, -1.0, float("nan"), float("inf")])
def test_time_limit_must_be_a_time(timeout):
    with pytest.raises(InputError, match="positive number of seconds"):
        reference_run(WATER, timeout_s=timeout)


def test_element_without_a_minimal_basis_is_named():
    with pytest.raises(InputError, match="no minimal basis for Fm"):
        reference_run(Fragment(("Fm", "O"), [[0, 0, 0], [0, 0, 1.8]], 0, 0))


def test_cache_that_cannot_be_made_is_told_before_the_run(tmp_path):
    (tmp_path / "file").write_text("")
    with pytest.raises(InputError, match="cannot make the cache folder"):
        reference_run(WATER, cache=tmp_path / "file" / "cache")
