"""Jobs of Slurm: what their profile may say, their script, and a real batch on a real Slurm."""

from __future__ import annotations

import re
import shlex
import subprocess
import sys
from contextlib import closing
from pathlib import Path

import pytest

from ehmo.batch import run_batch, work_items
from ehmo.batch.slurm import SlurmProfile, job_script, read_profile, slurm_engine
from ehmo.errors import InputError
from ehmo.store import open_store
from tests.batch.files import many_frames, put
from tests.batch.slurm_programs import OneNodeSlurm, why_not
from tests.batch.test_faults import SETTINGS, assert_right, rows

pytest.importorskip("dask_jobqueue", reason="dask-jobqueue is not installed: pip install 'ehmo[cluster]'")

psutil = pytest.importorskip("psutil", reason="psutil, which dask brings, is not installed")

ROOT = Path(__file__).parents[2]

PROFILE = """
walltime = "1-02:30:00"
memory = "16GB"
cores = 4
jobs = 8
least_jobs = 1
queue = "short"
account = "chem-7"
interface = "lo"
python = "/opt/our python/bin/python"
folder = "{folder}"
options = ["--constraint=avx2", "--exclusive"]
prologue = ["module load python", "export A='b c'; echo $A"]
"""


def profile(tmp_path, text):
    return read_profile(put(tmp_path, "p.toml", text))


def test_the_script_says_what_the_profile_says(tmp_path):
    script = job_script(profile(tmp_path, PROFILE.format(folder=tmp_path).replace("our python", "ours")))
    lines = script.splitlines()
    assert lines[0].startswith("#!/")
    directives = [line.removeprefix("#SBATCH ") for line in lines if line.startswith("#SBATCH")]
    for words in ("-p short", "-A chem-7", "-t 1-02:30:00", "--cpus-per-task=4", "--mem=15G", "--constraint=avx2"):
        assert words in directives
    assert "--exclusive" in directives
    prologue = lines.index("module load python")
    assert lines[prologue + 1] == "export A='b c'; echo $A"
    worker = shlex.split(lines[-1])
    assert worker[0] == "/opt/ours/bin/python"
    assert worker[worker.index("--nthreads") + 1] == "4"
    assert "--no-dashboard" in worker
    assert worker[worker.index("--lifetime") + 1] == f"{26 * 3600 + 30 * 60 - 120}s"
    assert subprocess.run(["bash", "-n"], input=script, text=True, check=False).returncode == 0


def test_an_interpreter_with_a_blank_in_its_path_is_quoted(tmp_path):
    script = job_script(SlurmProfile("1:00:00", "2GB", python="/opt/our python/bin/python", folder=str(tmp_path)))
    assert shlex.split(script.splitlines()[-1])[0] == "/opt/our python/bin/python"


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ('queue = "main\\n#SBATCH --wrap=reboot"', "queue"),
        ('queue = "main; reboot"', "queue"),
        ('queue = "$(reboot)"', "queue"),
        ('account = "a b"', "account"),
        ('interface = "lo`x`"', "interface"),
        ('python = "python; rm x"', "python"),
        ('folder = "/scratch/a b"', "folder"),
        ('options = ["--wrap=a\\nreboot"]', "options"),
        ('options = ["reboot"]', "options"),
        ('options = ["--a b"]', "options"),
        ("options = [3]", "options"),
        ('prologue = ["module load a\\nreboot"]', "prologue"),
        ('prologue = "module"', "prologue is no list"),
        ('walltime = "soon"', "walltime"),
        ('walltime = "1:00:00 --wrap"', "walltime"),
        ('memory = "much"', "memory"),
        ("cores = 0", "cores = 0 is out of range"),
        ("jobs = true", "jobs is no number"),
        ('cores = "2"', "cores is no number"),
        ('partition = "main"', "unknown key 'partition'"),
    ],
)
def test_profiles_that_a_script_cannot_hold_are_refused(tmp_path, change, said):
    name = change.split(" = ")[0]
    usual = {"walltime": 'walltime = "1:00:00"', "memory": 'memory = "2GB"'}
    text = "\n".join([change, *(line for key, line in usual.items() if key != name)])
    with pytest.raises(InputError, match=said) as refused:
        profile(tmp_path, text)
    assert str(refused.value).isprintable()


@pytest.mark.parametrize("text", ["", 'walltime = "1:00:00"', "walltime = ", "\x00", '[jobs]\nmemory = "2GB"'])
def test_incomplete_profiles_are_refused_with_one_that_works(tmp_path, text):
    with pytest.raises(InputError, match=r"p\.toml: "):
        profile(tmp_path, text)


def test_a_folder_that_a_script_cannot_hold_is_refused(tmp_path, monkeypatch):
    odd = tmp_path / "our folder"
    odd.mkdir()
    monkeypatch.chdir(odd)
    with pytest.raises(InputError, match="folder ="):
        job_script(SlurmProfile("1:00:00", "2GB"))


def test_print_job_prints_the_script_and_starts_nothing(ehmo, tmp_path):
    put(tmp_path, "p.toml", f'walltime = "1:00:00"\nmemory = "2GB"\nfolder = "{tmp_path}"')
    ran = ehmo("batch", "--slurm", "p.toml", "--print-job")
    assert (ran.status, ran.err) == (0, "")
    assert "#SBATCH -t 1:00:00" in ran.out
    assert [path.name for path in tmp_path.iterdir()] == ["p.toml"]


@pytest.fixture(scope="module")
def slurm():
    reason = why_not()
    if reason:
        pytest.skip(reason)
    running = OneNodeSlurm()
    yield running
    running.stop()


def loopback_profile(folder: Path, **changes) -> SlurmProfile:
    words = {
        "walltime": "00:20:00",
        "memory": "1500MB",
        "jobs": 2,
        "queue": "main",
        "interface": "lo",
        "folder": str(folder),
        "prologue": (f"export PYTHONPATH={shlex.quote(str(ROOT))}",),
    }
    return SlurmProfile(**(words | changes))


def test_a_batch_on_slurm_with_a_job_killed_on_its_way(tmp_path, slurm, monkeypatch):
    monkeypatch.setenv("SLURM_CONF", str(slurm.configuration))
    path, location = put(tmp_path, "a.xyz", many_frames(120)), str(tmp_path / "r.sqlite")
    killed: list[str] = []

    def kill(result):
        running = slurm.jobs() if result.done >= 5 and not killed else []
        if running:
            killed.append(running[0])
            slurm.command("scancel", "--signal=KILL", "--full", running[0])

    engine = slurm_engine(loopback_profile(tmp_path), time_limit_s=120.0)
    with closing(engine), open_store(location, create=True) as store:
        own = psutil.Process().net_connections("inet")
        assert {one.laddr.ip for one in own if one.status == psutil.CONN_LISTEN} == {"127.0.0.1"}
        result = run_batch(work_items([str(path)]), store, engine, SETTINGS, on_progress=kill)
    assert killed
    assert (result.done, result.failed) == (120, 0)
    assert_right(location, path, every=40)
    assert len({row.key for row in rows(location)}) == 120


def test_the_command_runs_on_slurm_and_leaves_no_job_behind(tmp_path, slurm):
    put(tmp_path, "a.xyz", many_frames(6))
    prologue = f"export PYTHONPATH={shlex.quote(str(ROOT))}"
    text = f'walltime = "00:20:00"\nmemory = "1500MB"\nqueue = "main"\ninterface = "lo"\nfolder = "{tmp_path}"\n'
    put(tmp_path, "p.toml", f'{text}prologue = ["{prologue}"]\n')
    ran = subprocess.run(
        [sys.executable, "-m", "ehmo", "batch", "a.xyz", "--store", "r.sqlite", "--slurm", "p.toml"],
        cwd=tmp_path,
        env={**slurm.environment, "PYTHONPATH": str(ROOT)},
        capture_output=True,
        text=True,
        check=False,
    )
    assert (ran.returncode, ran.stderr) == (0, "")
    assert "6 structures: 6 calculated, 0 failed" in ran.stdout
    assert slurm.command("squeue", "-h", "-t", "PD,R", "-o", "%A").split() == []


def test_the_profile_in_readme_is_usable(tmp_path):
    readme = ROOT / "README.md"
    if not readme.exists():
        pytest.skip("the tests run without a checkout: no README.md")
    blocks = re.findall(r"```toml\n(.*?)```", readme.read_text(encoding="utf-8"), re.DOTALL)
    (text,) = (block for block in blocks if "walltime" in block)
    found = profile(tmp_path, text)
    assert (found.cores, found.jobs, found.prologue) == (8, 20, ("module load python",))
