"""Two-centre overlap integrals of Slater-type functions in prolate spheroidal coordinates.

With r_a = R (mu + nu)/2 and r_b = R (mu - nu)/2 the integrand is exp(-p mu - q nu) times a polynomial, of degree
n_a + n_b in mu: Gauss-Laguerre nodes in mu are exact, Gauss-Legendre nodes in nu converge geometrically. Unlike
the closed A_n, B_n formulas nothing cancels when exponents are close or distances short.
"""

from __future__ import annotations

from functools import cache, lru_cache
from math import factorial, sqrt

import numpy as np

from ehmo.harmonics import legendre_derivative
from ehmo.orbitals.radial import RadialFunction
from ehmo.records.arrays import FloatArray

NU_NODES = 48
"""Enough for |zeta_a - zeta_b| R up to about 120, past which the overlap is below 1e-10 anyway."""


def channel_overlaps(first: RadialFunction, second: RadialFunction, distances_bohr: FloatArray) -> FloatArray:
    """Overlap integrals between two centres, for every |m| about the line that joins them.

    Parameters
    ----------
    first, second : RadialFunction
        Functions on the centres at 0 and at distance R along +z; their axes are parallel, so a
        sigma overlap of two p functions is negative at bonding distance.
    distances_bohr : (n,) ndarray
        Distances R > 0 [bohr].

    Returns
    -------
    overlaps : (n, min(l_first, l_second) + 1) ndarray
        Column m is the sigma, pi, delta or phi integral.

    References
    ----------
    .. [1] mulliken-1949: R. S. Mulliken, C. A. Rieke, D. Orloff, H. Orloff, J. Chem. Phys. 17, 1248 (1949):
       coordinates and closed formulas (from memory).
    """
    distances = np.asarray(distances_bohr, dtype=np.float64)
    key = distances.tobytes()
    overlaps = np.zeros((len(distances), min(first.l, second.l) + 1))
    for n_a, zeta_a, weight_a in first.primitives:
        for n_b, zeta_b, weight_b in second.primitives:
            # Rounding in n_a + n_b counts the nodes: degree n_a + n_b needs (n_a + n_b)/2 + 1/2 of them.
            grid = _grid(key, zeta_a, zeta_b, (n_a + n_b) // 2 + 1)
            radial = weight_a * weight_b * grid.weights * grid.r_a ** (n_a - 1) * grid.r_b ** (n_b - 1)
            for m in range(overlaps.shape[1]):
                angular = _polar(first.l, m, grid.cos_a) * _polar(second.l, m, grid.cos_b) * grid.sines**m
                overlaps[:, m] += np.einsum("rij,rij->r", radial, angular)
    return overlaps


@lru_cache(maxsize=32)
def _grid(distances: bytes, zeta_a: float, zeta_b: float, n_mu: int) -> _SpheroidalGrid:
    """Grid shared by the shells of two elements that have the same exponents, such as 2s and 2p."""
    return _SpheroidalGrid(np.frombuffer(distances), zeta_a, zeta_b, n_mu)


class _SpheroidalGrid:
    """Nodes for one pair of exponents: arrays of shape (n_distances, n_mu, n_nu)."""

    def __init__(self, distances: FloatArray, zeta_a: float, zeta_b: float, n_mu: int) -> None:
        x, laguerre = _laguerre(n_mu)
        nu, legendre = _legendre(NU_NODES)
        half = distances[:, None, None] / 2
        p, q = (zeta_a + zeta_b) * half, (zeta_a - zeta_b) * half
        mu = 1 + x[None, :, None] / p
        self.r_a = half * (mu + nu)
        self.r_b = half * (mu - nu)
        product = (mu + nu) * (mu - nu)
        self.cos_a = (1 + mu * nu) / (mu + nu)
        self.cos_b = (mu * nu - 1) / (mu - nu)
        self.sines = (mu - 1) * (mu + 1) * (1 - nu**2) / product
        self.weights = half**3 * product / p * np.exp(-p - q * nu) * laguerre[:, None] * legendre


def _polar(l: int, m: int, cosines: FloatArray) -> FloatArray:
    """Normalised associated Legendre function without its factor sin(theta)^m."""
    norm = sqrt((2 * l + 1) / 2 * factorial(l - m) / factorial(l + m))
    values = np.zeros_like(cosines)
    for coefficient in norm * legendre_derivative(l, m)[::-1]:
        values = values * cosines + coefficient
    return values


@cache
def _laguerre(n: int) -> tuple[FloatArray, FloatArray]:
    nodes, weights = np.polynomial.laguerre.laggauss(n)
    return nodes, weights


@cache
def _legendre(n: int) -> tuple[FloatArray, FloatArray]:
    nodes, weights = np.polynomial.legendre.leggauss(n)
    return nodes, weights
