"""Interaction of charges on a lattice: Ewald sums of point charges, and what atoms differ from them at short range.

The softened law e^2 / sqrt(R^2 + a^2) of the molecular model falls behind e^2 / R by e^2 a^2 / (2 R^3), and a sum of
R^-3 over a lattice need not have a limit. With a^2 = (a_A^2 + a_B^2)/2 it has one but for a constant, since the
charges of a cell add up to zero: the part of a_A^2 cancels, that of a_B^2 is the same for every A. With the
molecule's a = (a_A + a_B)/2 it has none. So a goes over from the one to the other mean between 4 and 6 angstrom:
bonded atoms and next neighbours meet as in a molecule.
"""

from __future__ import annotations

from itertools import product

import numpy as np
from scipy.special import erfc

from ehmo.records.arrays import FloatArray, IntArray
from ehmo.units import COULOMB_EV_A

MOLECULAR_A = (4.0, 6.0)
"""Up to the first distance a is the mean of a_A and a_B, from the second on their quadratic mean [angstrom]."""

SOFTENING_A = (12.0, 24.0)
"""Between these distances the softening is faded out; what lies beyond is a constant [angstrom]."""

_PRECISION = 6.0  # erfc(6) and exp(-36) are below 1e-15


def ewald_matrix(positions_A: FloatArray, cell_A: FloatArray) -> FloatArray:
    """Sum of 1/R over the lattice for unit point charges in a uniform neutralising background.

    Parameters
    ----------
    positions_A : (n, 3) ndarray
        Cartesian coordinates [angstrom].
    cell_A : (3, 3) ndarray
        Cell vectors as rows [angstrom].

    Returns
    -------
    sums : (n, n) ndarray
        With all images; the diagonal leaves out the charge itself. For charges q that add up to zero the potential
        at a site is `sums @ q`, zero on the average over the cell [1/angstrom].

    References
    ----------
    .. [1] ewald-1921: P. P. Ewald, Ann. Phys. 369, 253 (1921).
    """
    volume = abs(float(np.linalg.det(cell_A)))
    splitting = float(np.sqrt(np.pi)) / volume ** (1 / 3)
    difference = _wrapped_differences(positions_A, cell_A)
    sums = np.full(difference.shape[:2], -np.pi / (volume * splitting**2))
    for shift in _lattice_points(cell_A, _PRECISION / splitting, difference) @ cell_A:
        distances = np.linalg.norm(difference + shift, axis=2)
        apart = distances > 1e-9
        sums[apart] += erfc(splitting * distances[apart]) / distances[apart]
    reciprocal = np.asarray(2 * np.pi * np.linalg.inv(cell_A).T, dtype=np.float64)
    waves = _lattice_points(reciprocal, 2 * splitting * _PRECISION, np.zeros((1, 1, 3)))
    waves = waves[np.array([tuple(-w) < tuple(w) for w in waves])] @ reciprocal
    squares = (waves * waves).sum(axis=1)
    amplitudes = 8 * np.pi / volume * np.exp(-squares / (4 * splitting**2)) / squares
    phases = waves @ positions_A.T
    cosines, sines = np.cos(phases), np.sin(phases)
    sums += (cosines.T * amplitudes) @ cosines + (sines.T * amplitudes) @ sines
    sums[np.diag_indices(len(sums))] -= 2 * splitting / np.sqrt(np.pi)
    return sums


def lattice_interaction(
    positions_A: FloatArray, softness_A: FloatArray, cell_A: FloatArray, weight: float
) -> FloatArray:
    """Interaction of the charges of a cell with one another and with all images, lambda gamma.

    Parameters
    ----------
    positions_A : (n, 3) ndarray
        Atoms, then point charges [angstrom].
    softness_A : (n,) ndarray
        a = e^2 / U of each atom, 0 for a point charge [angstrom].
    cell_A : (3, 3) ndarray
        Cell vectors as rows [angstrom].
    weight : float
        lambda of the parameter set.

    Returns
    -------
    interaction : (n, n) ndarray
        For charges that add up to zero [eV].

    References
    ----------
    .. [1] klopman-1964: G. Klopman, J. Am. Chem. Soc. 86, 4550 (1964).
    .. [2] ohno-1964: K. Ohno, Theor. Chim. Acta 2, 219 (1964).
    .. [3] ewald-1921: P. P. Ewald, Ann. Phys. 369, 253 (1921).
    """
    first, second = np.broadcast_arrays(softness_A[:, None], softness_A)
    difference = _wrapped_differences(positions_A, cell_A)
    sums = ewald_matrix(positions_A, cell_A)
    for shift in _lattice_points(cell_A, SOFTENING_A[1], difference) @ cell_A:
        distances = np.linalg.norm(difference + shift, axis=2)
        own = distances < 1e-9
        near = (distances < SOFTENING_A[1]) & ~own
        sums[near] += softening(distances[near], first[near], second[near])
        own &= first > 0
        sums[own] += 1 / first[own]
    interaction: FloatArray = weight * COULOMB_EV_A * sums
    return interaction


def softening(distances_A: FloatArray, first_A: FloatArray, second_A: FloatArray) -> FloatArray:
    """1 / sqrt(R^2 + a^2) - 1 / R, faded out at large distance.

    Parameters
    ----------
    distances_A : (n,) ndarray
        R [angstrom].
    first_A, second_A : (n,) ndarray
        a of the two atoms [angstrom].

    Returns
    -------
    values : (n,) ndarray
        [1/angstrom]
    """
    near = _fading(distances_A, *MOLECULAR_A)
    squares = near * ((first_A + second_A) / 2) ** 2 + (1 - near) * (first_A**2 + second_A**2) / 2
    values: FloatArray = _fading(distances_A, *SOFTENING_A) * (1 / np.sqrt(distances_A**2 + squares) - 1 / distances_A)
    return values


def _fading(distances: FloatArray, start: float, stop: float) -> FloatArray:
    """1 up to `start`, 0 from `stop` on, with two continuous derivatives."""
    t = np.clip((distances - start) / (stop - start), 0, 1)
    fading: FloatArray = 1 - t**3 * (10 - 15 * t + 6 * t**2)
    return fading


def _wrapped_differences(positions: FloatArray, cell: FloatArray) -> FloatArray:
    """(n, n, 3) vectors between atoms, each moved by whole cells to fractions within half a cell."""
    difference = positions[None, :, :] - positions[:, None, :]
    fractions = difference @ np.linalg.inv(cell)
    wrapped: FloatArray = difference - np.round(fractions) @ cell
    return wrapped


def _lattice_points(cell: FloatArray, reach: float, difference: FloatArray) -> IntArray:
    """Integer lattice points that may bring one of the vectors within reach."""
    heights = 1 / np.linalg.norm(np.linalg.inv(cell), axis=0)
    fractions = np.abs(difference.reshape(-1, 3) @ np.linalg.inv(cell)).max(axis=0)
    bounds = np.ceil(reach / heights + fractions).astype(int)
    points = np.array(list(product(*(range(-n, n + 1) for n in bounds))), dtype=np.intp)
    longest = np.linalg.norm(difference.reshape(-1, 3), axis=1).max()
    near: IntArray = points[np.linalg.norm(points @ cell, axis=1) <= reach + longest]
    return near
