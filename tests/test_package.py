"""What `import ehmo` costs, what the wheel holds, what the repository holds, what the docstrings say."""

from __future__ import annotations

import ast
import inspect
import os
import pkgutil
import subprocess
import sys
import zipfile
from importlib import import_module
from pathlib import Path

import pytest

import basis_params
import ehmo

ROOT = Path(__file__).parents[1]
HEAVY = {"pyscf", "gemmi", "ase", "scipy", "matplotlib", "numpy"}
TOP_LEVEL = {
    "README.md",
    "DEVELOPERS.md",
    "pyproject.toml",
    "ehmo",
    "basis_params",
    "tests",
    "benchmarks",
}
DATA_SUFFIXES = {".csv", ".json", ".xyz", ".typed", ".css", ".js"}


def loaded_after(statement: str) -> set[str]:
    program = f"import sys\n{statement}\nsys.stderr.write(' '.join(sys.modules))"
    outcome = subprocess.run(
        [sys.executable, "-c", program],
        capture_output=True,
        text=True,
        check=True,
        env={**os.environ, "PYTHONPATH": os.pathsep.join([str(ROOT), os.environ.get("PYTHONPATH", "")])},
    )
    return set(outcome.stderr.split())


@pytest.mark.parametrize(
    ("statement", "needed"),
    [
        ("import ehmo", set()),
        ("import basis_params", set()),
        ("import ehmo.cli", set()),
        ("import ehmo; ehmo.EhmoError", set()),
        ("import ehmo; ehmo.bond_report; ehmo.read", {"numpy", "scipy"}),
        ("from ehmo.cli import main; main(['params', 'list'])", set()),
        ("from ehmo.cli import main; main(['demo'])", {"numpy", "scipy"}),
    ],
    ids=["ehmo", "basis_params", "cli", "one name", "calculation", "params list", "demo"],
)
def test_heavy_libraries_are_imported_only_where_they_are_used(statement, needed):
    loaded = loaded_after(statement)
    assert loaded & HEAVY <= needed
    assert "ase.io" not in loaded


@pytest.fixture(scope="module")
def wheel(tmp_path_factory) -> list[str]:
    """Names of the files in a wheel built from the checkout."""
    builder = pytest.importorskip("hatchling.builders.wheel", reason="hatchling is not installed")
    if not (ROOT / "pyproject.toml").exists():
        pytest.skip("the tests run without a checkout: no pyproject.toml")
    if not (ROOT / "README.md").exists():
        pytest.skip("the checkout has no README.md, which the wheel's metadata need")
    folder = tmp_path_factory.mktemp("wheel")
    (path,) = builder.WheelBuilder(str(ROOT)).build(directory=str(folder), versions=["standard"])
    with zipfile.ZipFile(path) as archive:
        return archive.namelist()


def test_wheel_holds_every_module_and_table(wheel):
    wanted = {
        path.relative_to(ROOT).as_posix()
        for package in ("ehmo", "basis_params")
        for path in (ROOT / package).rglob("*")
        if path.suffix in DATA_SUFFIXES | {".py"} and "__pycache__" not in path.parts
    }
    assert {Path(name).suffix for name in wanted} >= DATA_SUFFIXES | {".py"}
    assert wanted <= set(wheel)


def test_wheel_holds_nothing_but_the_two_packages(wheel):
    tops = {name.split("/")[0] for name in wheel}
    assert {top for top in tops if not top.endswith(".dist-info")} == {"ehmo", "basis_params"}
    assert not [name for name in wheel if "__pycache__" in name or "test" in name]


def test_wheel_declares_the_command(wheel):
    assert any(name.endswith("entry_points.txt") for name in wheel)


def test_both_packages_say_that_they_are_typed():
    for package in (ehmo, basis_params):
        assert (Path(package.__file__).parent / "py.typed").exists()


def test_version_of_the_program_is_that_of_the_distribution():
    if not (ROOT / "pyproject.toml").exists():
        pytest.skip("the tests run without a checkout: no pyproject.toml")
    import tomllib

    project = tomllib.loads((ROOT / "pyproject.toml").read_text())["project"]
    assert project.get("version", ehmo.__version__) == ehmo.__version__


def test_repository_holds_only_the_agreed_top_level_entries():
    if not (ROOT / ".git").exists():
        pytest.skip("the tests run without a checkout: no list of tracked files")
    listed = subprocess.run(["git", "ls-files", "-z"], cwd=ROOT, capture_output=True, text=True, check=False)
    if listed.returncode:
        pytest.skip("git does not answer here")
    tops = {name.split("/")[0] for name in listed.stdout.split("\0") if name}
    assert {top for top in tops if not top.startswith(".")} <= TOP_LEVEL


def public_objects() -> list[tuple[str, object]]:
    """Functions, classes and methods without underscore that the two packages define."""
    found = []
    for package in (ehmo, basis_params):
        for info in pkgutil.walk_packages(package.__path__, f"{package.__name__}."):
            if info.name.endswith("__main__"):
                continue
            module = import_module(info.name)
            found.append((info.name, module))
            for name, thing in vars(module).items():
                if name.startswith("_") or getattr(thing, "__module__", None) != info.name:
                    continue
                if inspect.isfunction(inspect.unwrap(thing)) or inspect.isclass(thing):
                    found.append((f"{info.name}.{name}", thing))
    return found


def test_everything_public_has_a_docstring():
    assert [name for name, thing in public_objects() if not inspect.getdoc(thing)] == []


SECTIONLESS_LINES = 2
"""A docstring this short says what comes out in its one sentence."""


def test_longer_docstrings_describe_each_argument():
    silent = []
    for name, thing in public_objects():
        function = inspect.unwrap(thing) if callable(thing) and not inspect.isclass(thing) else None
        if not inspect.isfunction(function):
            continue
        text = inspect.getdoc(function) or ""
        if len(text.splitlines()) <= SECTIONLESS_LINES or "Parameters\n" not in text:
            continue
        described = text.split("Parameters\n", 1)[1]
        arguments = [a for a in inspect.signature(function).parameters if not a.startswith("_")]
        silent += [f"{name}: {argument}" for argument in arguments if argument not in described]
    assert silent == []


def test_docstrings_with_parameters_say_what_comes_back():
    silent = []
    for name, thing in public_objects():
        function = inspect.unwrap(thing) if callable(thing) and not inspect.isclass(thing) else None
        if not inspect.isfunction(function) or "Parameters\n" not in (inspect.getdoc(function) or ""):
            continue
        returns = inspect.signature(function).return_annotation
        if returns not in {"None", None, inspect.Signature.empty} and not any(
            f"{heading}\n---" in inspect.getdoc(function) for heading in ("Returns", "Yields")
        ):
            silent.append(name)
    assert silent == []


def test_names_exported_by_the_packages_exist():
    for package in (ehmo, basis_params):
        for name in package.__all__:
            assert getattr(package, name) is not None
    with pytest.raises(AttributeError, match="no attribute 'nothing'"):
        _ = ehmo.nothing


@pytest.mark.parametrize("package", ["ehmo", "basis_params"])
def test_only_the_command_line_prints(package):
    # Computation is pure: no print outside the one place that writes the answer.
    folder = Path(import_module(package).__file__).parent
    printing = [
        path.relative_to(folder).as_posix()
        for path in folder.rglob("*.py")
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8")))
        if isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id == "print"
    ]
    assert set(printing) <= {"cli/__init__.py"}
