"""A fragment: atoms, charge and unpaired electrons."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ehmo.conventions import ELEMENT_SYMBOLS, atom_label
from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray, frozen_floats
from ehmo.records.crystal_origin import CrystalOrigin


@dataclass(frozen=True, slots=True, eq=False)
class Fragment:
    """Atoms cut from a file or a crystal, as one molecule or ion.

    Attributes
    ----------
    symbols : tuple of str
        Chemical symbol of each atom.
    positions_A : (n_atoms, 3) ndarray
        Cartesian coordinates, read-only [angstrom].
    charge : int or None
        Total charge; None where the source does not say.
    unpaired_electrons : int or None
        Number of unpaired electrons; None where the source does not say.
    title : str
        Title or comment of the source, as found (hostile text: show it escaped).
    source : str
        Where the fragment comes from, as people name it: file and frame or block.
    notes : tuple of str
        What the reader did to the atoms, one sentence each.
    doubts : tuple of str
        What the reader leaves open that may change the result, one sentence each.
    charge_reason : str
        Where a charge comes from that the source does not state itself, such as the balance of a crystal.
    crystal : CrystalOrigin or None
        Labels, copies and symmetry in the crystal the fragment was cut from.
    """

    symbols: tuple[str, ...]
    positions_A: FloatArray
    charge: int | None = None
    unpaired_electrons: int | None = None
    title: str = ""
    source: str = ""
    notes: tuple[str, ...] = ()
    doubts: tuple[str, ...] = ()
    charge_reason: str = ""
    crystal: CrystalOrigin | None = None

    def __post_init__(self) -> None:
        place = self.source or "fragment"
        object.__setattr__(self, "symbols", tuple(self.symbols))
        if not self.symbols:
            raise InputError("there are no atoms", place=place, mend="give at least one metal and its donors")
        for index, symbol in enumerate(self.symbols):
            if symbol not in ELEMENT_SYMBOLS:
                raise InputError(
                    f"unknown element {symbol!r} at atom {index + 1}",
                    place=place,
                    mend="use a chemical symbol such as V or O",
                )
        try:
            positions = frozen_floats(self.positions_A, (len(self.symbols), 3), "positions_A")
        except (TypeError, ValueError) as fault:
            raise InputError(
                f"the coordinates do not fit {len(self.symbols)} atoms ({fault})",
                place=place,
                mend="give three numbers for each atom",
            ) from None
        bad = np.flatnonzero(~np.isfinite(positions).all(axis=1))
        if bad.size:
            labels = ", ".join(self.labels[i] for i in bad[:5])
            raise InputError(
                f"non-finite coordinates at {labels}", place=place, mend="give every coordinate as a number"
            )
        object.__setattr__(self, "positions_A", positions)

    def __len__(self) -> int:
        return len(self.symbols)

    @property
    def labels(self) -> tuple[str, ...]:
        """Label of each atom, such as ``V1``."""
        return tuple(atom_label(symbol, index) for index, symbol in enumerate(self.symbols))

    @property
    def formula(self) -> str:
        """Formula in Hill order."""
        return hill_formula(self.symbols)

    def with_electrons(self, charge: int, unpaired_electrons: int) -> Fragment:
        """Same atoms with charge and unpaired electrons set."""
        return replace(self, charge=charge, unpaired_electrons=unpaired_electrons)


def hill_formula(symbols: tuple[str, ...]) -> str:
    """Formula in Hill order: C, H, then the rest by the alphabet; the alphabet alone without carbon.

    Examples
    --------
    >>> hill_formula(("O", "V", "O", "H", "H"))
    'H2O2V'
    """
    counts = {symbol: symbols.count(symbol) for symbol in sorted(set(symbols))}
    first = ["C", "H"] if "C" in counts else []
    order = [s for s in first if s in counts] + [s for s in counts if s not in first]
    return "".join(s + (str(counts[s]) if counts[s] > 1 else "") for s in order)
