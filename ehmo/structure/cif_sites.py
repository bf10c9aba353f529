"""Atom sites of a CIF block: labels, elements, coordinates, occupancy, disorder, oxidation numbers."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from ehmo.conventions import ELEMENT_SYMBOLS
from ehmo.errors import InputError, LimitError
from ehmo.structure.cif_symmetry import item_text
from ehmo.structure.files import shown

if TYPE_CHECKING:
    import gemmi

_TAGS: Final = (
    "fract_x",
    "fract_y",
    "fract_z",
    "?label",
    "?type_symbol",
    "?occupancy",
    "?disorder_assembly",
    "?disorder_group",
    "?calc_flag",
    "?attached_hydrogens",
)
_MAX_FRACTIONAL: Final = 1e3
_MAX_OCCUPANCY: Final = 1.1  # a refined occupancy may pass 1 by its uncertainty


@dataclass(frozen=True, slots=True)
class Site:
    """One listed atom site.

    Attributes
    ----------
    label, symbol : str
    fractional : tuple of float
    occupancy : float
        Share of cells in which the atom is present.
    assembly, group : str
        Disorder assembly and group; empty where there is none.
    calculated : bool
        Whether the position was calculated, as that of a riding hydrogen.
    oxidation : float or None
        Oxidation number that the file gives the atom.
    attached : int or None
        Hydrogens that the file says are attached to the atom.
    """

    label: str
    symbol: str
    fractional: tuple[float, float, float]
    occupancy: float = 1.0
    assembly: str = ""
    group: str = ""
    calculated: bool = False
    oxidation: float | None = None
    attached: int | None = None


def site_prefix(block: gemmi.cif.Block) -> str:
    """How the items of atom sites begin in a block; empty where it has none with fractional coordinates."""
    return next((name for name in ("_atom_site_", "_atom_site.") if block.find_loop(f"{name}fract_x")), "")


def read_sites(block: gemmi.cif.Block, place: str, notes: list[str], max_atoms: int) -> list[Site]:
    """Sites that are atoms; every fault of the list is collected into one message.

    Raises
    ------
    InputError
        If a site has no known element or no usable coordinates or occupancy.
    LimitError
        If more than `max_atoms` sites are listed.
    """
    rows = len(block.find_loop(f"{site_prefix(block)}fract_x"))
    if rows > max_atoms:
        raise LimitError(
            f"{rows} atom sites, the limit is {max_atoms}", place=place, mend="raise max_atoms (--max-atoms)"
        )
    allowed = formula_elements(item_text(block, "_chemical_formula_sum"))
    numbers = _oxidation_numbers(block)
    sites: list[Site] = []
    faults: dict[str, list[str]] = {}
    skipped: list[str] = []
    dummies: list[str] = []
    deuterium = 0
    for row in _rows(block):
        if row.flag == "dum" or row.occupancy == 0.0:
            (dummies if row.flag == "dum" and _is_hydrogen(row.kind, row.label) else skipped).append(row.label)
            continue
        symbol = element(row.kind, row.label, allowed)
        if symbol is None:
            faults.setdefault("unknown element", []).append(row.label)
        if not np.isfinite(row.xyz).all() or max(map(abs, row.xyz)) > _MAX_FRACTIONAL:
            faults.setdefault("no usable coordinates", []).append(row.label)
        if not 0.0 < row.occupancy <= _MAX_OCCUPANCY:
            faults.setdefault("no usable occupancy", []).append(row.label)
        if symbol is not None:
            deuterium += symbol == "H" and _letters(row.kind or row.label).upper() in ("D", "DW")
            oxidation = numbers.get(row.kind, _charge_of_type(row.kind))
            sites.append(
                Site(
                    row.label, symbol, row.xyz, min(row.occupancy, 1.0), row.assembly, row.group,
                    row.flag in ("calc", "c"), oxidation, row.attached,
                )
            )  # fmt: skip
    if faults:
        parts = (f"{fault}: {listed(labels)}" for fault, labels in faults.items())
        raise InputError("; ".join(parts), place=place, mend="correct these sites, or take them out of the file")
    if not sites:
        raise InputError("no atoms among the sites", place=place, mend="give a CIF with atom sites")
    if skipped:
        notes.append(f"Dummy or empty sites left out: {listed(skipped)}.")
    if dummies:
        notes.append(f"Hydrogens listed without a position: {listed(dummies)}.")
    if deuterium:
        notes.append(f"Deuterium taken as hydrogen: {deuterium} site{'s' * (deuterium > 1)}.")
    return sites


def listed(labels: list[str], limit: int = 6) -> str:
    """Labels on one line, cut after a few."""
    return ", ".join(shown(label, 12) for label in labels[:limit]) + " ..." * (len(labels) > limit)


@dataclass(frozen=True, slots=True)
class _Row:
    label: str
    kind: str
    xyz: tuple[float, float, float]
    occupancy: float
    assembly: str
    group: str
    flag: str
    attached: int | None


def _rows(block: gemmi.cif.Block) -> Iterator[_Row]:
    from gemmi import cif

    table = block.find(site_prefix(block), list(_TAGS))
    present = [k for k in range(len(_TAGS)) if table.has_column(k)]
    for number, row in enumerate(table, start=1):
        text = {k: cif.as_string(row[k]) for k in present if not cif.is_null(row[k])}
        x, y, z = (cif.as_number(row[k]) for k in range(3))
        occupancy = cif.as_number(row[5]) if 5 in text else 1.0
        group = text.get(7, "")
        attached = text.get(9, "")
        yield _Row(
            label=text.get(3) or f"site {number}",
            kind=text.get(4, ""),
            xyz=(x, y, z),
            occupancy=occupancy,
            assembly=text.get(6, ""),
            group="" if group == "0" else group,
            flag=text.get(8, ""),
            attached=int(attached) if attached.isascii() and attached.isdigit() else None,
        )


def _oxidation_numbers(block: gemmi.cif.Block) -> dict[str, float]:
    from gemmi import cif

    found = {}
    rows = block.find("_atom_type_", ["symbol", "oxidation_number"])
    for row in rows or block.find("_atom_type.", ["symbol", "oxidation_number"]):
        number = cif.as_number(row[1])
        if np.isfinite(number):
            found[cif.as_string(row[0])] = number
    return found


def _charge_of_type(kind: str) -> float | None:
    """Oxidation number in a type symbol such as ``V4+`` or ``O2-``.

    Examples
    --------
    >>> _charge_of_type("V4+"), _charge_of_type("O2-"), _charge_of_type("V")
    (4.0, -2.0, None)
    """
    match = re.fullmatch(r"[A-Za-z]{1,2}(\d(?:\.\d+)?)([+-])", kind)
    return float(match[2] + match[1]) if match else None


def formula_counts(formula: str) -> dict[str, float]:
    """Atoms of a formula such as ``C2 H6 O``, deuterium as hydrogen; empty where a part cannot be read.

    Examples
    --------
    >>> formula_counts("V S O10 H9.5 D0.5")
    {'V': 1.0, 'S': 1.0, 'O': 10.0, 'H': 10.0}
    """
    counts: dict[str, float] = {}
    for symbol, number in re.findall(r"([A-Z][a-z]?)(\d*\.?\d*)", formula):
        if symbol not in {*ELEMENT_SYMBOLS, "D"}:
            return {}
        name = "H" if symbol == "D" else symbol
        counts[name] = counts.get(name, 0.0) + (float(number) if number.strip(".") else 1.0)
    return counts


def formula_elements(formula: str) -> frozenset[str]:
    """Elements that a formula names, with hydrogen, which files may forget."""
    found = formula_counts(formula)
    return frozenset(found) | {"H"} if found else frozenset()


def element(kind: str, label: str, allowed: frozenset[str]) -> str | None:
    """Element by the type symbol, else by the label: `CA1` is carbon where the formula has no calcium.

    Minerals' files call the oxygen of water ``Wat``. A type symbol that is an element counts even where the
    formula forgets it.
    """
    for word in (kind, label):
        letters = _letters(word)
        if letters.lower() == "wat" and "W" not in allowed:
            return "O"
        for size in (2, 1):
            symbol = letters[:size].capitalize()
            symbol = "H" if symbol == "D" else symbol
            if symbol in ELEMENT_SYMBOLS and (not allowed or symbol in allowed):
                return symbol
        if word is kind and letters.capitalize() in ELEMENT_SYMBOLS:
            return letters.capitalize()
    return None


def _letters(word: str) -> str:
    return (re.match(r"[A-Za-z]+", word) or [""])[0]


def _is_hydrogen(kind: str, label: str) -> bool:
    return _letters(kind or label).upper() in ("H", "D")
