"""Symmetry-adapted combinations of the functions of some atoms."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache, lru_cache
from typing import Final

import numpy as np

from ehmo.analysis.symmetry.groups import point_group
from ehmo.harmonics import harmonic_rotations
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.symmetry import PointGroup, Symmetry

_KEPT_SETS: Final = 64


@dataclass(frozen=True, slots=True, eq=False)
class AdaptedFunctions:
    """Orthonormal combinations of orthonormal functions, each of one irrep.

    Attributes
    ----------
    combinations : (n, n) ndarray
        Columns are combinations of the functions turned into the axes of the group, atom by atom.
    irrep_of : (n,) ndarray of int
        Irrep of each column.
    membership : (n_irreps, n) ndarray
        1 where a column belongs to an irrep.
    """

    combinations: FloatArray
    irrep_of: IntArray
    membership: FloatArray


def functions_of_atoms(basis: Basis, atoms: IntArray) -> IntArray:
    """Places in the basis of the functions of some atoms, in the order of the atoms.

    Parameters
    ----------
    basis : Basis
    atoms : (n_atoms,) ndarray of int

    Returns
    -------
    rows : (n,) ndarray of int
    """
    return np.concatenate([np.arange(basis.atom_start[atom], basis.atom_start[atom + 1]) for atom in atoms])


def adapted_functions(symmetry: Symmetry, basis: Basis) -> AdaptedFunctions:
    """Symmetry-adapted combinations of the functions of the atoms of a symmetry.

    Parameters
    ----------
    symmetry : Symmetry
    basis : Basis
        Functions of the fragment.

    Returns
    -------
    adapted : AdaptedFunctions

    Raises
    ------
    ValueError
        If the symmetry exchanges atoms that carry different functions.
    """
    layouts = tuple(basis.layouts[atom] for atom in symmetry.atoms)
    return _adapted(symmetry.group.name, symmetry.permutations.tobytes(), layouts)


@lru_cache(maxsize=_KEPT_SETS)
def _adapted(name: str, permutations: bytes, layouts: tuple[tuple[int, ...], ...]) -> AdaptedFunctions:
    """Orbit by orbit of the atoms and shell by shell: the operations mix nothing else."""
    group = point_group(name)
    images = np.frombuffer(permutations, dtype=np.intp).reshape(len(group), len(layouts))
    offsets = np.concatenate([[0], np.cumsum([sum(2 * l + 1 for l in layout) for layout in layouts])])
    combinations = np.zeros((offsets[-1], offsets[-1]))
    irrep_of = np.empty(offsets[-1], dtype=np.intp)
    for orbit in _orbits(images):
        layout = layouts[orbit[0]]
        if any(layouts[atom] != layout for atom in orbit):
            raise ValueError("the symmetry exchanges atoms with different shells")
        places = np.searchsorted(orbit, images[:, orbit])
        start = offsets[orbit]
        for l in layout:
            rows = (start[:, None] + np.arange(2 * l + 1)).ravel()
            start = start + 2 * l + 1
            irreps, columns = _shell_combinations(name, places.tobytes(), len(orbit), l)
            combinations[np.ix_(rows, rows)] = columns
            irrep_of[rows] = irreps
    membership = (irrep_of == np.arange(len(group.irreps))[:, None]).astype(np.float64)
    for array in (combinations, irrep_of, membership):
        array.setflags(write=False)
    return AdaptedFunctions(combinations, irrep_of, membership)


def _orbits(images: IntArray) -> list[IntArray]:
    """Sets of atoms that the operations exchange, each ascending."""
    lowest = images.min(axis=0)
    return [np.flatnonzero(lowest == first) for first in np.unique(lowest)]


@lru_cache(maxsize=16 * _KEPT_SETS)
def _shell_combinations(name: str, places: bytes, n_atoms: int, l: int) -> tuple[IntArray, FloatArray]:
    """Irrep and coefficients of each combination of one shell on each atom of an orbit."""
    group = point_group(name)
    targets = np.frombuffer(places, dtype=np.intp).reshape(len(group), n_atoms)
    # With the number of the irrep as factor, the sum of all projectors has that number as eigenvalue.
    factors = np.arange(len(group.irreps)) @ group.projection_weights
    blocks = np.zeros((n_atoms, n_atoms, 2 * l + 1, 2 * l + 1))
    np.add.at(
        blocks, (targets, np.arange(n_atoms)), (factors[:, None, None] * shell_operations(group.name, l))[:, None]
    )
    numbers, columns = np.linalg.eigh(blocks.transpose(0, 2, 1, 3).reshape(n_atoms * (2 * l + 1), -1))
    return np.round(numbers).astype(np.intp), columns


@cache
def shell_operations(name: str, l: int) -> FloatArray:
    """Matrices of the operations of a group on the functions of one shell at the fixed point.

    Parameters
    ----------
    name : str
        Schoenflies symbol.
    l : int

    Returns
    -------
    matrices : (n_ops, 2*l + 1, 2*l + 1) ndarray
        In the order and axes of the operations of `point_group`; column m is the image of Y_lm.
    """
    matrices = harmonic_rotations(point_group(name).operations, l)
    matrices.setflags(write=False)
    return matrices


def shell_irreps(group: PointGroup, l: int) -> dict[str, int]:
    """How often each irrep occurs among the functions of a shell at the fixed point, such as the metal's d shell.

    Parameters
    ----------
    group : PointGroup
    l : int

    Returns
    -------
    counts : dict of str to int
        Only irreps that occur.
    """
    return _counts(group, shell_operations(group.name, l).trace(axis1=1, axis2=2))


def donor_irreps(symmetry: Symmetry, donors: IntArray) -> tuple[dict[str, int], dict[str, int]]:
    """How often each irrep occurs among the sigma and among the pi functions of donors.

    Parameters
    ----------
    symmetry : Symmetry
    donors : (n_donors,) ndarray of int
        Places in `symmetry.atoms`; whole sets that the operations exchange. One sigma function along and two pi
        functions across the line to the fixed point are counted for each.

    Returns
    -------
    sigma, pi : dict of str to int
        Only irreps that occur.

    Raises
    ------
    ValueError
        If an operation moves a donor out of the set.
    """
    images = symmetry.permutations[:, donors]
    if not np.isin(images, donors).all():
        raise ValueError("the donors are not a whole set under the symmetry")
    unmoved = (images == donors).sum(axis=1)
    # An unmoved donor keeps its line, so the part across it has the trace of the operation less 1.
    across = symmetry.group.operations.trace(axis1=1, axis2=2) - 1
    return _counts(symmetry.group, unmoved.astype(np.float64)), _counts(symmetry.group, unmoved * across)


def _counts(group: PointGroup, characters: FloatArray) -> dict[str, int]:
    return {
        irrep: int(count) for irrep, count in zip(group.irreps, group.multiplicities(characters), strict=True) if count
    }
