"""The layers of the program, kept by the import contracts of pyproject.toml."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]


def run_contracts(folder: Path, config: str) -> subprocess.CompletedProcess[str]:
    program = "import sys; from importlinter.cli import lint_imports_command; lint_imports_command()"
    return subprocess.run(
        [sys.executable, "-c", program, "--config", config, "--no-cache"],
        cwd=folder,
        capture_output=True,
        text=True,
        check=False,
    )


def test_imports_keep_the_contracts():
    pytest.importorskip("importlinter", reason="import-linter is not installed")
    if not (ROOT / "pyproject.toml").exists():
        pytest.skip("the tests run without a checkout: no pyproject.toml")
    outcome = run_contracts(ROOT, "pyproject.toml")
    assert outcome.returncode == 0, outcome.stdout + outcome.stderr
    assert "0 broken" in outcome.stdout


def test_an_import_against_the_layers_is_noticed(tmp_path):
    # The checker must be able to fail: the lowest layer of a small copy imports the highest.
    pytest.importorskip("importlinter", reason="import-linter is not installed")
    package = tmp_path / "upside"
    package.mkdir()
    (package / "__init__.py").write_text("")
    (package / "high.py").write_text("")
    (package / "low.py").write_text("import upside.high\n")
    (tmp_path / "pyproject.toml").write_text(
        '[tool.importlinter]\nroot_packages = ["upside"]\n[[tool.importlinter.contracts]]\nname = "one way"\n'
        'type = "layers"\ncontainers = ["upside"]\nlayers = ["high", "low"]\n'
    )
    assert run_contracts(tmp_path, "pyproject.toml").returncode != 0


def test_every_module_of_the_program_is_under_a_contract():
    # An exhaustive contract fails for a new module that no layer names.
    if not (ROOT / "pyproject.toml").exists():
        pytest.skip("the tests run without a checkout: no pyproject.toml")
    import tomllib

    contracts = tomllib.loads((ROOT / "pyproject.toml").read_text())["tool"]["importlinter"]["contracts"]
    layered = next(contract for contract in contracts if contract["type"] == "layers")
    assert layered["exhaustive"] is True
    assert layered["containers"] == ["ehmo"]
    text = " ".join(layered["layers"]).replace("(", " ").replace(")", " ").replace("|", " ")
    found = {path.stem for path in (ROOT / "ehmo").iterdir() if path.suffix == ".py" or (path / "__init__.py").exists()}
    assert found - {"__init__"} <= set(text.split())
