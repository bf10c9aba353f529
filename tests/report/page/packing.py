"""Packed surfaces unpacked by a plain loop over their description."""

from __future__ import annotations

import base64
import struct
import zlib

import numpy as np


def unpacked(text: str, step_A: float) -> list[tuple[np.ndarray, np.ndarray] | None]:
    """Vertices [angstrom] and faces of each surface."""
    raw = zlib.decompress(base64.b64decode(text))
    place, found = 0, []

    def numbers(count: int) -> list[int]:
        nonlocal place
        low, high = raw[place : place + count], raw[place + count : place + 2 * count]
        place += 2 * count
        codes = [a + 256 * b for a, b in zip(low, high, strict=True)]
        return [code // 2 if code % 2 == 0 else -(code + 1) // 2 for code in codes]

    while place < len(raw):
        n, m = struct.unpack_from("<II", raw, place)
        place += 8
        if n == 0:
            found.append(None)
            continue
        changes, backwards = numbers(3 * n), numbers(3 * m)
        axes = [np.cumsum(changes[k * n : (k + 1) * n]) * step_A for k in range(3)]
        corners, highest = [], -1
        for back in backwards:
            corners.append(highest + 1 - back)
            highest = max(highest, corners[-1])
        found.append((np.stack(axes, axis=1), np.array(corners).reshape(m, 3)))
    return found
