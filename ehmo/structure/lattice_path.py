"""Paths through the Brillouin zone, from the lattice paths of ASE."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray

MAX_PATH_POINTS = 5000
"""k-points allowed along a path."""


@dataclass(frozen=True, slots=True, eq=False)
class LatticePath:
    """k-points along lines between special points.

    Attributes
    ----------
    path : str
        Names of the special points; a comma stands for a jump.
    points : (n_k, 3) ndarray
        Fractional k-points.
    distances : (n_k,) ndarray
        Along the path, without the jumps [1/angstrom].
    labels : tuple of (int, str)
        Number of the k-point and name of each special point.
    """

    path: str
    points: FloatArray
    distances: FloatArray
    labels: tuple[tuple[int, str], ...]


def lattice_path(cell_A: FloatArray, path: str, n_points: int) -> LatticePath:
    """Path by the names of special points, or the standard one of the lattice.

    Parameters
    ----------
    cell_A : (3, 3) ndarray
        Cell vectors as rows [angstrom].
    path : str
        Such as "GXMG", or "auto".
    n_points : int
        k-points on the whole path, special points included.

    Returns
    -------
    lines : LatticePath

    Raises
    ------
    InputError
        If the lattice has no such special points, or the number of points is out of range.

    References
    ----------
    .. [1] setyawan-2010: W. Setyawan, S. Curtarolo, Comput. Mater. Sci. 49, 299 (2010): special points and paths, as
       ASE has them.
    """
    from ase.cell import Cell

    if not 2 <= n_points <= MAX_PATH_POINTS:
        raise InputError(f"{n_points} points make no path", mend=f"give a number from 2 to {MAX_PATH_POINTS}")
    if not path.strip():
        raise InputError("the path is empty", mend="name special points of the lattice such as GXMG, or auto")
    try:
        band_path = Cell(cell_A).bandpath(None if path == "auto" else path, npoints=n_points)
        distances, places, _ = band_path.get_linear_kpoint_axis()
    except Exception as fault:  # ASE raises errors of many kinds over unusual cells and paths
        raise InputError(
            f"no path {path!r} through the Brillouin zone of this cell ({fault})",
            mend="name special points of the lattice such as GXMG, or leave the path out",
        ) from fault
    special = band_path.special_points
    labels = []
    for k, point in enumerate(band_path.kpts):
        name = next((n for n, s in special.items() if np.abs(s - point).max() < 1e-8), "")
        if name and any(abs(distances[k] - place) < 1e-9 for place in places):
            labels.append((k, name))
    return LatticePath(band_path.path, np.asarray(band_path.kpts), np.asarray(distances), tuple(labels))
