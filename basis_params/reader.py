"""Reader of parameter tables in CSV form."""

from __future__ import annotations

import re
from collections.abc import Mapping
from pathlib import Path
from typing import get_args

from basis_params.atoms import atom_symbols
from basis_params.faults import (
    FaultList,
    Row,
    number,
    plain_text,
    read_text,
    shown,
    split_rows,
)
from basis_params.model import ElementParameters, ModelSettings, ParameterTable, Provenance, Shell
from basis_params.repulsion import is_repulsion, parse_repulsion
from basis_params.slater import radial_moment

COLUMNS = (
    *("element", "valence_electrons", "n", "l", "h_ii_eV"),
    *("zeta1", "c1", "zeta2", "c2"),
    *("source_key", "locator", "read_or_memory"),
)
OPTIONAL_COLUMNS = ("zeta3", "c3", "h_ii_sd_eV", "zeta_sd")
CHANNEL_KEYS = ("K_sigma", "K_pi", "K_delta")
SETTING_KEYS = ("K", "weighting", *CHANNEL_KEYS, "K_decay_per_A", "lambda")
SD_KEYS = tuple(f"{key}_sd" for key in SETTING_KEYS if key != "weighting")
TEXT_KEYS = ("name", "edition")
HEADER_KEYS = (*TEXT_KEYS, *SETTING_KEYS, *SD_KEYS)
NORM_TOLERANCE = 2e-3
UNSTATED_EDITION = "unstated"

_KEY_LINE = re.compile(r"#\s*([A-Za-z_][A-Za-z0-9_]*)\s*=\s*(.*)")


def read_table(path: str | Path, base: ParameterTable | None = None) -> ParameterTable:
    """Read a parameter table from a CSV file.

    Parameters
    ----------
    path : str or Path
    base : ParameterTable, optional
        Where header keys that the file leaves out are taken from; without it they are faults.

    Returns
    -------
    table : ParameterTable

    Raises
    ------
    FileNotFoundError
        If there is no such file.
    ParameterFileError
        If the table cannot be used; the error lists all faults with their lines.
    """
    path = Path(path)
    return parse_table(read_text(path), origin=str(path), default_name=path.stem, base=base)


def parse_table(text: str, origin: str, default_name: str, base: ParameterTable | None = None) -> ParameterTable:
    """Build a table from CSV text; see `read_table`.

    Raises
    ------
    ParameterFileError
    """
    faults = FaultList(origin)
    lines = text.splitlines()
    head = next((i for i, line in enumerate(lines) if line.strip() and not line.lstrip().startswith("#")), len(lines))
    keys, notes, pairs = _split_head(lines[:head], faults)
    settings, inherited = _settings(keys, base, faults)
    repulsion = parse_repulsion(pairs, faults)
    header, rows = split_rows("\n".join(lines[head:]), head + 1, faults)
    _check_columns(header, head + 1, faults)
    faults.raise_if_any()
    elements = _elements(rows, faults)
    name = keys["name"][1] if "name" in keys else plain_text(default_name, "name", 1, faults)
    _, edition = keys.get("edition", (0, UNSTATED_EDITION))
    faults.raise_if_any()
    return ParameterTable(name, edition, settings, elements, inherited, notes, origin, repulsion)


def _split_head(
    lines: list[str], faults: FaultList
) -> tuple[dict[str, tuple[int, str]], tuple[str, ...], list[tuple[int, str]]]:
    """Separate ``# key = value`` lines and two-body terms (with their line numbers) from notes."""
    keys: dict[str, tuple[int, str]] = {}
    notes = []
    pairs = []
    for line, text in enumerate((raw.strip() for raw in lines), start=1):
        if is_repulsion(text):
            pairs.append((line, text))
            continue
        match = _KEY_LINE.fullmatch(text)
        if match is None:
            note = text.lstrip("#").strip()
            if note:
                notes.append(plain_text(note, "note", line, faults))
            continue
        key, value = match.groups()
        if key not in HEADER_KEYS:
            faults.add(line, f"unknown key {shown(key)}: known keys are {', '.join(HEADER_KEYS)}")
        elif key in keys:
            faults.add(line, f"{key} is set twice: keep one (first on line {keys[key][0]})")
        else:
            keys[key] = (line, plain_text(value, key, line, faults) if key in TEXT_KEYS else value)
    return keys, tuple(notes), pairs


def _settings(
    keys: Mapping[str, tuple[int, str]], base: ParameterTable | None, faults: FaultList
) -> tuple[ModelSettings, tuple[str, ...]]:
    """Build the settings; missing keys come from `base` together with their standard deviations."""
    missing = tuple(key for key in SETTING_KEYS if key not in keys)
    if missing and base is None:
        faults.add(1, f"missing header keys: add '# key = value' lines for {', '.join(missing)}")
        faults.raise_if_any()
    values: dict[str, float | bool | None] = {}
    sd: dict[str, float] = {}
    for key in SETTING_KEYS:
        attribute = "lambda_" if key == "lambda" else key
        if key not in keys and base is not None:
            values[attribute] = getattr(base.settings, attribute)
            sd.update({k: v for k, v in base.settings.sd.items() if k == key})
        else:
            values[attribute] = _setting(key, *keys[key], faults)
    for key in SD_KEYS:
        if key in keys:
            sd[key.removesuffix("_sd")] = _not_negative(key, *keys[key], faults)
    return ModelSettings(**values, sd=sd), missing  # type: ignore[arg-type]


def _setting(key: str, line: int, text: str, faults: FaultList) -> float | bool | None:
    if key == "weighting":
        if text not in ("yes", "no"):
            faults.add(line, f"weighting is {shown(text)}: write yes or no")
        return text == "yes"
    if key in CHANNEL_KEYS and text == "K":
        return None
    return _not_negative(key, line, text, faults)


def _not_negative(what: str, line: int, text: str, faults: FaultList) -> float:
    value = number(text, what, line, faults)
    if value < 0:
        faults.add(line, f"{what} is {shown(text)}: it must be 0 or more")
    return value


def _check_columns(header: tuple[str, ...], line: int, faults: FaultList) -> None:
    extra = header[len(COLUMNS) :]
    wrong = [name for name in extra if name not in OPTIONAL_COLUMNS]
    if header[: len(COLUMNS)] != COLUMNS or wrong or len(set(extra)) != len(extra):
        faults.add(
            line,
            f"the header is {shown(','.join(header))}: write {','.join(COLUMNS)} "
            f"and, if wanted, any of {', '.join(OPTIONAL_COLUMNS)} after it",
        )


def _elements(rows: list[Row], faults: FaultList) -> dict[str, ElementParameters]:
    """Group the rows by element, in the order of atomic numbers."""
    shells: dict[str, dict[tuple[int, int], Shell]] = {}
    electrons: dict[str, int] = {}
    first_line: dict[str, int] = {}
    known = atom_symbols()
    for row in rows:
        symbol = row.cells["element"]
        if symbol not in known:
            faults.add(row.line, f"{shown(symbol)} is no element from H to Cm: correct the symbol")
            continue
        first_line.setdefault(symbol, row.line)
        count = _whole("valence_electrons", row, faults)
        if electrons.setdefault(symbol, count) != count:
            faults.add(row.line, f"{symbol} has {electrons[symbol]} valence electrons above and {count} here")
        shell = _shell(symbol, row, faults)
        if (shell.n, shell.l) in shells.setdefault(symbol, {}):
            faults.add(row.line, f"{symbol} {shell.n}{'spdf'[shell.l]} is given twice: keep one row")
        shells[symbol][shell.n, shell.l] = shell
    if not rows:
        faults.add(1, "no rows under the header: add one row per shell")
    for symbol, count in electrons.items():
        room = sum(4 * l + 2 for _, l in shells[symbol])
        if not 0 < count <= room:
            faults.add(first_line[symbol], f"{symbol} has {count} valence electrons for shells that hold 1 to {room}")
    return {s: ElementParameters(s, electrons[s], tuple(shells[s].values())) for s in known if s in shells}


def _shell(symbol: str, row: Row, faults: FaultList) -> Shell:
    cells, line = row.cells, row.line
    n, l = _whole("n", row, faults), _angular_number(row, faults)
    if not l < n <= 8:
        faults.add(line, f"{symbol}: n = {n} with l = {l}: n must be above l and at most 8")
        n = max(l + 1, 1)
    zetas, coefficients = _contraction(symbol, n, row, faults)
    provenance = cells["read_or_memory"]
    words = get_args(Provenance)
    if provenance not in words:
        faults.add(line, f"read_or_memory is {shown(provenance)}: write {', '.join(words)}")
    spread = {
        key: _not_negative(key, line, cells[key], faults) if cells.get(key) else None
        for key in ("h_ii_sd_eV", "zeta_sd")
    }
    return Shell(
        n=n,
        l=l,
        h_ii_eV=number(cells["h_ii_eV"], "h_ii_eV", line, faults),
        zetas=zetas,
        coefficients=coefficients,
        source_key=plain_text(cells["source_key"], "source_key", line, faults),
        locator=plain_text(cells["locator"], "locator", line, faults),
        provenance=provenance,  # type: ignore[arg-type]
        **spread,
    )


def _contraction(symbol: str, n: int, row: Row, faults: FaultList) -> tuple[tuple[float, ...], tuple[float, ...]]:
    """Exponents and coefficients of one row, held against the norm rule."""
    before = len(faults.faults)
    zetas: list[float] = []
    coefficients: list[float] = []
    for i in "123":
        zeta, c = row.cells.get(f"zeta{i}", ""), row.cells.get(f"c{i}", "")
        if not zeta and not c:
            continue
        if not zeta or len(zetas) != int(i) - 1:
            faults.add(row.line, f"{symbol}: c{i} or zeta{i} stands alone: fill the pairs from the left")
            break
        zetas.append(number(zeta, f"zeta{i}", row.line, faults))
        coefficients.append(number(c or "1", f"c{i}", row.line, faults))
    if len(zetas) > 1 and any(not row.cells[f"c{i + 1}"] for i in range(len(zetas))):
        faults.add(row.line, f"{symbol}: several exponents need all coefficients: fill c1, c2 ...")
    if not zetas or any(zeta <= 0 for zeta in zetas):
        faults.add(row.line, f"{symbol}: exponents must be positive: correct zeta1 ... (bohr^-1)")
    if len(faults.faults) == before:
        norm = radial_moment(n, zetas, coefficients, 0)
        if not abs(norm - 1.0) <= NORM_TOLERANCE:  # true for a NaN as well
            faults.add(
                row.line,
                f"{symbol}: the norm of the function is {norm:.4f}, not 1 within {NORM_TOLERANCE}: "
                "exponents and coefficients do not belong together, check them against the source",
            )
    return tuple(zetas), tuple(coefficients)


def _whole(column: str, row: Row, faults: FaultList) -> int:
    text = row.cells[column]
    if not (text.isascii() and text.isdigit() and len(text) < 4):
        faults.add(row.line, f"{column} is {shown(text)}: write a whole number")
        return 1
    return int(text)


def _angular_number(row: Row, faults: FaultList) -> int:
    text = row.cells["l"]
    if len(text) != 1 or text not in "0123spdf":
        faults.add(row.line, f"l is {shown(text)}: write s, p, d, f or 0 to 3")
        return 0
    return "spdf".index(text) if text.isalpha() else int(text)
