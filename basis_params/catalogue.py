"""The parameter sets shipped with the package, and loading by name or path."""

from __future__ import annotations

from functools import cache
from importlib import resources
from pathlib import Path

from basis_params.model import ParameterTable
from basis_params.reader import parse_table
from basis_params.reader import read_table as _read_table

STANDARD = "standard"


@cache
def available_sets() -> tuple[str, ...]:
    """Return the names of the shipped sets."""
    folder = resources.files("basis_params").joinpath("sets")
    return tuple(sorted(f.name.removesuffix(".csv") for f in folder.iterdir() if f.name.endswith(".csv")))


@cache
def load_set(name: str) -> ParameterTable:
    """Return a shipped set; read once, then kept.

    Raises
    ------
    KeyError
        If no set has that name.
    """
    if name not in available_sets():
        raise KeyError(f"no parameter set {name!a}: choose from {', '.join(available_sets())}")
    text = resources.files("basis_params").joinpath("sets", f"{name}.csv").read_text("utf-8")
    base = None if name == STANDARD else load_set(STANDARD)
    return parse_table(text, origin="built in", default_name=name, base=base)


def read_table(path: str | Path) -> ParameterTable:
    """Read a table of the user's own; header keys it leaves out are taken from the set ``standard``.

    Raises
    ------
    FileNotFoundError
        If there is no such file.
    ParameterFileError
        If the table cannot be used; the error lists all faults with their lines.
    """
    return _read_table(path, base=load_set(STANDARD))


def load(name_or_path: str | Path) -> ParameterTable:
    """Return a shipped set by name, or else read a file.

    Raises
    ------
    FileNotFoundError
        If the text is neither the name of a set nor the path of a file.
    ParameterFileError
        If the file cannot be used.
    """
    if isinstance(name_or_path, str) and name_or_path in available_sets():
        return load_set(name_or_path)
    if not Path(name_or_path).exists():
        raise FileNotFoundError(
            f"{str(name_or_path)!a} is neither a parameter set ({', '.join(available_sets())}) nor a file: "
            "check the name or the path"
        )
    return read_table(name_or_path)
