"""Point groups as the labels of terms need them.

Orbitals carry small Mulliken symbols, terms capitals. The finite groups that hold C∞v and D∞h tell |m| up to 8
apart: as far as M_L goes in d shells and in f1 to f3.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from ehmo.analysis.symmetry.labels import term_symbol
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.symmetry import PointGroup


@dataclass(frozen=True, slots=True, eq=False)
class LabelGroup:
    """Operations with the character of each, irrep by irrep.

    Attributes
    ----------
    name : str
    operations : (n_ops, 3, 3) ndarray
    irreps : tuple of str
        Small letters.
    dimensions : (n_irreps,) ndarray of int
    characters : (n_irreps, n_ops) ndarray
    norms : (n_irreps,) ndarray
        Mean squared character: 1, or 2 for two complex representations joined into one.
    """

    name: str
    operations: FloatArray
    irreps: tuple[str, ...]
    dimensions: IntArray
    characters: FloatArray
    norms: FloatArray

    @property
    def term_irreps(self) -> tuple[str, ...]:
        """Symbols of the irreps in capitals."""
        return tuple(term_symbol(irrep) for irrep in self.irreps)

    def reduce(self, characters: FloatArray) -> IntArray:
        """How often each irrep occurs in a representation.

        Parameters
        ----------
        characters : (..., n_ops) ndarray

        Returns
        -------
        counts : (..., n_irreps) ndarray of int
        """
        counts = characters @ self.characters.T / len(self.operations) / self.norms
        return np.rint(counts).astype(np.intp)

    def powers(self, highest: int) -> IntArray:
        """(highest, n_ops) places of g, g^2, .. of each operation g."""
        flat = self.operations.reshape(-1, 9)
        powered = self.operations
        places = []
        for _ in range(highest):
            # Two operations of a group have a trace product of 3 only if they are the same.
            places.append((powered.reshape(-1, 9) @ flat.T).argmax(axis=1))
            powered = powered @ self.operations
        return np.array(places)


@lru_cache(maxsize=128)
def label_group(group: PointGroup | None) -> LabelGroup:
    """Group in the form that labels terms.

    Parameters
    ----------
    group : PointGroup or None
        None stands for C1.

    Returns
    -------
    labels : LabelGroup
    """
    if group is None:
        one = np.ones((1, 1))
        return LabelGroup("C1", np.eye(3)[None], ("a",), np.ones(1, dtype=np.intp), one, np.ones(1))
    characters = group.characters[:, group.class_of]
    return LabelGroup(
        group.name, group.operations, group.irreps, group.dimensions, characters, np.mean(characters**2, axis=1)
    )
