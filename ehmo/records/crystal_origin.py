"""Where the atoms of a fragment sit in the crystal it was cut from."""

from __future__ import annotations

from dataclasses import dataclass

from ehmo.records.arrays import IntArray, frozen_ints


@dataclass(frozen=True, slots=True, eq=False)
class CrystalOrigin:
    """Labels of the file, copies in the cell, and the symmetry a molecule keeps in its crystal.

    Attributes
    ----------
    labels : tuple of str
        Label of each atom in the file, as found (hostile text: show it escaped).
    multiplicity : int
        How many copies of the molecule the unit cell holds.
    permutations : (n_operations, n_atoms) ndarray of int
        Which atom each symmetry operation of the molecule's site puts in the place of each atom; the identity is
        among them.
    """

    labels: tuple[str, ...]
    multiplicity: int
    permutations: IntArray

    def __post_init__(self) -> None:
        shape = (None, len(self.labels))
        object.__setattr__(self, "permutations", frozen_ints(self.permutations, shape, "permutations"))

    def equivalent_bonds(self, first: int, second: int) -> int:
        """How many bonds of the molecule symmetry makes of one, itself included."""
        pairs = {tuple(sorted(pair)) for pair in self.permutations[:, [first, second]].tolist()}
        return len(pairs)

    def bond_multiplicity(self, first: int, second: int) -> int:
        """How many bonds of the unit cell symmetry makes of one, itself included."""
        return self.multiplicity * self.equivalent_bonds(first, second)
