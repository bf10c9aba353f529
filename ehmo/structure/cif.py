"""CIF through gemmi: sites and symmetry checked, the cell expanded, handed on as ASE atoms."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

import numpy as np

from ehmo.errors import EhmoError, InputError
from ehmo.records.arrays import FloatArray
from ehmo.records.fragment import hill_formula
from ehmo.structure.cif_cell import ordered_cell
from ehmo.structure.cif_sites import formula_counts, read_sites, site_prefix
from ehmo.structure.cif_symmetry import item, item_text, symmetry_operations
from ehmo.structure.files import shown
from ehmo.structure.periodic import PeriodicCell, StatedFacts

if TYPE_CHECKING:
    import gemmi

_CELL_TAGS = ("length_a", "length_b", "length_c", "angle_alpha", "angle_beta", "angle_gamma")
_TITLE_TAGS: Final = ("_chemical_name_common", "_chemical_name_systematic", "_chemical_name_mineral")
_MASK_TAGS: Final = ("_platon_squeeze_void_nr", "_smtbx_masks_void_nr", "_platon_squeeze_details")


def cif_cells(text: str, place: str, max_atoms: int) -> tuple[PeriodicCell, ...]:
    """Ordered cell of every data block with atoms.

    A faulty block is left out and named in the notes of the others, if there are any.

    Raises
    ------
    InputError
        If the text is no CIF, or no block can be used.
    LimitError
        If a cell holds more than `max_atoms` atoms.
    """
    import gemmi

    try:
        document = gemmi.cif.read_string(text)
    except (ValueError, RuntimeError) as error:
        raise InputError(f"no valid CIF ({shown(error)})", place=place, mend="correct that line") from error
    blocks = [block for block in document if site_prefix(block)]
    if not blocks:
        raise InputError(
            "no atom sites with fractional coordinates", place=place, mend="give a CIF of a crystal structure"
        )
    cells: list[PeriodicCell] = []
    faults: list[EhmoError] = []
    for block in blocks:
        where = f"{place}, block {shown(block.name, 30)}" if len(blocks) > 1 else place
        try:
            cells.append(_cell(block, where, max_atoms, [f"Block left out: {fault}." for fault in faults]))
        except EhmoError as fault:
            faults.append(fault)
    if not cells:
        raise faults[0]
    return tuple(cells)


def _cell(block: gemmi.cif.Block, place: str, max_atoms: int, notes: list[str]) -> PeriodicCell:
    lattice = _lattice(block, place)
    sites = read_sites(block, place, notes, max_atoms)
    rotations, translations = symmetry_operations(block, place, notes)
    title = next((value for tag in _TITLE_TAGS if (value := item_text(block, tag))), block.name)
    riding = sum(site.symbol == "H" and site.calculated for site in sites)
    if riding:
        notes.append(f"Calculated (riding) hydrogen positions: {riding}.")
    return ordered_cell(sites, rotations, translations, lattice, _facts(block), place, title.strip(), notes, max_atoms)


def _facts(block: gemmi.cif.Block) -> StatedFacts:
    import gemmi

    units = gemmi.cif.as_number(item(block, "_cell_formula_units_Z") or "?")
    return StatedFacts(
        formula=formula_counts(item_text(block, "_chemical_formula_sum")),
        formula_units=int(units) if np.isfinite(units) and 1 <= units < 1e4 and units == int(units) else None,
        moieties=_moieties(item_text(block, "_chemical_formula_moiety")),
        deposited=True,
        masked=any(block.find_values(tag) or block.find_value(tag) for tag in _MASK_TAGS),
    )


def _moieties(text: str) -> dict[str, int]:
    """Charged parts of a moiety formula.

    Examples
    --------
    >>> _moieties("C10 H20 N4 O V 2+, 2(Cl O4 -), H2 O")
    {'C10H20N4OV': 2, 'ClO4': -1}
    """
    found: dict[str, int] = {}
    for part in text.split(","):
        match = re.fullmatch(r"\s*\d*\.?\d*\s*\(?([A-Za-z0-9. ]*?)\s+(\d*)([+-])\s*\)?\s*", part)
        counts = formula_counts(match[1]) if match else {}
        if match and counts and all(n == int(n) and n < 1000 for n in counts.values()):
            symbols = tuple(symbol for symbol, n in counts.items() for _ in range(int(n)))
            found[hill_formula(symbols)] = int(match[2] or 1) * (1 if match[3] == "+" else -1)
    return found


def _lattice(block: gemmi.cif.Block, place: str) -> FloatArray:
    import gemmi

    numbers = [gemmi.cif.as_number(item(block, f"_cell_{tag}") or "?") for tag in _CELL_TAGS]
    usable = np.isfinite(numbers).all() and min(numbers[:3]) > 0 and all(5 < a < 175 for a in numbers[3:])
    if not usable or max(numbers) > 1e4:
        raise InputError("no usable unit cell", place=place, mend="give the six _cell_length_ and _cell_angle_ items")
    return np.array(gemmi.UnitCell(*numbers).orth.mat.tolist()).T
