"""``ehmo batch``: many structures into a store."""

from __future__ import annotations

import argparse
import signal
import sys
import threading
from collections.abc import Iterator
from contextlib import closing, contextmanager
from typing import TYPE_CHECKING, Any

from ehmo.cli import bond
from ehmo.cli.structures import add_reading_options
from ehmo.errors import InputError

if TYPE_CHECKING:
    from ehmo.batch import BatchResult, BatchSettings, Engine


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    parser = commands.add_parser(
        "batch",
        help="many structures into a store; a rerun goes on where the last one stopped",
        description="Bond reports of many structures, kept in a store. Structures that it has are passed over.",
    )
    parser.add_argument(
        "sources",
        metavar="SOURCE",
        nargs="*",
        help="XYZ or CIF file, folder, pattern such as 'set/**/*.cif', or manifest (.csv: path,charge,unpaired,tags)",
    )
    parser.add_argument("--store", metavar="PATH|URL", help="SQLite file, or postgresql://USER@HOST/DATABASE")
    parser.add_argument("--retry", choices=("failed",), help="calculate those again that failed")
    parser.add_argument("--shard", metavar="I/N", help="only the I-th of N parts, for job arrays with one store each")
    parser.add_argument(
        "--allow-outside", action="store_true", help="follow links and manifest paths that lead out of the folder"
    )
    parser.add_argument("--quiet", action="store_true", help="no progress on the error stream")
    work = parser.add_argument_group("work")
    work.add_argument(
        "--workers",
        type=int,
        metavar="N",
        help="worker processes (default: one for each processor); 0 works in this process, without limits",
    )
    work.add_argument(
        "--time-limit", type=float, default=600.0, metavar="S", help="time allowed for a structure [s] (600)"
    )
    work.add_argument(
        "--memory-limit",
        type=float,
        metavar="GB",
        help="memory allowed to a worker (default: its part of 80 %% of this machine's, at least 2 GB)",
    )
    cluster = parser.add_argument_group("cluster", "with the extra: pip install 'ehmo[cluster]'")
    cluster.add_argument(
        "--scheduler", metavar="ADDRESS", help="work on a dask scheduler: tls://HOST:PORT, or tcp://127.0.0.1:PORT"
    )
    for name, what in (("ca", "certificate of the authority"), ("cert", "own certificate"), ("key", "own key")):
        cluster.add_argument(f"--tls-{name}", metavar="FILE", help=f"{what}, for tls://")
    cluster.add_argument("--slurm", metavar="PROFILE", help="start jobs of Slurm as a TOML file describes them")
    cluster.add_argument("--print-job", action="store_true", help="print the script of such a job, and start nothing")
    add_reading_options(parser.add_argument_group("structures"))
    parser.add_argument("--mesh", metavar="A,B,C", help="k-points for extended structures (default: by the cell)")
    bond.add_calculation_options(parser)
    bond.add_spread_option(parser)
    parser.set_defaults(handler=run)


def run(chosen: argparse.Namespace) -> str:
    """Closing words; progress goes to the error stream."""
    from ehmo.batch import run_batch, work_items
    from ehmo.batch.progress import Progress
    from ehmo.batch.sources import source_files
    from ehmo.store import open_store

    if chosen.print_job:
        return _job(chosen)
    if not chosen.sources:
        raise InputError("there is nothing to calculate", place="ehmo batch", mend="name files or folders")
    if not chosen.store:
        raise InputError("there is no place for the results", place="ehmo batch", mend="give --store FILE.sqlite")
    settings, shard = _settings(chosen), _shard(chosen.shard)
    total = sum(file.size for file in source_files(chosen.sources, allow_outside=chosen.allow_outside))
    items = work_items(
        chosen.sources,
        allow_outside=chosen.allow_outside,
        shard=shard,
        max_atoms=chosen.max_atoms,
        max_bytes=chosen.max_bytes,
    )
    progress = Progress(sys.stderr, total // shard[1])
    with (
        closing(_engine(chosen)) as engine,
        _stopped_like_by_keyboard(),
        open_store(chosen.store, create=True) as store,
    ):
        try:
            result = run_batch(
                items,
                store,
                engine,
                settings,
                retry_failed=chosen.retry == "failed",
                on_progress=(lambda _: None) if chosen.quiet else progress.show,
            )
        except KeyboardInterrupt:
            progress.close()
            sys.stderr.write("ehmo: stopped; what was finished is in the store, the same command goes on from there\n")
            raise
        finally:
            progress.close()
        return _closing_words(result, store.name)


def _settings(chosen: argparse.Namespace) -> BatchSettings:
    from ehmo.batch.items import BatchSettings, with_parameters
    from ehmo.cli.extended import mesh_counts, one_set

    return with_parameters(
        BatchSettings(
            options=bond.calculation_options(chosen),
            hydrogens=chosen.hydrogens,
            cations=chosen.cations,
            mesh=mesh_counts(chosen.mesh),
            draws=chosen.spread or 0,
            max_atoms=chosen.max_atoms,
            max_bytes=chosen.max_bytes,
        ),
        one_set(chosen),
    )


def _shard(text: str | None) -> tuple[int, int]:
    if text is None:
        return 1, 1
    number, _, count = text.partition("/")
    plain = all(word.isascii() and word.isdigit() and len(word) < 7 for word in (number, count))
    if not plain or not 1 <= int(number) <= int(count):
        raise InputError(f"--shard {text!r} is no part", mend="give for example 3/16")
    return int(number), int(count)


def _job(chosen: argparse.Namespace) -> str:
    from ehmo.batch.slurm import job_script, read_profile

    if chosen.slurm is None:
        raise InputError("--print-job shows a job of --slurm", mend="give the profile with --slurm PROFILE.toml")
    return job_script(read_profile(chosen.slurm))


def _engine(chosen: argparse.Namespace) -> Engine:
    from ehmo.batch import InProcess, LocalPool
    from ehmo.batch.machine import memory_share, processors

    tls = (chosen.tls_ca, chosen.tls_cert, chosen.tls_key)
    if any(tls) and not (all(tls) and chosen.scheduler):
        raise InputError("--tls-ca, --tls-cert and --tls-key go together, with --scheduler", mend="give all or none")
    elsewhere = [name for name in ("scheduler", "slurm", "workers") if getattr(chosen, name) is not None]
    if len(elsewhere) > 1:
        raise InputError(f"--{elsewhere[0]} and --{elsewhere[1]} exclude each other", mend="give one of them")
    workers = processors() if chosen.workers is None else chosen.workers
    if not 0 <= workers <= 1000:
        raise InputError(f"--workers {workers}", mend="give a number from 0 to 1000")
    if not chosen.time_limit > 0:
        raise InputError(f"--time-limit {chosen.time_limit:g}", mend="give a positive number of seconds")
    if chosen.memory_limit is not None and not 0.5 <= chosen.memory_limit < 1e6:
        raise InputError(f"--memory-limit {chosen.memory_limit:g}", mend="give gigabytes, at least 0.5")
    given = None if chosen.memory_limit is None else int(chosen.memory_limit * 1e9)
    if chosen.scheduler is not None:
        from ehmo.batch.connecting import TlsFiles, connected_engine, quiet_logs

        quiet_logs()
        files = TlsFiles(*tls) if all(tls) else None
        return connected_engine(chosen.scheduler, files, time_limit_s=chosen.time_limit, memory_limit=given)
    if chosen.slurm is not None:
        from ehmo.batch.connecting import quiet_logs
        from ehmo.batch.slurm import read_profile, slurm_engine

        profile = read_profile(chosen.slurm)
        quiet_logs()
        return slurm_engine(profile, time_limit_s=chosen.time_limit)
    if workers == 0:
        return InProcess()
    limit = memory_share(workers) if given is None else given
    return LocalPool(workers, time_limit_s=chosen.time_limit, memory_limit=limit)


@contextmanager
def _stopped_like_by_keyboard() -> Iterator[None]:
    """A polite request to end, as queueing systems send it before they kill, keeps what is finished."""

    def stop(*_: object) -> None:
        raise KeyboardInterrupt

    if threading.current_thread() is not threading.main_thread():
        yield
        return
    before = signal.signal(signal.SIGTERM, stop)
    try:
        yield
    finally:
        signal.signal(signal.SIGTERM, before)


def _closing_words(result: BatchResult, store: str) -> str:
    from ehmo.batch.progress import duration_words

    rows = result.done + result.failed
    lines = [
        f"{rows + result.skipped:,} structures: {result.done:,} calculated, {result.failed:,} failed, "
        f"{result.skipped:,} were in the store.",
        f"Store: {store} (ehmo summary shows what it holds)",
    ]
    if rows:
        rate = rows / max(result.elapsed_s, 1e-9)
        workers = "" if result.workers == 1 else f", {rate / max(result.workers, 1):.2f} for each worker"
        lines.append(f"{duration_words(result.elapsed_s)}, {rate:.2f} structures per second{workers}.")
    if result.failed:
        lines.append("Failures by reason (each row says more; --retry failed tries them again):")
        lines += [f"  {count:6,}  {reason}" for reason, count in result.reasons.most_common(10)]
        if len(result.reasons) > 10:
            lines.append(f"  and {len(result.reasons) - 10:,} more reasons")
    return "\n".join(lines) + "\n"
