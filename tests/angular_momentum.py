"""Angular momentum in the complex basis |l m> and its transform to real harmonics, independent of ehmo.

Condon-Shortley phase; real functions as sqrt(2) (-1)^m Re Y_lm for m > 0 and sqrt(2) (-1)^m Im Y_l|m| for m < 0
(Condon & Shortley, The Theory of Atomic Spectra, 1935; memory).
"""

from __future__ import annotations

from math import factorial, pi, sqrt

import numpy as np


def real_from_complex(l: int) -> np.ndarray:
    """(2l+1, 2l+1) unitary U: real harmonic of row m = sum over columns m' of U Y_lm'."""
    transform = np.zeros((2 * l + 1, 2 * l + 1), dtype=complex)
    transform[l, l] = 1
    for m in range(1, l + 1):
        sign = (-1) ** m
        # Y_l,-m = (-1)^m conj(Y_lm)
        transform[l + m, [l + m, l - m]] = sign / sqrt(2), 1 / sqrt(2)
        transform[l - m, [l + m, l - m]] = sign / (1j * sqrt(2)), -1 / (1j * sqrt(2))
    return transform


def momentum_matrices(l: int) -> np.ndarray:
    """(3, 2l+1, 2l+1) matrices of Lx, Ly, Lz among real harmonics, in units of hbar."""
    m = np.arange(-l, l + 1)
    raising = np.diag(np.sqrt(l * (l + 1) - m[:-1] * (m[:-1] + 1)), -1).astype(complex)
    lowering = raising.conj().T
    cartesian = [(raising + lowering) / 2, (raising - lowering) / 2j, np.diag(m).astype(complex)]
    # Kets turn with the conjugate of the matrix that turns the functions' coefficients.
    transform = real_from_complex(l).conj()
    return np.array([transform @ matrix @ transform.conj().T for matrix in cartesian])


def wigner_3j(j: tuple[int, int, int], m: tuple[int, int, int]) -> float:
    """3j symbol by Racah's formula (Edmonds 1957; memory)."""
    (a, b, c), (x, y, z) = j, m
    if x + y + z or not abs(a - b) <= c <= a + b or any(abs(k) > i for i, k in zip(j, m, strict=True)):
        return 0.0
    triangle = factorial(a + b - c) * factorial(a - b + c) * factorial(-a + b + c) / factorial(a + b + c + 1)
    product = 1
    for i, k in zip(j, m, strict=True):
        product *= factorial(i + k) * factorial(i - k)
    total = 0.0
    for t in range(max(0, b - c - x, a - c + y), min(a + b - c, a - x, b + y) + 1):
        down = factorial(t) * factorial(c - b + t + x) * factorial(c - a + t - y)
        total += (-1) ** t / (down * factorial(a + b - c - t) * factorial(a - t - x) * factorial(b - t + y))
    return (-1) ** (a - b - z) * sqrt(triangle * product) * total


def complex_gaunt(j: tuple[int, int, int], m: tuple[int, int, int]) -> float:
    """Integral of three complex harmonics over the sphere (Gaunt 1929)."""
    size = sqrt((2 * j[0] + 1) * (2 * j[1] + 1) * (2 * j[2] + 1) / (4 * pi))
    return size * wigner_3j(j, (0, 0, 0)) * wigner_3j(j, m)
