"""Angular structure of a two-centre block: from channel integrals to real-harmonic matrix elements.

A block between shells of l_a and l_b depends on the direction n of the bond as a sum over L = |l_a - l_b|, ...,
l_a + l_b (even steps) of F_L(R) sum_M Y_LM(n) <Y_a Y_b Y_LM>. There are as many L as channels |m|, so the F_L
are fixed linear combinations of the sigma, pi, delta, phi integrals. This replaces the rotation of each block
by one matrix product for all pairs of the same kind.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from math import pi, sqrt

import numpy as np

from ehmo.harmonics import product_integrals
from ehmo.records.arrays import FloatArray, IntArray


@dataclass(frozen=True, slots=True, eq=False)
class BlockStructure:
    """Constants that turn channel integrals of one pair of shell layouts into blocks.

    With ``terms = (channels @ mixing)[:, radial_column] * harmonics[:, angular_column]`` the blocks are
    ``terms @ coupling``.

    Attributes
    ----------
    channel_m : (n_channels,) ndarray of int
        |m| of each channel.
    mixing : (n_channels, n_radial) ndarray
        Channel integrals to F_L.
    radial_column, angular_column : (n_terms,) ndarray of int
        Which F_L and which Y_LM make each term.
    coupling : (n_terms, n_first * n_second) ndarray
        Products of harmonics.
    element_rows, element_columns : (n_first * n_second,) ndarray of int
        Row and column of each element within its block.
    l_max : int
        Highest harmonic among the terms.
    """

    channel_m: IntArray
    mixing: FloatArray
    radial_column: IntArray
    angular_column: IntArray
    coupling: FloatArray
    element_rows: IntArray
    element_columns: IntArray
    l_max: int


@cache
def block_structure(first: tuple[int, ...], second: tuple[int, ...]) -> BlockStructure:
    """Structure for an atom with shells of the l in `first` and one with those in `second`."""
    first_start = np.cumsum([0] + [2 * l + 1 for l in first])
    second_start = np.cumsum([0] + [2 * l + 1 for l in second])
    shape = (int(first_start[-1]), int(second_start[-1]))
    channel_m: list[int] = []
    mixing_parts: list[FloatArray] = []
    radial_column: list[int] = []
    angular_column: list[int] = []
    coupling_rows: list[FloatArray] = []
    for i, l_a in enumerate(first):
        for j, l_b in enumerate(second):
            gaunt = product_integrals(l_a, l_b)
            degrees = range(abs(l_a - l_b), l_a + l_b + 1, 2)
            channel_m.extend(range(min(l_a, l_b) + 1))
            radial_start = sum(part.shape[1] for part in mixing_parts)
            mixing_parts.append(_channel_mixing(l_a, l_b, gaunt))
            for k, degree in enumerate(degrees):
                for column in range(degree**2, (degree + 1) ** 2):
                    radial_column.append(radial_start + k)
                    angular_column.append(column)
                    row = np.zeros(shape)
                    row[first_start[i] : first_start[i + 1], second_start[j] : second_start[j + 1]] = gaunt[
                        :, :, column
                    ]
                    coupling_rows.append(row.ravel())
    return BlockStructure(
        np.array(channel_m, dtype=np.intp),
        _block_diagonal(mixing_parts),
        np.array(radial_column, dtype=np.intp),
        np.array(angular_column, dtype=np.intp),
        np.array(coupling_rows),
        np.repeat(np.arange(shape[0]), shape[1]),
        np.tile(np.arange(shape[1]), shape[0]),
        max(first) + max(second),
    )


def _channel_mixing(l_a: int, l_b: int, gaunt: FloatArray) -> FloatArray:
    """Matrix that takes the integrals by |m| to the F_L, from the block along z where it is diagonal."""
    along_z = np.array(
        [
            [
                sqrt((2 * degree + 1) / (4 * pi)) * gaunt[l_a + m, l_b + m, degree**2 + degree]
                for degree in range(abs(l_a - l_b), l_a + l_b + 1, 2)
            ]
            for m in range(min(l_a, l_b) + 1)
        ]
    )
    mixing: FloatArray = np.linalg.inv(along_z).T
    return mixing


def _block_diagonal(parts: list[FloatArray]) -> FloatArray:
    rows = np.cumsum([0] + [part.shape[0] for part in parts])
    columns = np.cumsum([0] + [part.shape[1] for part in parts])
    matrix = np.zeros((rows[-1], columns[-1]))
    for k, part in enumerate(parts):
        matrix[rows[k] : rows[k + 1], columns[k] : columns[k + 1]] = part
    return matrix
