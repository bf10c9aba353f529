"""Symmetry operations of a CIF block, as arrays."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Final

import numpy as np

from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray
from ehmo.structure.files import shown

if TYPE_CHECKING:
    import gemmi

MAX_OPERATIONS: Final = 192
"""Operations of the largest space groups in a conventional cell (International Tables, Volume A; memory)."""

_OPERATION_TAGS = (
    "_space_group_symop_operation_xyz",
    "_symmetry_equiv_pos_as_xyz",
    "_space_group_symop.operation_xyz",
)
_CATEGORIES: Final = (
    "_space_group_symop",
    "_space_group",
    "_chemical_formula",
    "_chemical",
    "_atom_site",
    "_atom_type",
    "_symmetry",
    "_cell",
)
_NAME_TAGS = (
    "_space_group_name_Hall",
    "_symmetry_space_group_name_Hall",
    "_space_group_name_H-M_alt",
    "_symmetry_space_group_name_H-M",
    "_space_group_IT_number",
    "_symmetry_Int_Tables_number",
)


def dotted(tag: str) -> str:
    """Name of an item in the newer dictionaries, where a dot ends the category.

    Examples
    --------
    >>> dotted("_atom_site_fract_x"), dotted("_space_group_symop_operation_xyz")
    ('_atom_site.fract_x', '_space_group_symop.operation_xyz')
    """
    category = next((name for name in _CATEGORIES if tag.startswith(f"{name}_")), "")
    return f"{category}.{tag[len(category) + 1 :]}" if category else tag


def item(block: gemmi.cif.Block, tag: str) -> str | None:
    """Value of a CIF item as it stands, under its older or newer name."""
    value = block.find_value(tag)
    return block.find_value(dotted(tag)) if value is None else value


def item_text(block: gemmi.cif.Block, tag: str) -> str:
    """Text of a CIF item; empty where it is absent or null, also where a text field holds nothing but the null."""
    from gemmi import cif

    value = item(block, tag)
    text = "" if value is None or cif.is_null(value) else cif.as_string(value)
    return "" if text.strip() in ("?", ".") else text


def symmetry_operations(block: gemmi.cif.Block, place: str, notes: list[str]) -> tuple[FloatArray, FloatArray]:
    """Rotations and translations; listed operations win over names, whose settings are often unsaid.

    `notes` takes a sentence where operations come from a name, or do not fit it.

    Raises
    ------
    InputError
        If the block has no usable symmetry.
    """
    import gemmi

    for tag in _OPERATION_TAGS:
        column = block.find_values(tag)
        if column:
            try:
                operations = [gemmi.Op(column.str(k)) for k in range(len(column))]
            except (ValueError, RuntimeError) as error:
                raise InputError(
                    f"faulty symmetry operation ({shown(error)})", place=place, mend="correct it"
                ) from error
            if len(operations) > MAX_OPERATIONS:
                raise InputError(
                    f"{len(operations)} symmetry operations, no space group has more than {MAX_OPERATIONS}",
                    place=place,
                    mend="list each operation once",
                )
            _compare_with_name(block, len(operations), notes)
            return _as_arrays(operations)
    named = _named_group(block)
    if named is not None:
        tag, name, group = named
        if name.replace(" ", "") not in ("P1", "1"):
            what = "number" if name.isdigit() else "symbol"
            setting = "" if "Hall" in tag else ", in its standard setting" if what == "number" else ""
            notes.append(f"Symmetry operations from the space-group {what} {shown(name, 20)}{setting}.")
        return _as_arrays(list(group))
    raise InputError("no symmetry operations and no known space group", place=place, mend="list the operations, or P 1")


def _named_group(block: gemmi.cif.Block) -> tuple[str, str, gemmi.GroupOps] | None:
    """Tag, name and operations of the first symbol or number that is known."""
    for tag in _NAME_TAGS:
        name = re.sub(r"[()]", "", item_text(block, tag)).strip()
        group = _space_group(name, "Hall" in tag)
        if group is not None:
            return tag, name, group
    return None


def _compare_with_name(block: gemmi.cif.Block, listed: int, notes: list[str]) -> None:
    named = _named_group(block)
    if named is not None and len(list(named[2])) != listed:
        notes.append(
            f"The file lists {listed} symmetry operations, {shown(named[1], 20)} has {len(list(named[2]))}: "
            "the listed ones were used."
        )


def _space_group(name: str, hall: bool) -> gemmi.GroupOps | None:
    import gemmi

    if not name:
        return None
    if hall:
        try:
            return gemmi.symops_from_hall(name)
        except (ValueError, RuntimeError):
            return None
    if name.isascii() and name.isdigit():
        found = gemmi.find_spacegroup_by_number(int(name)) if len(name) <= 3 else None
    else:
        found = gemmi.find_spacegroup_by_name(name)
    return found.operations() if found is not None else None


def _as_arrays(operations: list[gemmi.Op]) -> tuple[FloatArray, FloatArray]:
    """Arrays of the operations with the identity first."""
    rotations = np.array([operation.rot for operation in operations]) / 24.0
    translations = np.array([operation.tran for operation in operations]) / 24.0
    offset = np.abs(rotations - np.eye(3)).sum(axis=(1, 2)) + np.abs(translations % 1.0).sum(axis=1)
    order = np.argsort(offset > 1e-9, kind="stable")
    if offset[order[0]] > 1e-9:
        return np.vstack([np.eye(3)[None], rotations]), np.vstack([np.zeros((1, 3)), translations])
    return rotations[order], translations[order]
