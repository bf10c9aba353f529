"""The minimal-basis run seen from outside: cached by its input, in a process that can be stopped."""

from __future__ import annotations

import hashlib
import json
import os
import queue
import subprocess
import sys
import tempfile
import threading
import time
import zipfile
from collections.abc import Callable
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path
from typing import Any, Final

import numpy as np
from scipy.linalg import eigh

from ehmo.conventions import ELEMENT_SYMBOLS
from ehmo.errors import ConvergenceError, InputError, LimitError
from ehmo.records.basis import Basis
from ehmo.records.crosscheck import ReferenceRun, Theory
from ehmo.records.fragment import Fragment
from ehmo.studies.crosscheck.recipe import RECIPE, minimal_contraction
from ehmo.studies.crosscheck.worker import write_arrays
from ehmo.units import HARTREE_EV

DEFAULT_TIMEOUT_S: Final = 900.0

_ARRAYS = ("shells", "overlap", "densities", "mean_fock")
_GRACE_S = 5.0

Progress = Callable[[str], None]


def default_cache() -> Path:
    """Folder of the user's cache: ``$XDG_CACHE_HOME/ehmo``, or ``~/.cache/ehmo``."""
    home = os.environ.get("XDG_CACHE_HOME", "")
    return (Path(home) if Path(home).is_absolute() else Path.home() / ".cache") / "ehmo"


def reference_run(
    fragment: Fragment,
    theory: Theory = "pbe",
    *,
    cache: Path | None = None,
    timeout_s: float = DEFAULT_TIMEOUT_S,
    progress: Progress | None = None,
) -> ReferenceRun:
    """Minimal-basis run of a fragment, from the cache or by PySCF in a process of its own.

    Parameters
    ----------
    fragment : Fragment
        With charge and unpaired electrons set.
    theory : {"pbe", "b3lyp", "hf"}
    cache : Path, optional
        Folder of earlier runs; none is read or kept if missing.
    timeout_s : float
        The process is stopped after this time [s].
    progress : callable, optional
        Called with one line on each step.

    Returns
    -------
    run : ReferenceRun
        Converged.

    Raises
    ------
    InputError
        If an element has no minimal contraction, PySCF is missing, or the cache cannot be written.
    ConvergenceError
        If no step of the recipe converged, or PySCF failed; the message says what was tried.
    LimitError
        If the time was up.
    """
    say = progress or _silent
    _check(fragment, timeout_s)
    program = f"PySCF {_pyscf_version()}"
    job = {
        "recipe": RECIPE,
        "program": program,
        "theory": theory,
        "symbols": fragment.symbols,
        "positions_A": fragment.positions_A.tolist(),
        "charge": fragment.charge,
        "unpaired_electrons": fragment.unpaired_electrons,
    }
    key = hashlib.sha256(json.dumps(job, sort_keys=True).encode()).hexdigest()
    kept = None if cache is None else _folder(cache) / f"{key}.npz"
    outcome = None if kept is None else _read(kept, key)
    if outcome is not None and "failed" in outcome:
        outcome = None
    from_cache = outcome is not None
    if outcome is None:
        outcome = _run({**job, "key": key}, timeout_s, say)
        if kept is not None:
            _keep(kept, key, outcome, say)
    else:
        say(f"{program}: taken from the cache ({kept})")
    return _record(fragment, theory, program, key, from_cache, outcome)


def _check(fragment: Fragment, timeout_s: float) -> None:
    if fragment.charge is None or fragment.unpaired_electrons is None:
        raise InputError("charge and unpaired electrons are not set", mend="set them with Fragment.with_electrons")
    if not 0 < timeout_s < float("inf"):
        raise InputError(f"the time limit is {timeout_s:g} s", mend="give a positive number of seconds")
    missing = sorted({symbol for symbol in fragment.symbols if minimal_contraction(symbol) is None})
    if missing:
        raise InputError(
            f"there is no minimal basis for {', '.join(missing)}", mend="the cross-check reaches from H to Cm"
        )


def _pyscf_version() -> str:
    try:
        return version("pyscf")
    except PackageNotFoundError:
        raise InputError("PySCF is not installed", mend="install it with: pip install pyscf") from None


def _folder(cache: Path) -> Path:
    try:
        cache.mkdir(parents=True, exist_ok=True)
    except OSError as fault:
        raise InputError(
            f"cannot make the cache folder ({fault.strerror or fault})",
            place=str(cache),
            mend="choose another with --cache DIR, or --cache off",
        ) from fault
    return cache


def _read(path: Path, key: str) -> dict[str, Any] | None:
    """Outcome in a file; None if there is none, or none of use."""
    try:
        with np.load(path, allow_pickle=False) as file:
            words = json.loads(str(file["words"]))
            arrays = {name: np.array(file[name]) for name in _ARRAYS if name in file}
    except (OSError, ValueError, KeyError, EOFError, zipfile.BadZipFile):
        return None
    if not isinstance(words, dict) or words.get("key") != key:
        return None
    outcome: dict[str, Any] = {**words, **arrays}
    return outcome if "failed" in outcome or set(_ARRAYS) <= set(arrays) else None


def _keep(path: Path, key: str, outcome: dict[str, Any], say: Progress) -> None:
    try:
        write_arrays(path, key, {name: value for name, value in outcome.items() if name != "key"})
    except OSError as fault:
        say(f"the run cannot be kept in the cache ({fault.strerror or fault})")


def _run(job: dict[str, Any], timeout_s: float, say: Progress) -> dict[str, Any]:
    """Outcome of a converged run in a process of its own."""
    with tempfile.TemporaryDirectory(prefix="ehmo-") as folder:
        job_path, result_path = Path(folder, "job.json"), Path(folder, "result.npz")
        job_path.write_text(json.dumps(job), encoding="utf-8")
        with Path(folder, "errors.txt").open("w+", encoding="utf-8", errors="replace") as errors:
            status, said = _watched([str(job_path), str(result_path)], errors, timeout_s, say)
            errors.seek(0)
            last = (errors.read().strip().splitlines() or ["no message"])[-1]
        outcome = _read(result_path, job["key"])
    if outcome is None:
        reached = f"; last step: {said}" if said else ""
        raise ConvergenceError(
            f"the PySCF process ended without a result (status {status}: {last}{reached})",
            mend="a negative status is a signal: with -9, memory may have run out",
        )
    if "failed" in outcome:
        tried = f"; tried: {'; '.join(outcome['tried'])}" if outcome["tried"] else ""
        raise ConvergenceError(
            f"no minimal-basis result: {outcome['failed']}{tried}",
            mend="check charge and spin, or try another --theory",
        )
    return outcome


def _watched(words: list[str], errors: Any, timeout_s: float, say: Progress) -> tuple[int, str]:
    """Exit status and last progress line of the process; it never outlives the call."""
    # The child must find this very package, wherever the parent found it.
    home = str(Path(__file__).parents[3])
    paths = os.pathsep.join(path for path in (home, os.environ.get("PYTHONPATH", "")) if path)
    process = subprocess.Popen(
        [sys.executable, "-m", "ehmo.studies.crosscheck.worker", *words],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        stderr=errors,
        env={**os.environ, "PYTHONPATH": paths, "PYTHONUTF8": "1"},
        text=True,
        encoding="utf-8",
        errors="replace",
    )
    lines: queue.Queue[str | None] = queue.Queue()
    listener = threading.Thread(target=_listen, args=(process.stdout, lines), daemon=True)
    listener.start()
    deadline, said = time.monotonic() + timeout_s, ""
    try:
        while True:
            try:
                line = lines.get(timeout=max(deadline - time.monotonic(), 0.0))
            except queue.Empty:
                raise LimitError(
                    f"PySCF was stopped after {timeout_s:g} s" + (f"; last step: {said}" if said else ""),
                    mend="raise the limit with --timeout",
                ) from None
            if line is None:
                return _ended(process), said
            said = line
            say(line)
    finally:
        process.kill()
        process.wait()
        listener.join()
        for stream in (process.stdin, process.stdout):
            if stream is not None:
                stream.close()


def _ended(process: subprocess.Popen[str]) -> int:
    """Exit status; a process that has closed its output but lingers is ended."""
    try:
        return process.wait(timeout=_GRACE_S)
    except subprocess.TimeoutExpired:
        process.kill()
        return process.wait()


def _listen(stream: Any, lines: queue.Queue[str | None]) -> None:
    for line in stream:
        lines.put(line.rstrip("\n"))
    lines.put(None)


def _record(
    fragment: Fragment, theory: Theory, program: str, key: str, from_cache: bool, outcome: dict[str, Any]
) -> ReferenceRun:
    basis = _basis(fragment, outcome["shells"])
    overlap, densities = outcome["overlap"], outcome["densities"]
    energies, coefficients = eigh(outcome["mean_fock"], overlap)
    seen = overlap @ coefficients
    return ReferenceRun(
        theory=theory,
        program=program,
        recipe=RECIPE,
        key=key,
        from_cache=from_cache,
        energy_hartree=float(outcome["energy_hartree"]),
        spin_squared=float(outcome["spin_squared"]),
        tried=tuple(outcome["tried"]),
        doubts=tuple(outcome["doubts"]),
        basis=basis,
        overlap=overlap,
        densities=densities,
        energies_eV=energies * HARTREE_EV,
        coefficients=coefficients,
        occupations=np.einsum("ik,sij,jk->sk", seen, densities, seen),
    )


def _basis(fragment: Fragment, shells: np.ndarray) -> Basis:
    sorts = [(fragment.symbols[atom], int(n), int(l)) for atom, n, l in shells]
    types = {sort: place for place, sort in enumerate(dict.fromkeys(sorts))}
    return Basis(
        symbols=fragment.symbols,
        core_charges=np.array([ELEMENT_SYMBOLS.index(symbol) + 1.0 for symbol in fragment.symbols]),
        shell_atom=shells[:, 0],
        shell_n=shells[:, 1],
        shell_l=shells[:, 2],
        shell_type=np.array([types[sort] for sort in sorts]),
        type_h_ii_eV=np.full(len(types), np.nan),
    )


def _silent(line: str) -> None:
    """Say nothing."""
