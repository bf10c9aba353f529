"""Closed formulas for contracted Slater functions: norm and radial moments."""

from __future__ import annotations

import math
from collections.abc import Sequence
from itertools import product


def slater_overlap(n: int, zeta_a: float, zeta_b: float) -> float:
    """One-centre overlap of two normalised Slater functions of one n and l, (2 sqrt(ab) / (a+b))^(2n+1).

    References
    ----------
    slater-1930

    Examples
    --------
    >>> slater_overlap(3, 1.7, 1.7)
    1.0
    """
    return (2.0 * math.sqrt(zeta_a * zeta_b) / (zeta_a + zeta_b)) ** (2 * n + 1)


def radial_moment(n: int, zetas: Sequence[float], coefficients: Sequence[float], power: int) -> float:
    """Return the integral of r^power over the square of a contracted Slater function.

    sum_ij c_i c_j S_ij (2n+p)! / (2n)! / (z_i+z_j)^p, with S_ij of `slater_overlap`; p = 0 gives the norm.

    Parameters
    ----------
    n : int
        Principal quantum number.
    zetas, coefficients : sequence of float
        Exponents [bohr^-1] and coefficients, taken as they are.
    power : int
        Power p of r.

    Returns
    -------
    float
        [bohr^power]
    """
    factor = math.factorial(2 * n + power) / math.factorial(2 * n)
    terms = tuple(zip(zetas, coefficients, strict=True))
    return factor * sum(
        c_a * c_b * slater_overlap(n, z_a, z_b) / (z_a + z_b) ** power
        for (z_a, c_a), (z_b, c_b) in product(terms, terms)
    )


def mean_radius(n: int, zetas: Sequence[float], coefficients: Sequence[float]) -> float:
    """Return the mean radius <r> of a contracted Slater function after renormalisation [bohr].

    Examples
    --------
    >>> mean_radius(1, (1.0,), (1.0,))
    1.5
    """
    return radial_moment(n, zetas, coefficients, 1) / radial_moment(n, zetas, coefficients, 0)
