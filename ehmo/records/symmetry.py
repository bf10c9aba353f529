"""Point groups and how the atoms of a fragment follow them."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np

from ehmo.records.arrays import FloatArray, IntArray, frozen_floats, frozen_ints


@dataclass(frozen=True, slots=True, eq=False)
class PointGroup:
    """A point group with its operations and real character table.

    Complex-conjugate pairs of one-dimensional representations are joined into one real representation E. The
    linear groups are held by the operations of a finite subgroup that tells |m| from 0 to 8 apart; its classes
    are those of the subgroup.

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
        Mulliken symbols, such as ``b2`` or ``σg+`` (lower case: orbitals; terms use capitals).
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
    by_operation: FloatArray = field(init=False)
    """(n_irreps, n_ops) Character of each operation."""
    projection_weights: FloatArray = field(init=False)
    """(n_irreps, n_ops) Factors p such that sum_R p(R) D(R) projects on the irrep, joined pairs included."""

    def __post_init__(self) -> None:
        n_irreps, n_classes, n_ops = len(self.irreps), len(self.class_labels), len(self.operations)
        put = object.__setattr__
        put(self, "operations", frozen_floats(self.operations, (n_ops, 3, 3), "operations"))
        put(self, "class_of", frozen_ints(self.class_of, (n_ops,), "class_of"))
        put(self, "dimensions", frozen_ints(self.dimensions, (n_irreps,), "dimensions"))
        put(self, "characters", frozen_floats(self.characters, (n_irreps, n_classes), "characters"))
        by_operation = self.characters[:, self.class_of]
        put(self, "by_operation", frozen_floats(by_operation, (n_irreps, n_ops), "by_operation"))
        # d / h, or half of it where E joins two representations: sum_R chi^2 is h, or 2 h.
        weights = by_operation * (self.dimensions / (by_operation**2).sum(axis=1))[:, None]
        put(self, "projection_weights", frozen_floats(weights, (n_irreps, n_ops), "projection_weights"))

    def __len__(self) -> int:
        return len(self.operations)

    @property
    def term_irreps(self) -> tuple[str, ...]:
        """Symbols of the irreps as they stand in terms: the first letter a capital, such as ``B2`` or ``Σg+``."""
        return tuple(irrep[:1].upper() + irrep[1:] for irrep in self.irreps)

    def multiplicities(self, characters: FloatArray) -> IntArray:
        """How often each irrep occurs in a representation.

        Parameters
        ----------
        characters : (..., n_ops) ndarray
            Trace of the representation under each operation.

        Returns
        -------
        counts : (..., n_irreps) ndarray of int
        """
        counts: IntArray = np.round(characters @ self.projection_weights.T / self.dimensions).astype(np.intp)
        return counts


@dataclass(frozen=True, slots=True, eq=False)
class Symmetry:
    """Symmetry of some atoms of a fragment, exact or within a tolerance.

    Distances and measure refer to the symmetrised positions in place: they are the nearest that the group allows
    with its axes at their best.

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
        Root mean square distance of the atoms from them, an atom at the fixed point not counted [angstrom].
    continuous_measure : float
        100 times the sum of squared distances from the symmetrised positions over that from the fixed point:
        0 is exact.
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


@dataclass(frozen=True, slots=True)
class ShapeMeasure:
    """Distance of a coordination sphere from an ideal polyhedron.

    Attributes
    ----------
    shape : str
        Name of the polyhedron, such as ``octahedron``.
    measure : float
        Continuous shape measure, 0 (ideal) to 100.
    """

    shape: str
    measure: float


@dataclass(frozen=True, slots=True, eq=False)
class OrbitalIrreps:
    """Irreps of the orbitals of a fragment, judged on the atoms of a `Symmetry`.

    Attributes
    ----------
    labels : tuple of str
        Irrep with the largest share, per orbital; empty where the orbital has next to nothing on those atoms.
    shares : (n_mo, n_irreps) ndarray
        Share of each irrep in the part of the orbital on those atoms; rows add up to 1. Orbitals of one
        degenerate set have the mean of the set.
    parts : (n_mo,) ndarray
        How much of each orbital lies on those atoms (Löwdin).
    """

    labels: tuple[str, ...]
    shares: FloatArray
    parts: FloatArray

    def __post_init__(self) -> None:
        n_mo = len(self.labels)
        object.__setattr__(self, "shares", frozen_floats(self.shares, (n_mo, None), "shares"))
        object.__setattr__(self, "parts", frozen_floats(self.parts, (n_mo,), "parts"))

    @property
    def label_shares(self) -> FloatArray:
        """(n_mo,) Share of the irrep that gives the label."""
        largest: FloatArray = self.shares.max(axis=1)
        return largest
