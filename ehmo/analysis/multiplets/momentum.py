"""Orbital and spin angular momentum of one electron and of a shell."""

from __future__ import annotations

from functools import cache

import numpy as np

from ehmo.analysis.multiplets.determinants import shell_space
from ehmo.harmonics import harmonic_rotations
from ehmo.records.arrays import FloatArray
from ehmo.records.multiplets import ComplexArray

_Z_TO_X_AND_Y = np.array([[[0, 0, 1], [0, 1, 0], [-1, 0, 0]], [[1, 0, 0], [0, 0, 1], [0, -1, 0]]], dtype=np.float64)

SPIN_HALF = np.array([[[0, 1], [1, 0]], [[0, -1j], [1j, 0]], [[1, 0], [0, -1]]], dtype=np.complex128) / 2
"""Spin matrices of one electron, alpha first."""


@cache
def orbital_momentum(l: int) -> ComplexArray:
    """Matrices of l_x, l_y, l_z among the real harmonics.

    Parameters
    ----------
    l : int

    Returns
    -------
    matrices : (3, 2*l + 1, 2*l + 1) ndarray of complex
        Hermitian and purely imaginary [hbar].

    Notes
    -----
    l_z cos(m phi) = i m sin(m phi); the other two are l_z turned onto x and y.
    """
    l_z = np.zeros((2 * l + 1, 2 * l + 1))
    for m in range(1, l + 1):
        l_z[l - m, l + m], l_z[l + m, l - m] = m, -m
    turned = harmonic_rotations(_Z_TO_X_AND_Y, l)
    matrices = 1j * np.array([*(turned @ l_z @ turned.swapaxes(1, 2)), l_z])
    matrices.setflags(write=False)
    return matrices


def reduced_momentum(l: int, orbitals: FloatArray, metal_shares: FloatArray) -> ComplexArray:
    """Orbital angular momentum of a shell whose functions are only partly on the metal.

    Parameters
    ----------
    l : int
    orbitals : (2*l + 1, n) ndarray
        Columns are orthonormal combinations of the real harmonics.
    metal_shares : (n,) ndarray
        Part of each orbital on the metal, 0 to 1.

    Returns
    -------
    matrices : (3, 2*l + 1, 2*l + 1) ndarray of complex
        An element between orbitals a and b is that of the free ion times (share_a share_b)^(1/2).

    References
    ----------
    .. [1] stevens-1953: K. W. H. Stevens, Proc. R. Soc. London, Ser. A 219, 542 (1953) (from memory).
    """
    factor = (orbitals * np.sqrt(metal_shares)) @ orbitals.T
    reduced: ComplexArray = factor @ orbital_momentum(l) @ factor
    return reduced


@cache
def spin_momentum(l: int, n_electrons: int) -> ComplexArray:
    """Matrices of S_x, S_y, S_z among all determinants of a shell.

    Parameters
    ----------
    l, n_electrons : int

    Returns
    -------
    matrices : (3, n_states, n_states) ndarray of complex
    """
    space = shell_space(l, n_electrons)
    unit = np.eye(2 * l + 1)
    matrices = np.array([space.one_body(np.kron(spin, unit)) for spin in SPIN_HALF])
    matrices.setflags(write=False)
    return matrices


def total_orbital_momentum(one_electron: ComplexArray, n_electrons: int) -> ComplexArray:
    """Matrices of L_x, L_y, L_z among all determinants of a shell.

    Parameters
    ----------
    one_electron : (3, n, n) ndarray of complex
        See `orbital_momentum` and `reduced_momentum`.
    n_electrons : int

    Returns
    -------
    matrices : (3, n_states, n_states) ndarray of complex
    """
    space = shell_space((one_electron.shape[1] - 1) // 2, n_electrons)
    return np.array([space.one_body(np.kron(np.eye(2), matrix)) for matrix in one_electron])
