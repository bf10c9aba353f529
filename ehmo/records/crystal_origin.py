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

    def equivalent_bonds(self, metal: int, donor: int) -> int:
        """How many bonds of the molecule symmetry makes of one, itself included."""
        return len(self._images(metal, donor))

    def bonds_per_metal(self, metal: int, donor: int) -> int:
        """How many of the equivalent bonds are at the same metal."""
        return sum(image == metal for image, _ in self._images(metal, donor))

    def equivalent_atoms(self, atom: int) -> list[int]:
        """Atoms of the molecule that symmetry makes of one, itself included, in order."""
        return sorted({int(other) for other in self.permutations[:, atom]})

    def first_equivalent(self, atom: int) -> int:
        """Lowest index of the atoms of the molecule that symmetry makes of one."""
        return int(self.permutations[:, atom].min())

    def is_first(self, metal: int, donor: int) -> bool:
        """Whether no equivalent bond of the molecule has a lower metal or, at the same one, a lower donor."""
        return min(self._images(metal, donor)) == (metal, donor)

    def bond_multiplicity(self, metal: int, donor: int) -> int:
        """How many bonds of the unit cell symmetry makes of one, itself included."""
        return self.multiplicity * self.equivalent_bonds(metal, donor)

    def _images(self, metal: int, donor: int) -> set[tuple[int, int]]:
        return {(int(one), int(other)) for one, other in self.permutations[:, [metal, donor]]}
