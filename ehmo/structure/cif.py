"""CIF through gemmi: sites and symmetry checked, the cell expanded, handed on as ASE atoms."""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Final

import numpy as np

from ehmo.conventions import ELEMENT_SYMBOLS
from ehmo.errors import InputError, LimitError
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.fragment import Fragment
from ehmo.structure.cif_symmetry import item_text, symmetry_operations
from ehmo.structure.files import shown
from ehmo.structure.periodic import PeriodicCell, molecules_with_metals

if TYPE_CHECKING:
    import gemmi

SAME_SITE_A: Final = 0.1
"""Images of a site closer than this are one atom on a special position [angstrom]."""

_SITE_TAGS = (
    "fract_x",
    "fract_y",
    "fract_z",
    "?label",
    "?type_symbol",
    "?occupancy",
    "?disorder_group",
    "?calc_flag",
)
_CELL_TAGS = ("length_a", "length_b", "length_c", "angle_alpha", "angle_beta", "angle_gamma")


@dataclass(frozen=True, slots=True)
class Site:
    """One listed atom site: label, element, fractional coordinates."""

    label: str
    symbol: str
    fractional: tuple[float, float, float]


def cif_fragments(text: str, place: str, max_atoms: int) -> tuple[Fragment, ...]:
    """Molecules with metals, whole among the listed sites, of every data block with atoms.

    Raises
    ------
    InputError
        If the text is no CIF, or a block has faulty or disordered sites, or none of its molecules is whole.
    LimitError
        If the cell holds more than `max_atoms` atoms.
    """
    import gemmi

    try:
        document = gemmi.cif.read_string(text)
    except (ValueError, RuntimeError) as error:
        raise InputError(f"no valid CIF ({shown(error)})", place=place, mend="correct that line") from error
    blocks = [block for block in document if block.find_loop("_atom_site_fract_x")]
    if not blocks:
        raise InputError(
            "no atom sites with fractional coordinates", place=place, mend="give a CIF of a crystal structure"
        )
    several = len(blocks) > 1
    return tuple(
        fragment
        for block in blocks
        for fragment in _block_fragments(
            block, f"{place}, block {shown(block.name, 30)}" if several else place, max_atoms
        )
    )


def _block_fragments(block: gemmi.cif.Block, place: str, max_atoms: int) -> tuple[Fragment, ...]:
    notes: list[str] = []
    sites = _sites(block, place, notes)
    title = next(
        (value for tag in ("_chemical_name_common", "_chemical_name_systematic") if (value := item_text(block, tag))),
        block.name,
    )
    rotations, translations = symmetry_operations(block, place)
    images = _images(sites, rotations, translations, _lattice(block, place), place, max_atoms)
    return molecules_with_metals(images.cell(place, title, tuple(notes)))


def _sites(block: gemmi.cif.Block, place: str, notes: list[str]) -> list[Site]:
    """Sites that are atoms; every fault of the list is collected into one message."""
    allowed = _formula_elements(item_text(block, "_chemical_formula_sum"))
    sites: list[Site] = []
    faults: dict[str, list[str]] = {}
    skipped: list[str] = []
    for label, kind, xyz, occupancy, group, flag in _rows(block):
        if flag == "dum" or occupancy == 0.0:
            skipped.append(label)
            continue
        symbol = _element(kind, label, allowed)
        if symbol is None:
            faults.setdefault("unknown element", []).append(label)
        if not np.isfinite(xyz).all() or max(map(abs, xyz)) > 1e3:
            faults.setdefault("no usable coordinates", []).append(label)
        if not occupancy > 0.999 or group not in ("", ".", "?", "0"):
            faults.setdefault("partially occupied or disordered", []).append(label)
        if symbol is not None:
            sites.append(Site(label, symbol, xyz))
    if faults:
        parts = (
            f"{fault}: {', '.join(shown(label, 12) for label in labels[:6])}" + " ..." * (len(labels) > 6)
            for fault, labels in faults.items()
        )
        raise InputError("; ".join(parts), place=place, mend="keep one ordered alternative and name its elements")
    if not sites:
        raise InputError("no atoms among the sites", place=place, mend="give a CIF with atom sites")
    if skipped:
        notes.append(f"Dummy or empty sites left out: {', '.join(shown(label, 12) for label in skipped[:6])}.")
    return sites


def _rows(
    block: gemmi.cif.Block,
) -> Iterator[tuple[str, str, tuple[float, float, float], float, str, str]]:
    from gemmi import cif

    for number, row in enumerate(block.find("_atom_site_", list(_SITE_TAGS)), start=1):
        text = [cif.as_string(row[k]) if row.has(k) and not cif.is_null(row[k]) else "" for k in range(8)]
        x, y, z = (cif.as_number(row[k]) for k in range(3))
        occupancy = cif.as_number(row[5]) if text[5] else 1.0
        yield text[3] or f"site {number}", text[4], (x, y, z), occupancy, text[6], text[7]


def _formula_elements(formula: str) -> frozenset[str]:
    found = re.findall(r"([A-Z][a-z]?)[\d.]*(?=\s|$|[A-Z(])", formula)
    return frozenset("H" if symbol == "D" else symbol for symbol in found if symbol in {*ELEMENT_SYMBOLS, "D"})


def _element(kind: str, label: str, allowed: frozenset[str]) -> str | None:
    """Element by the type symbol, else by the label: `CA1` is carbon where the formula has no calcium.

    Minerals' files call the oxygen of water ``Wat``.
    """
    for word in (kind, label):
        letters = (re.match(r"[A-Za-z]+", word) or [""])[0]
        if letters.lower() == "wat" and "W" not in allowed:
            return "O"
        for size in (2, 1):
            symbol = letters[:size].capitalize()
            symbol = "H" if symbol == "D" else symbol
            if symbol in ELEMENT_SYMBOLS and (not allowed or symbol in allowed):
                return symbol
    return None


def _lattice(block: gemmi.cif.Block, place: str) -> FloatArray:
    import gemmi

    numbers = [gemmi.cif.as_number(block.find_value(f"_cell_{tag}") or "?") for tag in _CELL_TAGS]
    usable = np.isfinite(numbers).all() and min(numbers[:3]) > 0 and all(5 < a < 175 for a in numbers[3:])
    if not usable or max(numbers) > 1e4:
        raise InputError("no usable unit cell", place=place, mend="give the six _cell_length_ and _cell_angle_ items")
    return np.array(gemmi.UnitCell(*numbers).orth.mat.tolist()).T


@dataclass(slots=True)
class _Images:
    """Atoms of the full cell while sites are being expanded."""

    lattice: FloatArray
    symbols: list[str] = field(default_factory=list)
    labels: list[str] = field(default_factory=list)
    listed: list[bool] = field(default_factory=list)
    fractional: list[FloatArray] = field(default_factory=list)

    def add(self, site: Site, images: FloatArray) -> None:
        """Add the images of a site, the listed one first, each place once."""
        fresh = images[_first_of_each(images, self.lattice)]
        twin = self._twin(site.symbol, fresh[0])
        if twin is not None:
            # The site repeats an atom already made, as in files that list the whole cell and the symmetry.
            self.listed[twin], self.labels[twin], self.fractional[twin] = True, site.label, fresh[0]
            return
        self.symbols += [site.symbol] * len(fresh)
        self.labels += [site.label] * len(fresh)
        self.listed += [True] + [False] * (len(fresh) - 1)
        self.fractional += list(fresh)

    def _twin(self, symbol: str, fractional: FloatArray) -> int | None:
        same = [k for k, other in enumerate(self.symbols) if other == symbol]
        if not same:
            return None
        gaps = _distances(fractional[None], np.array([self.fractional[k] for k in same]), self.lattice)[0]
        nearest = int(gaps.argmin())
        return same[nearest] if gaps[nearest] < SAME_SITE_A else None

    def cell(self, place: str, title: str, notes: tuple[str, ...]) -> PeriodicCell:
        """Hand the cell on as ASE atoms."""
        from ase import Atoms

        atoms = Atoms(self.symbols, positions=np.array(self.fractional) @ self.lattice, cell=self.lattice, pbc=True)
        return PeriodicCell(atoms, np.array(self.listed), tuple(self.labels), place, title, notes)


def _images(
    sites: list[Site],
    rotations: FloatArray,
    translations: FloatArray,
    lattice: FloatArray,
    place: str,
    max_atoms: int,
) -> _Images:
    """Full cell: the listed atoms where the file puts them, their images anywhere in the lattice."""
    found = _Images(lattice)
    for site in sites:
        images = rotations @ np.array(site.fractional) + translations
        images[0] = site.fractional
        found.add(site, images)
        if len(found.symbols) > max_atoms:
            raise LimitError(
                f"the cell holds more than {max_atoms} atoms", place=place, mend="raise max_atoms (--max-atoms)"
            )
    return found


def _distances(a: FloatArray, b: FloatArray, lattice: FloatArray) -> FloatArray:
    gap = a[:, None, :] - b[None, :, :]
    return np.asarray(np.linalg.norm((gap - np.round(gap)) @ lattice, axis=2))


def _first_of_each(images: FloatArray, lattice: FloatArray) -> IntArray:
    """Pick the images that repeat no earlier one, lattice translations aside."""
    same = np.triu(_distances(images, images, lattice) < SAME_SITE_A, k=1)
    return np.flatnonzero(~same.any(axis=0))
