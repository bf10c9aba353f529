"""Point groups and how the atoms of a fragment follow them."""

from __future__ import annotations

from dataclasses import dataclass

from ehmo.records.arrays import FloatArray, IntArray, frozen_floats, frozen_ints


@dataclass(frozen=True, slots=True, eq=False)
class PointGroup:
    """A point group with its operations and real character table.

    Complex-conjugate pairs of one-dimensional representations are joined into one real representation E. The
    linear groups are held by the operations of a finite subgroup that tells sigma to phi apart.

    Attributes
    ----------
    name : str
        Schoenflies symbol, such as ``C4v`` or ``D∞h``.
    operations : (n_ops, 3, 3) ndarray
        Orthogonal matrices in the group's own axes, the identity first.
    class_labels : tuple of str
        Such as ``2C4``.
    class_of : (n_ops,) ndarray of int
        Class of each operation.
    irreps : tuple of str
        Mulliken symbols, such as ``b2`` (lower case: orbitals; terms use capitals).
    dimensions : (n_irreps,) ndarray of int
    characters : (n_irreps, n_classes) ndarray
    setting : str
        Where the axes and planes lie, in words.
    """

    name: str
    operations: FloatArray
    class_labels: tuple[str, ...]
    class_of: IntArray
    irreps: tuple[str, ...]
    dimensions: IntArray
    characters: FloatArray
    setting: str

    def __post_init__(self) -> None:
        n_irreps, n_classes, n_ops = len(self.irreps), len(self.class_labels), len(self.operations)
        put = object.__setattr__
        put(self, "operations", frozen_floats(self.operations, (n_ops, 3, 3), "operations"))
        put(self, "class_of", frozen_ints(self.class_of, (n_ops,), "class_of"))
        put(self, "dimensions", frozen_ints(self.dimensions, (n_irreps,), "dimensions"))
        put(self, "characters", frozen_floats(self.characters, (n_irreps, n_classes), "characters"))


@dataclass(frozen=True, slots=True, eq=False)
class Symmetry:
    """Symmetry of some atoms of a fragment, exact or within a tolerance.

    Attributes
    ----------
    group : PointGroup
    atoms : (n_atoms,) ndarray of int
        Atoms of the fragment that were judged.
    axes : (3, 3) ndarray
        Rows are the group's x, y, z in the fragment's coordinates.
    origin_A : (3,) ndarray
        Fixed point [angstrom].
    permutations : (n_ops, n_atoms) ndarray of int
        Place in `atoms` that each atom goes to under each operation.
    symmetrised_A : (n_atoms, 3) ndarray
        Nearest positions that have the symmetry exactly [angstrom].
    rms_A : float
        Root mean square distance of the atoms from them [angstrom].
    continuous_measure : float
        Continuous symmetry measure, 0 (exact) to 100.
    """

    group: PointGroup
    atoms: IntArray
    axes: FloatArray
    origin_A: FloatArray
    permutations: IntArray
    symmetrised_A: FloatArray
    rms_A: float
    continuous_measure: float

    def __post_init__(self) -> None:
        n_atoms, n_ops = len(self.atoms), len(self.group.operations)
        put = object.__setattr__
        put(self, "atoms", frozen_ints(self.atoms, (n_atoms,), "atoms"))
        put(self, "axes", frozen_floats(self.axes, (3, 3), "axes"))
        put(self, "origin_A", frozen_floats(self.origin_A, (3,), "origin_A"))
        put(self, "permutations", frozen_ints(self.permutations, (n_ops, n_atoms), "permutations"))
        put(self, "symmetrised_A", frozen_floats(self.symmetrised_A, (n_atoms, 3), "symmetrised_A"))
