"""Overlap integrals of two elements as piecewise polynomials in the logarithm of distance.

An overlap integral varies on a length that grows with distance, so equal steps of ln R keep the error even.
Degree 8 on steps of 0.125 reproduces the quadrature to 1e-12 for 1s to 7s, 3d, 5d and 5f functions.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from basis_params import Shell
from ehmo.conventions import NEGLECTED_OVERLAP
from ehmo.errors import ParameterError
from ehmo.orbitals.quadrature import channel_overlaps
from ehmo.orbitals.radial import RadialFunction, orthogonal_radial_functions
from ehmo.records.arrays import FloatArray

SHORTEST_BOHR = 0.7
"""Atoms closer than this are refused as overlapping [bohr]."""

LOG_STEP = 0.125
DEGREE = 8
_MAX_SEGMENTS = 60  # to 1200 bohr: only an exponent below 0.1 would need more
_BATCH = 6


@dataclass(frozen=True, slots=True, eq=False)
class OverlapTable:
    """Polynomial pieces of every channel between two elements.

    Attributes
    ----------
    coefficients : (n_segments, DEGREE + 1, n_channels) ndarray
        In ascending powers of the position t in [-1, 1] within a segment. Channels are ordered by shell of
        the first element, shell of the second, |m|. The last segment is zero: it serves every larger distance.
    """

    coefficients: FloatArray


def overlap_table(first: tuple[Shell, ...], second: tuple[Shell, ...]) -> OverlapTable:
    """Table for a pair of elements, built once per process and parameter set.

    Parameters
    ----------
    first, second : tuple of Shell
        Shells of the two elements.

    Returns
    -------
    table : OverlapTable

    Raises
    ------
    ParameterError
        If an exponent is so small that the overlap does not die out within the table.
    """
    return function_table(orthogonal_radial_functions(first), orthogonal_radial_functions(second))


@lru_cache(maxsize=2048)
def function_table(first: tuple[RadialFunction, ...], second: tuple[RadialFunction, ...]) -> OverlapTable:
    """Table for any radial functions on two centres; see `overlap_table`.

    Parameters
    ----------
    first, second : tuple of RadialFunction
        Functions on the two centres.

    Returns
    -------
    table : OverlapTable

    Raises
    ------
    ParameterError
        If an exponent is so small that the overlap does not die out within the table.
    """
    functions = [(a, b) for a in first for b in second]
    nodes = np.cos(np.pi * (np.arange(DEGREE + 1) + 0.5) / (DEGREE + 1))
    to_powers = np.linalg.inv(np.vander(nodes, increasing=True))
    pieces: list[FloatArray] = []
    for start in range(0, _MAX_SEGMENTS, _BATCH):
        centres = (np.arange(start, start + _BATCH) + 0.5) * LOG_STEP
        distances = SHORTEST_BOHR * np.exp(centres[:, None] + LOG_STEP / 2 * nodes)
        values = np.concatenate([channel_overlaps(a, b, distances.ravel()) for a, b in functions], axis=1)
        pieces.append(values.reshape(_BATCH, DEGREE + 1, -1))
        # Radial nodes make zeros at short range; beyond 3 bohr the decay is monotonic.
        if distances[0, 0] > 3 and np.abs(pieces[-1]).max() < NEGLECTED_OVERLAP:
            pieces[-1][:] = 0.0
            break
    else:
        raise ParameterError(
            "an exponent is too small: its overlaps reach past 1000 bohr",
            mend="use exponents above 0.1 bohr^-1",
        )
    coefficients = to_powers @ np.concatenate(pieces)
    coefficients.setflags(write=False)
    return OverlapTable(coefficients)


def table_positions(distances_bohr: FloatArray) -> tuple[NDArray[np.intp], FloatArray]:
    """Segment of each distance and powers of the position within it.

    Parameters
    ----------
    distances_bohr : (n,) ndarray
        Distances of at least `SHORTEST_BOHR` [bohr].

    Returns
    -------
    segments : (n,) ndarray of int
        May exceed the number of segments of a table: clip to its last one.
    powers : (n, DEGREE + 1) ndarray
        1, t, t^2, ...
    """
    scaled = np.log(distances_bohr * (1 / SHORTEST_BOHR)) * (1 / LOG_STEP)
    segments = scaled.astype(np.intp)
    powers = np.empty((len(scaled), DEGREE + 1))
    powers[:, 0] = 1.0
    powers[:, 1:] = (2 * (scaled - segments) - 1)[:, None]
    np.multiply.accumulate(powers, axis=1, out=powers)
    return segments, powers
