"""Process of its own that runs PySCF: ``python -m ehmo.studies.crosscheck.worker JOB RESULT``.

A process can be stopped at any time, which a thread inside PySCF cannot. It ends by itself when its parent is gone:
the parent holds the other end of its standard input. Progress goes to the standard output, one line each; the result
is a file of arrays that appears whole or not at all.
"""

from __future__ import annotations

import json
import os
import sys
import threading
from pathlib import Path
from typing import Any

import numpy as np

from ehmo.studies.crosscheck.recipe import Job, NotConvergedError, run_recipe

ORPHANED = 3


def main(job_path: str, result_path: str) -> int:
    """Run one job.

    Parameters
    ----------
    job_path : str
        JSON of the job.
    result_path : str
        Where the arrays go.

    Returns
    -------
    status : int
        0; a run that does not converge or raises is told in the result.
    """
    threading.Thread(target=_end_with_parent, daemon=True).start()
    text = json.loads(Path(job_path).read_text(encoding="utf-8"))
    job = Job(
        tuple(text["symbols"]),
        np.array(text["positions_A"], dtype=np.float64),
        text["charge"],
        text["unpaired_electrons"],
        text["theory"],
    )
    write_arrays(Path(result_path), text["key"], _outcome(job))
    return 0


def write_arrays(path: Path, key: str, outcome: dict[str, Any]) -> None:
    """Write an outcome as arrays without pickles; lists and numbers go as one JSON text.

    Parameters
    ----------
    path : Path
        Target, replaced whole.
    key : str
        Hash of the input.
    outcome : dict
        Of `run_recipe`, or ``{"failed": ..., "tried": ...}``.
    """
    arrays = {name: value for name, value in outcome.items() if isinstance(value, np.ndarray)}
    words = {name: value for name, value in outcome.items() if name not in arrays} | {"key": key}
    temporary = path.with_suffix(f".{os.getpid()}.tmp")
    try:
        with temporary.open("wb") as file:
            np.savez_compressed(file, words=np.array(json.dumps(words)), **arrays)  # type: ignore[arg-type]
        temporary.replace(path)
    finally:
        temporary.unlink(missing_ok=True)


def _outcome(job: Job) -> dict[str, Any]:
    try:
        return run_recipe(job, _say)
    except NotConvergedError as failure:
        return {"failed": "not converged", "tried": failure.tried}
    except Exception as fault:  # noqa: BLE001 - whatever PySCF raises is told as one line by the parent
        return {"failed": f"PySCF raised {type(fault).__name__}: {fault}", "tried": []}


def _say(line: str) -> None:
    sys.stdout.write(line + "\n")
    sys.stdout.flush()


def _end_with_parent() -> None:
    # Nothing is ever sent: the read returns when the parent closes its end, by will or by dying.
    sys.stdin.buffer.read()
    os._exit(ORPHANED)


if __name__ == "__main__":
    sys.exit(main(*sys.argv[1:]))
