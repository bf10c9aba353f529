"""The parts of a metal shell that belong to each irrep."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from ehmo.analysis.symmetry.adapted import shell_operations
from ehmo.analysis.symmetry.groups import point_group
from ehmo.records.arrays import FloatArray
from ehmo.records.symmetry import PointGroup


def shell_parts(group: PointGroup, l: int) -> tuple[FloatArray, ...]:
    """Functions of a shell at the fixed point, irrep by irrep.

    Parameters
    ----------
    group : PointGroup
    l : int
        Angular momentum quantum number of the shell.

    Returns
    -------
    parts : tuple of (2*l + 1, n) ndarray
        Orthonormal columns in the axes of the group; together they span the shell.
    """
    return _parts(group.name, l)


def shell_part_irreps(group: PointGroup, l: int) -> tuple[str, ...]:
    """Irreps of the parts of `shell_parts`, in their order.

    Parameters
    ----------
    group : PointGroup
    l : int

    Returns
    -------
    irreps : tuple of str
    """
    return tuple(irrep for irrep, part in zip(group.irreps, _spaces(group.name, l), strict=True) if part.shape[1])


def _parts(name: str, l: int) -> tuple[FloatArray, ...]:
    return tuple(part for part in _spaces(name, l) if part.shape[1])


@lru_cache(maxsize=256)
def _spaces(name: str, l: int) -> tuple[FloatArray, ...]:
    """The part of each irrep of the table, empty ones included."""
    projectors = np.tensordot(point_group(name).projection_weights, shell_operations(name, l), axes=1)
    parts = []
    for projector in projectors:
        eigenvalues, vectors = np.linalg.eigh((projector + projector.T) / 2)
        part = vectors[:, eigenvalues > 0.5]
        part.setflags(write=False)
        parts.append(part)
    return tuple(parts)
