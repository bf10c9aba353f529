"""Structures of an ASE database in a SQLite file, row by row.

The columns that define atoms are read as they lie. Constraints, calculators and further data, which ASE would make
objects of, are left alone.
"""

from __future__ import annotations

import json
import sqlite3
from collections.abc import Iterator
from contextlib import closing
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final
from urllib.parse import quote

import numpy as np

from ehmo.errors import EhmoError, InputError, LimitError
from ehmo.records.fragment import Fragment
from ehmo.structure.ase_atoms import fragments_of_atoms
from ehmo.structure.electron_keys import ELECTRON_KEYS, StatedElectrons, stated_electrons
from ehmo.structure.files import MAX_ATOMS, shown

if TYPE_CHECKING:
    from ase import Atoms

    from ehmo.records.crystal import CrystalContents

_COLUMNS: Final = ("numbers", "positions", "cell", "pbc", "initial_charges", "initial_magmoms", "key_value_pairs")
_LONGEST_PAIRS: Final = 1_000_000
"""Bytes of key-value pairs in one row."""
_PAGE: Final = 100
_WHOLE: Final = 0.01
"""Sums of initial charges or moments closer than this to a whole number state it."""


@dataclass(frozen=True, slots=True)
class DatabaseRow:
    """Structures of one row of an ASE database.

    Attributes
    ----------
    number : int
        Its id in the database.
    tags : tuple of str
        Its key-value pairs as ``key=value``, those that state charge or spin left out.
    fragments : tuple of Fragment
        The molecule, or the molecules with metals of a periodic cell.
    contents : CrystalContents or None
        What a periodic cell holds, chains, layers and frameworks included; None for a molecule.
    fault : str
        Why the row cannot be used; empty if it can.
    """

    number: int
    tags: tuple[str, ...]
    fragments: tuple[Fragment, ...]
    contents: CrystalContents | None
    fault: str

    @property
    def entry(self) -> str:
        """Name of the row within its database."""
        return f"row {self.number}"


def ase_database_rows(path: Path, *, max_atoms: int = MAX_ATOMS) -> Iterator[DatabaseRow]:
    """Rows of an ASE database, a page at a time; the file is never written to.

    Charge and unpaired electrons are those of the key-value pairs (``total_charge``, ``unpaired``, ``multiplicity``
    and the like), else the sums of initial charges and initial magnetic moments where these are set and whole.

    Parameters
    ----------
    path : Path
    max_atoms : int
        Largest number of atoms in a row.

    Yields
    ------
    row : DatabaseRow
        A row that cannot be used has a `fault` and no fragments.

    Raises
    ------
    InputError
        If the file is no ASE database or is damaged.
    """
    for cells in _selected(path, _row_query(max_atoms)):
        yield _row(cells, shown(path, 200), max_atoms)


def ase_database_numbers(path: Path) -> Iterator[int]:
    """Ids of the rows of an ASE database in their order; errors as for `ase_database_rows`.

    Yields
    ------
    number : int
    """
    for cells in _selected(path, "SELECT id FROM systems WHERE id > ? ORDER BY id LIMIT 1000"):
        yield int(cells[0])


def ase_database_row(path: Path, number: int, *, max_atoms: int = MAX_ATOMS) -> DatabaseRow:
    """One row of an ASE database.

    Parameters
    ----------
    path : Path
    number : int
        Its id.
    max_atoms : int
        Largest number of atoms.

    Returns
    -------
    row : DatabaseRow

    Raises
    ------
    InputError
        If the file is no ASE database, is damaged or has no such row.
    """
    place = shown(path, 200)
    cells = next(_selected(path, _row_query(max_atoms), number - 1), None)
    if cells is None or cells[0] != number:
        raise InputError(f"no row {number}", place=place, mend="see whether the database was changed")
    return _row(cells, place, max_atoms)


def _selected(path: Path, query: str, last: int = -1) -> Iterator[tuple[Any, ...]]:
    """Rows with an id above `last`, a page at a time."""
    place = shown(path, 200)
    try:
        with closing(_connection(path)) as connection:
            _check(connection, place)
            while page := connection.execute(query, (last,)).fetchall():
                yield from page
                last = page[-1][0]
    except sqlite3.Error as fault:
        raise InputError(
            f"cannot be read as an ASE database ({shown(fault)})", place=place, mend="see whether it is whole"
        ) from None


def _connection(path: Path) -> sqlite3.Connection:
    connection = sqlite3.connect(f"file:{quote(str(path.absolute()))}?mode=ro", uri=True, isolation_level=None)
    connection.execute("PRAGMA trusted_schema = OFF")
    return connection


def _check(connection: sqlite3.Connection, place: str) -> None:
    # ASE itself would turn any other SQLite file into a database of its own.
    tables = {name for (name,) in connection.execute("SELECT name FROM sqlite_master WHERE type = 'table'")}
    columns = {name for (name,) in connection.execute("SELECT name FROM pragma_table_info('systems')")}
    if "systems" not in tables or not columns.issuperset(_COLUMNS):
        raise InputError("a SQLite file without ASE structures", place=place, mend="give one that ase.db wrote")


def _row_query(max_atoms: int) -> str:
    """Query of rows with an id above a value; cells over a limit stay in the file, with their length beside them."""
    limits = {"numbers": 4 * max_atoms, "positions": 24 * max_atoms, "cell": 72, "pbc": 20}
    limits |= {"initial_charges": 8 * max_atoms, "initial_magmoms": 24 * max_atoms, "key_value_pairs": _LONGEST_PAIRS}
    cells = ", ".join(f"CASE WHEN length({name}) <= {limits[name]} THEN {name} END" for name in _COLUMNS)
    return f"SELECT id, length(numbers), {cells} FROM systems WHERE id > ? ORDER BY id LIMIT {_PAGE}"


def _row(cells: tuple[Any, ...], place: str, max_atoms: int) -> DatabaseRow:
    number, length, *values = cells
    source = f"{place}, row {number}"
    tags: tuple[str, ...] = ()
    try:
        if isinstance(length, int) and length > 4 * max_atoms:
            raise LimitError(
                f"{length // 4} atoms, the limit is {max_atoms}", place=source, mend="raise max_atoms (--max-atoms)"
            )
        found = dict(zip(_COLUMNS, values, strict=True))
        pairs = _pairs(found["key_value_pairs"], source)
        tags = tuple(f"{key}={value}" for key, value in pairs.items() if key.lower() not in ELECTRON_KEYS)
        fragments, contents = _structures(_atoms(found, source), found, pairs, source)
    except EhmoError as fault:
        return DatabaseRow(number, tags, (), None, str(fault))
    return DatabaseRow(number, tags, fragments, contents, "")


def _pairs(text: Any, source: str) -> dict[str, str | float]:
    try:
        pairs = json.loads(text)
    except (TypeError, ValueError, RecursionError):
        pairs = None
    if not isinstance(pairs, dict):
        raise InputError("its key-value pairs cannot be read", place=source, mend="write the row again with ase.db")
    return {key: value for key, value in pairs.items() if isinstance(value, (str, int, float))}


def _atoms(found: dict[str, Any], source: str) -> Atoms:
    from ase import Atoms
    from ase.data import chemical_symbols

    try:
        numbers = np.frombuffer(found["numbers"], "<i4")
        positions = np.frombuffer(found["positions"], "<f8").reshape(len(numbers), 3)
        cell = np.frombuffer(found["cell"], "<f8").reshape(3, 3)
        periodic = [bool(int(found["pbc"]) & bit) for bit in (1, 2, 4)]
    except (TypeError, ValueError):
        raise InputError(
            "numbers, positions and cell of the atoms do not fit together",
            place=source,
            mend="write the row again with ase.db",
        ) from None
    bad = np.flatnonzero((numbers < 1) | (numbers >= len(chemical_symbols)))
    if bad.size:
        raise InputError(
            f"atomic number {numbers[bad[0]]} at atom {bad[0] + 1}", place=source, mend="use those of elements"
        )
    return Atoms(numbers=numbers, positions=positions, cell=cell, pbc=periodic)


def _structures(
    atoms: Atoms, found: dict[str, Any], pairs: dict[str, str | float], source: str
) -> tuple[tuple[Fragment, ...], CrystalContents | None]:
    stated = stated_electrons(pairs.items(), source)
    charge_sum = _whole_sum(found["initial_charges"], len(atoms))
    moment_sum = _whole_sum(found["initial_magmoms"], len(atoms))
    notes: list[str] = []
    charge, unpaired, charge_reason = stated.charge, stated.unpaired_electrons, ""
    if charge is None and charge_sum is not None:
        charge, charge_reason = charge_sum, "sum of the initial charges in the ASE database"
    if unpaired is None and moment_sum is not None:
        unpaired = abs(moment_sum)
        notes.append("Unpaired electrons are the sum of the initial magnetic moments in the ASE database.")
    title = str(pairs.get("name", atoms.get_chemical_formula()))
    fragments, contents = fragments_of_atoms(atoms, source, title, StatedElectrons(charge, unpaired))
    if contents is None or (len(fragments) == 1 and len(fragments[0]) == len(atoms)):
        one = fragments[0]
        reason = charge_reason or one.charge_reason
        return (replace(one, notes=(*one.notes, *notes), charge_reason=reason),), contents
    return fragments, contents


def _whole_sum(data: Any, count: int) -> int | None:
    """Sum of one number per atom if it is whole and any of them is set."""
    if not isinstance(data, bytes) or len(data) != 8 * count:
        return None
    values = np.frombuffer(data, "<f8")
    total = float(values.sum())
    if not values.any() or not np.isfinite(total) or abs(total) > 1000 or abs(total - round(total)) > _WHOLE:
        return None
    return round(total)
