"""Jobs of Slurm that work for a batch: a profile in a TOML file, its script, and the engine on the jobs."""

from __future__ import annotations

import re
import shlex
import shutil
import sys
import tempfile
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any, Final

from ehmo.batch.cluster import ClusterEngine
from ehmo.batch.connecting import INSTALL
from ehmo.errors import BatchError, InputError
from ehmo.structure.files import shown

_WORD: Final = re.compile(r"[A-Za-z0-9_.,:@%+=/-]+")
"""Values that mean the same to a shell, to Slurm and to people, quoted or not."""
_WALLTIME: Final = re.compile(r"(\d{1,3}-)?\d{1,3}:\d\d(:\d\d)?")
_MEMORY: Final = re.compile(r"\d{1,6}(\.\d+)? ?(MB|GB|TB|MiB|GiB|TiB)")
LIFETIME_MARGIN_S: Final = 120
"""Workers end by themselves that long before the walltime, so that no work is lost to it."""


@dataclass(frozen=True, slots=True)
class SlurmProfile:
    """Jobs to ask Slurm for.

    Attributes
    ----------
    walltime : str
        ``hours:minutes:seconds``.
    memory : str
        Of one job, such as ``16GB``.
    cores : int
        Processors of one job; that many structures at the same time.
    jobs, least_jobs : int
        Jobs at most, and at least, while there is work.
    queue, account : str
        Partition and account; empty for those of the site.
    interface : str
        Network interface that the jobs reach this machine by; empty for the usual one.
    python : str
        Interpreter of the jobs; this one's by default.
    folder : str
        Folder that all machines see, for scripts, messages of jobs and certificates.
    options : tuple of str
        Further words for ``#SBATCH`` lines, such as ``--constraint=avx2``.
    prologue : tuple of str
        Lines of shell that run before the work, such as ``module load python``.
    """

    walltime: str
    memory: str
    cores: int = 1
    jobs: int = 1
    least_jobs: int = 0
    queue: str = ""
    account: str = ""
    interface: str = ""
    python: str = sys.executable
    folder: str = "."
    options: tuple[str, ...] = ()
    prologue: tuple[str, ...] = ()


_KINDS: Final[Mapping[str, Any]] = {
    "walltime": str,
    "memory": str,
    "cores": int,
    "jobs": int,
    "least_jobs": int,
    "queue": str,
    "account": str,
    "interface": str,
    "python": str,
    "folder": str,
    "options": list,
    "prologue": list,
}


def read_profile(path: str | Path) -> SlurmProfile:
    """Profile of a TOML file whose keys are the fields of `SlurmProfile`.

    Parameters
    ----------
    path : str or Path

    Returns
    -------
    profile : SlurmProfile

    Raises
    ------
    InputError
        If the file cannot be used; all faults are named together.
    """
    place = shown(path, 200)
    try:
        data = tomllib.loads(Path(path).read_text(encoding="utf-8"))
    except (OSError, UnicodeDecodeError, tomllib.TOMLDecodeError, ValueError) as fault:
        reason = fault.strerror if isinstance(fault, OSError) else fault
        raise InputError(f"no profile ({shown(reason, 120)})", place=place, mend="give a TOML file") from None
    faults = [*_faults(data)]
    if faults:
        raise InputError("; ".join(faults), place=place, mend='a usable one: walltime = "2:00:00", memory = "8GB"')
    data |= {name: tuple(data[name]) for name in ("options", "prologue") if name in data}
    return SlurmProfile(**data)


def _faults(data: Mapping[str, Any]) -> list[str]:
    found = [f"unknown key {shown(key, 30)!r}" for key in data if key not in _KINDS]
    found += [f"{key} is missing" for key in ("walltime", "memory") if key not in data]
    for key, value in data.items():
        kind = _KINDS.get(key)
        if kind is None:
            continue
        if not isinstance(value, kind) or isinstance(value, bool):
            found.append(f"{key} is no {'number' if kind is int else 'list' if kind is list else 'text'}")
        elif kind is int and not (0 if key == "least_jobs" else 1) <= value <= 10_000:
            found.append(f"{key} = {value} is out of range")
        elif kind is str and not _usable_word(key, value):
            found.append(f"{key} = {shown(value, 40)!r} cannot be used")
        elif kind is list:
            found += [f"{key}: {shown(line, 40)!r} cannot be used" for line in value if not _usable_line(key, line)]
    return found


def _usable_word(key: str, value: str) -> bool:
    pattern = {"walltime": _WALLTIME, "memory": _MEMORY}.get(key, _WORD)
    return pattern.fullmatch(value) is not None


def _usable_line(key: str, line: object) -> bool:
    """A prologue is shell by intent, but one line stays one line; an option is a single word."""
    if not isinstance(line, str) or not line.isprintable() or len(line) > 1000:
        return False
    return key == "prologue" or (line.startswith("-") and _WORD.fullmatch(line) is not None)


def job_script(profile: SlurmProfile) -> str:
    """Script of one job as it will be handed to Slurm, but for the address of the scheduler.

    Parameters
    ----------
    profile : SlurmProfile

    Returns
    -------
    script : str

    Raises
    ------
    BatchError
        If dask-jobqueue is not installed.
    """
    slurm = _jobqueue()
    words = _job_words(profile)
    job = slurm.SLURMJob(scheduler="tls://SCHEDULER", name="ehmo-batch", protocol="tls://", **words)
    return f"{job.job_script().rstrip()}\n"


def slurm_engine(profile: SlurmProfile, *, time_limit_s: float | None = None) -> ClusterEngine:
    """Engine on jobs of Slurm; the scheduler runs here, its connections are encrypted with keys of their own.

    Parameters
    ----------
    profile : SlurmProfile
    time_limit_s : float, optional
        Time allowed for a structure [s].

    Returns
    -------
    engine : ClusterEngine

    Raises
    ------
    BatchError
        If dask-jobqueue is not installed or the scheduler cannot start.
    """
    slurm = _jobqueue()
    import dask
    from dask.utils import parse_bytes
    from distributed import Client

    dask.config.set({"distributed.scheduler.allowed-failures": 2, "distributed.deploy.lost-worker-timeout": "2s"})
    words = _job_words(profile)
    certificate = None
    try:
        certificate = _OwnCertificate(words["local_directory"])
        cluster = slurm.SLURMCluster(
            security=certificate.security,
            protocol="tls://",
            shared_temp_directory=words["local_directory"],
            # Even without its pages the scheduler answers by HTTP: for this machine alone, on a port that is free.
            scheduler_options={"dashboard": False, "dashboard_address": "127.0.0.1:0"},
            **words,
        )
        cluster.adapt(minimum_jobs=profile.least_jobs, maximum_jobs=profile.jobs)
        client = Client(cluster, set_as_default=False)
    except (OSError, RuntimeError, ValueError) as fault:
        if certificate is not None:
            certificate.close()
        raise BatchError(
            f"the scheduler cannot start ({shown(fault, 120)})", place="--slurm", mend="see the profile"
        ) from None
    return ClusterEngine(
        client,
        time_limit_s=time_limit_s,
        memory_limit=int(0.9 * parse_bytes(profile.memory) / profile.cores),
        most_workers=profile.jobs * profile.cores,
        also_close=[cluster, certificate],
    )


class _OwnCertificate:
    """Certificate and key made for one batch, in files that its jobs can read and that go with it."""

    def __init__(self, folder: str) -> None:
        from distributed import Security

        made = Security.temporary()
        self._folder = tempfile.mkdtemp(prefix=".ehmo-tls-", dir=folder)
        paths = {}
        for name, text in (("ca", made.tls_ca_file), ("cert", made.tls_client_cert), ("key", made.tls_client_key)):
            paths[name] = Path(self._folder) / f"{name}.pem"
            paths[name].touch(mode=0o600)
            paths[name].write_text(text, encoding="ascii")
        pairs = {
            f"tls_{role}_{part}": str(paths[part])
            for role in ("scheduler", "worker", "client")
            for part in ("cert", "key")
        }
        self.security = Security(require_encryption=True, tls_ca_file=str(paths["ca"]), **pairs)

    def close(self) -> None:
        """Take the files away."""
        shutil.rmtree(self._folder, ignore_errors=True)


def _jobqueue() -> Any:
    try:
        from dask_jobqueue import slurm
    except ImportError:
        raise BatchError("dask-jobqueue is not installed", place="--slurm", mend=INSTALL) from None
    return slurm


def _job_words(profile: SlurmProfile) -> dict[str, Any]:
    """Words of dask-jobqueue; every value has passed `read_profile` or is quoted by it."""
    arguments = ["--no-dashboard"]
    lifetime = _seconds(profile.walltime) - LIFETIME_MARGIN_S
    if lifetime > LIFETIME_MARGIN_S:
        arguments += ["--lifetime", f"{lifetime}s", "--lifetime-stagger", "60s"]
    return {
        "cores": profile.cores,
        "processes": 1,
        "memory": profile.memory,
        "walltime": profile.walltime,
        "queue": profile.queue or None,
        "account": profile.account or None,
        "interface": profile.interface or None,
        "python": shlex.quote(profile.python),
        "job_name": "ehmo-batch",
        "job_extra_directives": list(profile.options),
        "job_script_prologue": list(profile.prologue),
        "worker_extra_args": arguments,
        "log_directory": _folder(profile),
        "local_directory": _folder(profile),
    }


def _folder(profile: SlurmProfile) -> str:
    """Absolute folder of the jobs, which Slurm's own lines take without quotes."""
    folder = str(Path(profile.folder).absolute())
    if not _WORD.fullmatch(folder):
        raise InputError(
            "the folder has characters that a job script cannot hold",
            place=shown(folder, 200),
            mend="name another one with folder = in the profile",
        )
    return folder


def _seconds(walltime: str) -> int:
    days, _, clock = walltime.rpartition("-")
    parts = [int(part) for part in clock.split(":")]
    hours, minutes, seconds = (*parts, 0)[:3]
    return ((int(days or 0) * 24 + hours) * 60 + minutes) * 60 + seconds
