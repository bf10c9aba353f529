"""A real Slurm of one node on the loopback interface, in a folder of its own; needs root, as its daemons do."""

from __future__ import annotations

import os
import re
import shutil
import socket
import subprocess
import tempfile
import time
from collections.abc import Sequence
from pathlib import Path

NEEDED = ("munged", "slurmctld", "slurmd", "sbatch", "squeue", "scancel", "sinfo")
LIMIT_S = 90.0


def why_not() -> str:
    """Why Slurm cannot run here; empty if it can."""
    missing = [name for name in NEEDED if shutil.which(name) is None]
    if missing:
        return f"Slurm is not installed: no {', '.join(missing)} (Debian: slurm-wlm, munge)"
    return "" if os.geteuid() == 0 else "Slurm's daemons are started by root only"


def _free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return int(probe.getsockname()[1])


class OneNodeSlurm:
    """Controller and node daemon with their own key, ports and folders; one partition named main."""

    def __init__(self) -> None:
        # Not in a folder of pytest: munge wants one that everybody may enter.
        self.folder = folder = Path(tempfile.mkdtemp(prefix="ehmo-slurm-"))
        folder.chmod(0o755)
        for name in ("state", "spool", "munge"):
            (folder / name).mkdir(parents=True)
        (folder / "munge").chmod(0o755)
        key = folder / "munge" / "key"
        key.write_bytes(os.urandom(1024))
        key.chmod(0o400)
        self._run("munged", f"--key-file={key}", *(f"--{part}={folder}/munge/{name}" for part, name in _MUNGE_FILES))
        self.configuration = folder / "slurm.conf"
        self.configuration.write_text(self._settings())
        self.environment = {**os.environ, "SLURM_CONF": str(self.configuration)}
        self._run("slurmctld", "-f", str(self.configuration), "-i")
        self._run("slurmd", "-f", str(self.configuration), "-N", _node())
        end = time.monotonic() + LIMIT_S
        while self.command("sinfo", "-h", "-o", "%T").strip() != "idle":
            if time.monotonic() > end:
                logs = [path.read_text()[-2000:] for path in folder.glob("slurm*.log")]
                self.stop()
                raise AssertionError("\n".join(logs))
            time.sleep(0.3)

    def command(self, *words: str) -> str:
        """Output of a client program."""
        done = subprocess.run(words, env=self.environment, capture_output=True, text=True, check=False)
        return done.stdout

    def jobs(self) -> list[str]:
        """Numbers of running jobs."""
        return self.command("squeue", "-h", "-t", "R", "-o", "%A").split()

    def stop(self) -> None:
        """Cancel all jobs and end the daemons, each by the number it wrote down."""
        self.command("scancel", "--full", "--signal=KILL", "--partition=main")
        self.command("scancel", "--partition=main")
        for name in ("slurmctld.pid", "slurmd.pid", "munge/pid"):
            try:
                pid = int((self.folder / name).read_text())
                os.kill(pid, 15)
            except (OSError, ValueError):
                continue
            end = time.monotonic() + 10.0
            while Path(f"/proc/{pid}").exists() and time.monotonic() < end:
                time.sleep(0.1)
        shutil.rmtree(self.folder, ignore_errors=True)

    def _run(self, *words: str) -> None:
        with (self.folder / "start.log").open("ab") as log:
            done = subprocess.run(words, stdout=log, stderr=log, stdin=subprocess.DEVNULL, check=False)
        assert done.returncode == 0, (self.folder / "start.log").read_text()

    def _settings(self) -> str:
        said = subprocess.run(["slurmd", "-C"], capture_output=True, text=True, check=True).stdout
        memory = int(re.search(r"RealMemory=(\d+)", said)[1]) * 9 // 10
        ports = _free_port(), _free_port()
        return "\n".join(
            [
                "ClusterName=loop",
                f"SlurmctldHost={_node()}(127.0.0.1)",
                "AuthType=auth/munge",
                f"AuthInfo=socket={self.folder}/munge/sock",
                "SlurmUser=root",
                "SlurmdUser=root",
                f"StateSaveLocation={self.folder}/state",
                f"SlurmdSpoolDir={self.folder}/spool",
                *(f"{daemon.capitalize()}PidFile={self.folder}/{daemon}.pid" for daemon in ("slurmctld", "slurmd")),
                *(f"{daemon.capitalize()}LogFile={self.folder}/{daemon}.log" for daemon in ("slurmctld", "slurmd")),
                f"SlurmctldPort={ports[0]}",
                f"SlurmdPort={ports[1]}",
                "ProctrackType=proctrack/linuxproc",
                "TaskPlugin=task/none",
                "JobAcctGatherType=jobacct_gather/none",
                "SelectType=select/cons_tres",
                "SelectTypeParameters=CR_Core_Memory",
                "ReturnToService=2",
                "KillWait=2",
                "MpiDefault=none",
                f"NodeName={_node()} NodeAddr=127.0.0.1 CPUs={os.cpu_count()} RealMemory={memory} State=UNKNOWN",
                f"PartitionName=main Nodes={_node()} Default=YES MaxTime=INFINITE State=UP",
                "",
            ]
        )


_MUNGE_FILES: Sequence[tuple[str, str]] = (
    ("socket", "sock"),
    ("pid-file", "pid"),
    ("log-file", "log"),
    ("seed-file", "seed"),
)


def _node() -> str:
    return socket.gethostname().split(".")[0]
