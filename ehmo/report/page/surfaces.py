"""Isosurfaces of orbitals, and their compact form in a page."""

from __future__ import annotations

import base64
import zlib
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.grid import Grid

STEP_A = 0.01
"""Vertices in a page are rounded to this [angstrom]."""


@dataclass(frozen=True, slots=True, eq=False)
class Surface:
    """A closed surface of triangles.

    Attributes
    ----------
    vertices_A : (n, 3) ndarray
        [angstrom]
    faces : (m, 3) ndarray of int
        Corners of each triangle, counterclockwise seen from outside.
    """

    vertices_A: FloatArray
    faces: IntArray

    def normals(self) -> FloatArray:
        """(n, 3) Unit normals at the vertices, outwards."""
        corners = self.vertices_A[self.faces]
        across = np.cross(corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0])
        normals = np.zeros_like(self.vertices_A)
        for k in range(3):
            np.add.at(normals, self.faces[:, k], across)
        normals /= np.maximum(np.linalg.norm(normals, axis=1, keepdims=True), 1e-12)
        return normals


def isosurface(values: FloatArray, grid: Grid, level: float) -> Surface | None:
    """Surface on which a function has one value, by marching cubes.

    Parameters
    ----------
    values : (nx, ny, nz) ndarray
        Function on the grid.
    grid : Grid
    level : float
        Positive: the surface holds the region above it. Negative: the region below it.

    Returns
    -------
    surface : Surface or None
        None where the function does not reach the level.

    References
    ----------
    .. [1] lorensen-1987: W. E. Lorensen, H. E. Cline, ACM SIGGRAPH Comput. Graph. 21, 163 (1987).
    """
    inside = values * np.sign(level) >= abs(level)
    if not inside.any():
        return None
    part = tuple(_range_of(inside, axis) for axis in range(3))
    from skimage.measure import marching_cubes

    vertices, faces, _, _ = marching_cubes(values[part] * np.sign(level), abs(level))
    start = grid.origin_A + grid.spacing_A * [bounds.start for bounds in part]
    # Triangles come out with the inside in front: turn them.
    return Surface(start + vertices * grid.spacing_A, faces[:, ::-1].astype(np.intp))


def _range_of(inside: NDArray[np.bool_], axis: int) -> slice:
    """Range along one axis that holds a region with one more point on each side."""
    others = tuple(k for k in range(3) if k != axis)
    found = np.flatnonzero(inside.any(axis=others))
    return slice(max(int(found[0]) - 1, 0), min(int(found[-1]) + 2, inside.shape[axis]))


def packed(surfaces: Sequence[Surface | None], axes: FloatArray, origin_A: FloatArray) -> str:
    """Surfaces as one short text: differences of neighbours, deflated, in base 64.

    Parameters
    ----------
    surfaces : sequence of Surface or None
    axes : (3, 3) ndarray
        Rows are the axes of the picture.
    origin_A : (3,) ndarray
        Its origin [angstrom].

    Returns
    -------
    text : str
        For each surface two 32-bit counts n, m, then 3 n coordinates in steps of `STEP_A` and 3 m corners, both as
        16-bit numbers, low bytes before high ones. Coordinates are differences along x, y and z in turn; a corner is
        the highest corner so far, plus one, minus itself.
    """
    parts: list[bytes] = []
    for surface in surfaces:
        if surface is None:
            parts.append(np.zeros(2, dtype="<u4").tobytes())
            continue
        steps = np.round((surface.vertices_A - origin_A) @ axes.T / STEP_A).astype(np.int64).T
        changes = np.diff(steps, axis=1, prepend=0).ravel()
        corners = surface.faces.ravel()
        highest = np.maximum.accumulate(np.concatenate([[-1], corners]))[:-1]
        backwards = highest + 1 - corners
        parts.append(np.array([len(surface.vertices_A), len(surface.faces)], dtype="<u4").tobytes())
        parts += [_split_bytes(changes), _split_bytes(backwards)]
    return base64.b64encode(zlib.compress(b"".join(parts), 6)).decode("ascii")


def _split_bytes(numbers: IntArray) -> bytes:
    """16-bit numbers, all low bytes before all high ones; small differences then compress well."""
    # Zigzag, so that small negative numbers have an empty high byte too.
    unsigned = ((numbers << 1) ^ (numbers >> 63)).astype("<u2")
    raw = unsigned.view(np.uint8).reshape(-1, 2)
    return raw[:, 0].tobytes() + raw[:, 1].tobytes()
