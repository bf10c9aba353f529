"""Specification of a calibration: a TOML file that names parameters, observables and structures."""

from __future__ import annotations

import hashlib
import math
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from basis_params import ParameterTable
from ehmo.errors import InputError
from ehmo.orbitals.parameters import element_parameters, load_parameters
from ehmo.records.calibration import QUANTITIES, CalibrationSpec, FreePair, FreeParameter, Quantity
from ehmo.studies.calibration.keys import Keys
from ehmo.studies.calibration.observables import read_observables

MAX_BYTES = 1_000_000
CONSTANTS = ("K", "K_sigma", "K_pi", "K_delta", "K_decay_per_A", "lambda")
KINDS = ("h_ii", "zeta", *CONSTANTS)

_TOP = (
    *("name", "edition", "base", "notes", "elements", "source_key"),
    *("observables", "structures", "margin_A", "unsettled"),
)
_TABLES = ("sd", "oxidation_states", "fit", "repulsion")
_FIT = ("parameter", "of", "together", "start", "sd", "lowest", "highest")
_REPULSION = ("pairs", "decay_per_A", "decay_sd")
_SPREAD = 4.0  # bounds left out lie so many standard deviations from the start


def read_spec(path: str | Path) -> CalibrationSpec:
    """Read a specification with the observables that it names.

    Parameters
    ----------
    path : str or Path
        TOML file; paths in it count from its folder.

    Returns
    -------
    spec : CalibrationSpec

    Raises
    ------
    InputError
        If a file is missing or something in it cannot be used; the message names the line or the key.
    ParameterError
        If the base set cannot be read or lacks a shell.
    """
    path = Path(path)
    text = _text(path)
    try:
        content = tomllib.loads(text)
    except tomllib.TOMLDecodeError as fault:
        raise InputError(f"not valid TOML: {fault}", place=str(path), mend="correct that line") from None
    keys = Keys(str(path), content)
    keys.only((*_TOP, *_TABLES))
    name = keys.text("name")
    base_name = keys.text("base", "standard")
    base = load_parameters(base_name if not _is_file(path, base_name) else str(path.parent / base_name))
    sds = _scales(keys)
    tables = keys.texts("observables")
    structure_files = tuple(str(path.parent / name) for name in keys.texts("structures"))
    observables = tuple(row for name in tables for row in read_observables(path.parent / name, sds))
    hashed = [text, base.content_sha256, *(_text(path.parent / name) for name in tables)]
    hashed += [_text(Path(name)) for name in structure_files]
    parameters = tuple(p for entry in keys.entries("fit", _FIT) for p in _parameters(entry, base))
    pairs = tuple(pair for entry in keys.entries("repulsion", _REPULSION) for pair in _pairs(entry, base))
    if not parameters and not pairs:
        raise keys.fault("fit", "nothing is to be fitted", "add an entry [[fit]] with a parameter, or [[repulsion]]")
    _distinct([parameter.name for parameter in parameters], keys, "fit")
    _distinct(["-".join(sorted((pair.first, pair.second), reverse=True)) for pair in pairs], keys, "repulsion")
    return CalibrationSpec(
        name=name,
        edition=keys.text("edition", "1"),
        base=base_name,
        notes=keys.texts("notes", ()),
        elements=_elements(keys, base),
        source_key=keys.text("source_key", f"{name}-calibration"),
        parameters=parameters,
        pairs=pairs,
        observables=observables,
        structure_files=structure_files,
        oxidation_states=_oxidation_states(keys),
        margin_A=keys.number("margin_A", 0.05, lowest=0.0),
        unsettled=keys.number("unsettled", 5.0, lowest=0.0),
        place=str(path),
        sha256=hashlib.sha256("\0".join(hashed).encode()).hexdigest(),
    )


def _text(path: Path) -> str:
    try:
        if path.stat().st_size > 20 * MAX_BYTES:
            raise InputError("larger than any specification or training set", place=str(path), mend="give another file")
        return path.read_text("utf-8")
    except (OSError, ValueError) as fault:
        said = getattr(fault, "strerror", None) or "not UTF-8 text"
        raise InputError(f"cannot be read ({said})", place=str(path), mend="check the path") from None


def _is_file(path: Path, name: str) -> bool:
    return name.endswith(".csv") and (path.parent / name).is_file()


def _scales(keys: Keys) -> dict[Quantity, float]:
    """What counts as one standard deviation, by quantity."""
    table = keys.table("sd")
    table.only(QUANTITIES)
    return {quantity: table.number(quantity, above=0.0) for quantity in QUANTITIES if table.has(quantity)}


def _elements(keys: Keys, base: ParameterTable) -> tuple[str, ...]:
    elements = keys.texts("elements", ())
    for symbol in elements:
        element_parameters(base, symbol)
    return elements


def _oxidation_states(keys: Keys) -> dict[str, int]:
    table = keys.table("oxidation_states")
    for name, state in table.items():
        if isinstance(state, bool) or not isinstance(state, int):
            raise table.fault(name, "no whole number", "write the oxidation state of its metal")
    return dict(table.items())


def _parameters(entry: Keys, base: ParameterTable) -> Iterator[FreeParameter]:
    kind = entry.text("parameter")
    if kind not in KINDS:
        raise entry.fault("parameter", f"{kind!r} cannot be fitted", f"choose from {', '.join(KINDS)}")
    if kind in CONSTANTS:
        for key in ("of", "together"):
            if entry.has(key):
                raise entry.fault(key, f"{kind} belongs to no element", f"leave {key} out")
        yield _parameter(entry, kind, "constant", (), _constant(base, kind), floor=0.0)
        return
    shells = [_shell(entry, base, word) for word in entry.texts("of")]
    groups = [tuple(shells)] if entry.flag("together") else [(shell,) for shell in shells]
    for group in groups:
        yield _parameter(entry, "", "h_ii" if kind == "h_ii" else "zeta", group, 0.0, floor=-math.inf)


def _parameter(
    entry: Keys, key: str, kind: Any, shells: tuple[tuple[str, int, int], ...], default: float, *, floor: float
) -> FreeParameter:
    start, sd = entry.number("start", default), entry.number("sd", above=0.0)
    lowest = entry.number("lowest", max(start - _SPREAD * sd, floor))
    highest = entry.number("highest", start + _SPREAD * sd)
    if not lowest < start < highest:
        raise entry.fault("start", f"{start:g} is not between {lowest:g} and {highest:g}", "move it or the bounds")
    if lowest < floor:
        raise entry.fault("lowest", f"{lowest:g} is out of range", f"it must be at least {floor:g}")
    return FreeParameter(kind, key, shells, start, sd, lowest, highest)


def _constant(base: ParameterTable, key: str) -> float:
    value = getattr(base.settings, "lambda_" if key == "lambda" else key)
    return float(base.settings.K if value is None else value)


def _shell(entry: Keys, base: ParameterTable, words: str) -> tuple[str, int, int]:
    symbol, _, label = words.partition(" ")
    for shell in element_parameters(base, symbol).shells:
        if shell.label == label:
            return symbol, shell.n, shell.l
    raise entry.fault("of", f"the base has no shell {words!r}", "write element and shell, as in V 3d")


def _pairs(entry: Keys, base: ParameterTable) -> Iterator[FreePair]:
    for words in entry.texts("pairs"):
        first, _, second = words.partition("-")
        if not first or not second:
            raise entry.fault("pairs", f"{words!r} is no pair of elements", "write them as in V-O")
        for symbol in (first, second):
            element_parameters(base, symbol)
        yield FreePair(first, second, entry.number("decay_per_A", above=0.0), entry.number("decay_sd", 0.0, lowest=0.0))


def _distinct(names: list[str], keys: Keys, key: str) -> None:
    for name in names:
        if names.count(name) > 1:
            raise keys.fault(key, f"{name} is listed twice", "keep one entry")
