"""Small still pictures of surfaces, drawn without a plotting library."""

from __future__ import annotations

import base64
import struct
import zlib
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache, reduce

import numpy as np
from numpy.typing import NDArray

from ehmo.records.arrays import FloatArray
from ehmo.report.page.surfaces import Surface

_SAMPLES = 2  # per pixel along each side, for smooth edges
_SHADES = 14  # steps of brightness: fewer make smaller files
_LIGHT = np.array([-0.45, 0.55, 0.70])
_PX_PER_POINT = 0.95


@dataclass(frozen=True, slots=True, eq=False)
class Body:
    """A surface of one colour.

    Attributes
    ----------
    surface : Surface
    colour : str
        ``#rrggbb``.
    """

    surface: Surface
    colour: str


def view_from(direction: FloatArray, up: FloatArray) -> FloatArray:
    """Rows right, up and towards the eye of a view.

    Parameters
    ----------
    direction : (3,) ndarray
        From the picture to the eye.
    up : (3,) ndarray
        What shall point upwards as far as it can.

    Returns
    -------
    view : (3, 3) ndarray
        Orthonormal, right-handed.
    """
    towards = direction / np.linalg.norm(direction)
    right = np.cross(up, towards)
    if np.linalg.norm(right) < 1e-6:
        right = np.cross(np.eye(3)[np.argmin(np.abs(towards))], towards)
    right /= np.linalg.norm(right)
    view: FloatArray = np.array([right, np.cross(towards, right), towards])
    return view


@dataclass(frozen=True, slots=True, eq=False)
class Scene:
    """Bodies drawn so far, seen from one side in parallel projection.

    Attributes
    ----------
    view : (3, 3) ndarray
        See `view_from`.
    centre_A : (3,) ndarray
        What lies in the middle [angstrom].
    half_width_A : float
        From the middle to the edge [angstrom].
    size : int
        Width and height in pixels.
    image : (n, 4) ndarray of uint8
        Colours of the fine pixels, row by row.
    depth : (n,) ndarray of float32
        Height of the nearest point in each, -inf where there is none.
    """

    view: FloatArray
    centre_A: FloatArray
    half_width_A: float
    size: int
    image: NDArray[np.uint8]
    depth: NDArray[np.float32]

    @classmethod
    def empty(cls, view: FloatArray, centre_A: FloatArray, half_width_A: float, size: int) -> Scene:
        """Scene without bodies."""
        n = (size * _SAMPLES) ** 2
        return cls(
            view, centre_A, half_width_A, size, np.zeros((n, 4), dtype=np.uint8), np.full(n, -np.inf, dtype=np.float32)
        )

    def with_bodies(self, bodies: Sequence[Body]) -> Scene:
        """Scene with more bodies in it; the old one stays as it is."""
        fine = self.size * _SAMPLES
        image, depth = self.image.copy(), self.depth.copy()
        for body in bodies:
            points = (body.surface.vertices_A - self.centre_A) @ self.view.T
            points[:, :2] *= fine / 2 / self.half_width_A
            normals = body.surface.normals() @ self.view.T
            where, heights, tilts = _samples(points, normals, body.surface.faces, fine)
            nearest = np.full(len(depth), -np.inf, dtype=np.float32)
            np.maximum.at(nearest, where, heights)
            seen = (heights >= nearest[where]) & (heights > depth[where])
            image[where[seen]] = _shaded(body.colour, _brightness(tilts[seen]))
            depth = np.maximum(depth, nearest)
        return Scene(self.view, self.centre_A, self.half_width_A, self.size, image, depth)

    def address(self) -> str:
        """Picture as ``data:image/png;base64,...``, its background transparent."""
        fine = self.size * _SAMPLES
        pixels = _averaged(self.image.reshape(fine, fine, 4), self.size)
        return f"data:image/png;base64,{base64.b64encode(_png(pixels)).decode('ascii')}"


def _samples(
    points: FloatArray, normals: FloatArray, faces: NDArray[np.intp], fine: int
) -> tuple[NDArray[np.intp], NDArray[np.float32], NDArray[np.float32]]:
    """Pixel, height and normal of points strewn over the triangles that face the eye."""
    # Single precision is a hundred times finer than a pixel, and half the work.
    both = np.concatenate([points, normals], axis=1).astype(np.float32)[faces]
    first, second = both[:, 1, :2] - both[:, 0, :2], both[:, 2, :2] - both[:, 0, :2]
    front = first[:, 0] * second[:, 1] - first[:, 1] * second[:, 0] > 0
    both, first, second = both[front], first[front], second[front]
    longest = np.sqrt(np.max([(edge * edge).sum(axis=1) for edge in (first, second, first - second)], axis=0))
    steps = np.maximum(np.ceil(longest / _PX_PER_POINT).astype(int), 1)
    parts = [np.zeros((0, 6), dtype=np.float32)]
    parts += [(_strewn_weights(int(n)) @ both[steps == n]).reshape(-1, 6) for n in np.unique(steps)]
    strewn = np.concatenate(parts)
    columns = np.floor(strewn[:, 0] + fine / 2).astype(np.intp)
    rows = np.floor(fine / 2 - strewn[:, 1]).astype(np.intp)
    kept = (columns >= 0) & (columns < fine) & (rows >= 0) & (rows < fine)
    return (rows * fine + columns)[kept], strewn[kept, 2], strewn[kept, 3:]


@cache
def _strewn_weights(n: int) -> NDArray[np.float32]:
    """(n_points, 3) weights of the corners for points strewn evenly over a triangle, n + 1 along each side."""
    a, b = (grid.ravel() for grid in np.meshgrid(np.arange(n + 1), np.arange(n + 1)))
    weights: NDArray[np.float32] = (np.stack([n - a - b, a, b], axis=1)[a + b <= n] / n).astype(np.float32)
    weights.setflags(write=False)
    return weights


def _brightness(normals: NDArray[np.float32]) -> FloatArray:
    """0 to 1 in the shade, above 1 where the light is mirrored."""
    light = _LIGHT / np.linalg.norm(_LIGHT)
    normals = normals / np.maximum(np.linalg.norm(normals, axis=1, keepdims=True), 1e-12)
    cosine = np.clip(normals @ light, 0, 1)
    half_way = light + np.array([0.0, 0.0, 1.0])
    mirrored = np.clip(normals @ (half_way / np.linalg.norm(half_way)), 0, 1) ** 40
    rim = np.clip(normals[:, 2], 0, 1)
    brightness: FloatArray = (0.60 + 0.52 * cosine) * (0.62 + 0.38 * rim) + 0.30 * mirrored
    return np.round(brightness * _SHADES) / _SHADES


def _shaded(colour: str, brightness: FloatArray) -> NDArray[np.uint8]:
    """(n, 4) Colours: darker below 1, towards white above."""
    base = np.array([int(colour[k : k + 2], 16) for k in (1, 3, 5)], dtype=float)
    dark = np.minimum(brightness, 1)[:, None] * base
    white = np.clip(brightness - 1, 0, 1)[:, None]
    rgba = np.full((len(brightness), 4), 255, dtype=np.uint8)
    rgba[:, :3] = np.round(dark + (255 - dark) * white)
    return rgba


def _averaged(image: NDArray[np.uint8], size: int) -> NDArray[np.uint8]:
    """Image at its final size; the colour of a part-covered pixel is that of its covered part."""
    blocks = image.reshape(size, _SAMPLES, size, _SAMPLES, 4).astype(np.uint16)
    # Fine pixels are either clear, and zero throughout, or opaque.
    total = reduce(np.add, [blocks[:, row, :, column] for row in range(_SAMPLES) for column in range(_SAMPLES)])
    covered = np.maximum(total[..., 3:] // 255, 1)
    return np.concatenate([total[..., :3] // covered, total[..., 3:] // _SAMPLES**2], axis=2).astype(np.uint8)


def _png(image: NDArray[np.uint8]) -> bytes:
    """RGBA image in the PNG format (ISO/IEC 15948), with a palette of at most 256 colours."""
    height, width = image.shape[:2]
    for bits in range(4, 7):
        # Coarser colours until the palette holds them all; clear pixels are all alike.
        step = 1 << bits
        coarse = np.minimum(image.astype(int) // step * step + step // 2, 255)
        coarse[..., 3] = np.minimum((image[..., 3].astype(int) + 32) // 64 * 64, 255)
        coarse = np.where(coarse[..., 3:] == 0, 0, coarse).astype(np.uint8)
        codes = np.ascontiguousarray(coarse).view("<u4").reshape(-1)
        colours, places = np.unique(codes, return_inverse=True)
        if len(colours) <= 256:
            break
    palette = colours.astype("<u4").view(np.uint8).reshape(-1, 4)
    lines = np.zeros((height, 1 + width), dtype=np.uint8)
    lines[:, 1:] = places.reshape(height, width)
    parts = (
        (b"IHDR", struct.pack(">IIBBBBB", width, height, 8, 3, 0, 0, 0)),
        (b"PLTE", palette[:, :3].tobytes()),
        (b"tRNS", palette[:, 3].tobytes()),
        (b"IDAT", zlib.compress(lines.tobytes(), 6)),
        (b"IEND", b""),
    )
    chunks = [
        struct.pack(">I", len(data)) + name + data + struct.pack(">I", zlib.crc32(name + data)) for name, data in parts
    ]
    return b"\x89PNG\r\n\x1a\n" + b"".join(chunks)
