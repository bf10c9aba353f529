"""Keys that a store has, packed so that every process that works can hold them."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np

_HALF = np.dtype(">u8")


class KnownKeys:
    """A set of keys by their first 128 bits, 16 bytes each.

    Parameters
    ----------
    packed : bytes
        As `packed_keys` makes them.
    """

    def __init__(self, packed: bytes = b"") -> None:
        self.packed = packed
        self._halves = np.frombuffer(packed, _HALF).reshape(-1, 2)
        self._first = self._halves[:, 0].astype(np.uint64)

    def __len__(self) -> int:
        return len(self._first)

    def __contains__(self, key: str) -> bool:
        first, second = int(key[:16], 16), int(key[16:32], 16)
        place = int(np.searchsorted(self._first, np.uint64(first)))
        while place < len(self._first) and int(self._first[place]) == first:
            if int(self._halves[place, 1]) == second:
                return True
            place += 1
        return False


def packed_keys(keys: Iterable[str]) -> bytes:
    """First halves of keys, sorted.

    Parameters
    ----------
    keys : iterable of str
        In hexadecimal.

    Returns
    -------
    packed : bytes
    """
    return b"".join(sorted(bytes.fromhex(key[:32]) for key in keys))
