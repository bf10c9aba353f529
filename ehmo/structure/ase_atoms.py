"""From ASE atoms to fragments."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from ehmo.errors import InputError
from ehmo.records.fragment import Fragment
from ehmo.structure.electron_keys import StatedElectrons

if TYPE_CHECKING:
    from ase import Atoms

    from ehmo.records.crystal import CrystalContents


def fragments_of_atoms(
    atoms: Atoms, source: str, title: str, stated: StatedElectrons
) -> tuple[tuple[Fragment, ...], CrystalContents | None]:
    """Fragments of ASE atoms, and what their cell holds if it is periodic in three directions.

    Parameters
    ----------
    atoms : ase.Atoms
    source, title : str
    stated : StatedElectrons
        Charge and unpaired electrons of all the atoms.

    Returns
    -------
    fragments : tuple of Fragment
        The atoms as they stand, or the molecules with metals of a periodic cell, none if its metals are all in
        chains, layers or frameworks.
    contents : CrystalContents or None
        None unless the cell is periodic in three directions.

    Raises
    ------
    InputError
        If a coordinate is not finite, an element unknown, or the cell impossible.
    """
    if not np.isfinite(atoms.positions).all():
        bad = int(np.flatnonzero(~np.isfinite(atoms.positions).all(axis=1))[0])
        raise InputError(
            f"non-finite coordinates at atom {bad + 1}", place=source, mend="give every coordinate as a number"
        )
    if not atoms.pbc.all():
        whole = Fragment(
            tuple(atoms.get_chemical_symbols()),
            atoms.positions,
            stated.charge,
            stated.unpaired_electrons,
            title=title,
            source=source,
        )
        return (whole,), None
    contents = _contents(atoms, source, title)
    found = _molecules(contents)
    if len(found) != 1 or len(found[0]) < len(atoms):
        # The stated charge belongs to all the atoms, so it is no molecule's own.
        return found, contents
    one = found[0]
    whole = Fragment(one.symbols, one.positions_A, stated.charge, stated.unpaired_electrons, title, source, one.notes)
    return (whole,), contents


def _contents(atoms: Atoms, source: str, title: str) -> CrystalContents:
    from ehmo.structure.contents import contents_of_cell
    from ehmo.structure.periodic import PeriodicCell

    labels = tuple(f"{symbol}{k}" for k, symbol in enumerate(atoms.get_chemical_symbols(), start=1))
    if "X" in atoms.get_chemical_symbols():
        raise InputError("unknown element", place=source, mend="write chemical symbols such as V or O")
    return contents_of_cell(PeriodicCell(atoms, np.ones(len(atoms), bool), labels, source, title))


def _molecules(contents: CrystalContents) -> tuple[Fragment, ...]:
    from ehmo.structure.crystal import molecules_of

    return molecules_of(contents) if contents.molecules else ()
