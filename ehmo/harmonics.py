"""Real spherical harmonics, their products and their rotations.

Order m = -l..l, without the Condon-Shortley sign: see `ehmo.conventions`. Everything here is exact up to
rounding; nothing is tabulated by hand.
"""

from __future__ import annotations

from functools import cache, lru_cache
from math import factorial, pi, sqrt

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

MAX_L = 7
"""Highest degree evaluated: products of two f functions reach 6, and their dipole integrals 7."""


def real_harmonics(directions: FloatArray, l_max: int) -> FloatArray:
    """Orthonormal real spherical harmonics of all degrees up to l_max.

    Parameters
    ----------
    directions : (n, 3) ndarray
        Unit vectors.
    l_max : int
        Highest degree, at most 7.

    Returns
    -------
    values : (n, (l_max + 1)**2) ndarray
        Column l*l + l + m holds Y_lm.

    References
    ----------
    .. [1] varshalovich-1988: D. A. Varshalovich, A. N. Moskalev, V. K. Khersonskii, Quantum Theory of Angular
       Momentum, World Scientific 1988, chapter 5 (from memory).
    """
    polynomials, azimuth = _harmonic_factors(l_max)
    z_powers, xy_powers = _coordinate_powers(directions, l_max)
    # x^2 + y^2 = sin^2(theta), so the powers of (x + iy) carry both the azimuth and the sine factor.
    parts: FloatArray = xy_powers.view(np.float64)
    result: FloatArray = (z_powers @ polynomials) * parts[:, azimuth]
    return result


def harmonic_gradients(directions: FloatArray, l_max: int) -> FloatArray:
    """Derivatives of the real harmonics by x, y and z of the direction.

    The harmonics are taken as the polynomials in x, y, z that `real_harmonics` evaluates: on the sphere they are right,
    off it one choice of many, so only the part of each gradient across its direction has a meaning.

    Parameters
    ----------
    directions : (n, 3) ndarray
        Unit vectors.
    l_max : int
        Highest degree, at most 7.

    Returns
    -------
    gradients : (n, (l_max + 1)**2, 3) ndarray
    """
    polynomials, azimuth = _harmonic_factors(l_max)
    z_powers, xy_powers = _coordinate_powers(directions, l_max)
    orders = np.arange(l_max + 1)
    z_slopes = np.zeros_like(z_powers)
    z_slopes[:, 1:] = z_powers[:, :-1] * orders[1:]
    xy_slopes = np.zeros_like(xy_powers)  # d/dx (x + iy)^m; d/dy is i times that
    xy_slopes[:, 1:] = xy_powers[:, :-1] * orders[1:]
    gradients = np.empty((len(directions), (l_max + 1) ** 2, 3))
    along_z = z_powers @ polynomials
    gradients[:, :, 0] = along_z * xy_slopes.view(np.float64)[:, azimuth]
    gradients[:, :, 1] = along_z * (1j * xy_slopes).view(np.float64)[:, azimuth]
    gradients[:, :, 2] = (z_slopes @ polynomials) * xy_powers.view(np.float64)[:, azimuth]
    return gradients


def _coordinate_powers(directions: FloatArray, l_max: int) -> tuple[FloatArray, NDArray[np.complex128]]:
    """Powers of z and of x + iy up to l_max."""
    z_powers = np.empty((len(directions), l_max + 1))
    xy_powers = np.empty((len(directions), l_max + 1), dtype=np.complex128)
    z_powers[:, 0] = 1.0
    xy_powers[:, 0] = 1.0
    if l_max:
        z_powers[:, 1:] = directions[:, 2:3]
        xy_powers[:, 1:].real = directions[:, 0:1]
        xy_powers[:, 1:].imag = directions[:, 1:2]
        np.multiply.accumulate(z_powers, axis=1, out=z_powers)
        np.multiply.accumulate(xy_powers, axis=1, out=xy_powers)
    return z_powers, xy_powers


@lru_cache(maxsize=MAX_L + 1)
def _harmonic_factors(l_max: int) -> tuple[FloatArray, NDArray[np.intp]]:
    """Coefficients in z of each Y_lm / (cos or sin factor), and the column of that factor."""
    if not 0 <= l_max <= MAX_L:
        raise ValueError(f"l_max is {l_max}, expected 0 to {MAX_L}")
    polynomials = np.zeros((l_max + 1, (l_max + 1) ** 2))
    azimuth = np.zeros((l_max + 1) ** 2, dtype=np.intp)
    for l in range(l_max + 1):
        for m in range(-l, l + 1):
            column = l * l + l + m
            order = abs(m)
            norm = sqrt((2 * l + 1) / (4 * pi) * factorial(l - order) / factorial(l + order))
            coefficients = norm * (sqrt(2) if m else 1.0) * legendre_derivative(l, order)
            polynomials[: len(coefficients), column] = coefficients
            azimuth[column] = 2 * order + (1 if m < 0 else 0)
    return polynomials, azimuth


def legendre_derivative(l: int, order: int) -> FloatArray:
    """Coefficients, ascending in z, of the order-th derivative of the Legendre polynomial P_l."""
    coefficients = np.zeros(l + 1)
    for k in range(l // 2 + 1):
        coefficients[l - 2 * k] = (
            (-1) ** k * factorial(2 * l - 2 * k) / (2**l * factorial(k) * factorial(l - k) * factorial(l - 2 * k))
        )
    for _ in range(order):
        coefficients = coefficients[1:] * np.arange(1, len(coefficients))
    return coefficients


@cache
def product_integrals(l_first: int, l_second: int) -> FloatArray:
    """Integrals of three real harmonics over the sphere (real Gaunt coefficients).

    Parameters
    ----------
    l_first, l_second : int
        Degrees of the first two factors.

    Returns
    -------
    integrals : (2*l_first + 1, 2*l_second + 1, (l_first + l_second + 1)**2) ndarray
        Integral of Y_(l_first, m1) Y_(l_second, m2) Y_LM; last axis as in `real_harmonics`.

    Notes
    -----
    The product is a polynomial of degree 2 (l_first + l_second) on the sphere, which Gauss-Legendre nodes in
    cos(theta) and equally spaced azimuths integrate exactly.
    """
    degree = 2 * (l_first + l_second)
    cosines, weights = np.polynomial.legendre.leggauss(degree // 2 + 1)
    azimuths = 2 * pi * np.arange(degree + 1) / (degree + 1)
    sines = np.sqrt(1 - cosines**2)
    directions = np.stack(
        [
            np.outer(sines, np.cos(azimuths)).ravel(),
            np.outer(sines, np.sin(azimuths)).ravel(),
            np.repeat(cosines, len(azimuths)),
        ],
        axis=1,
    )
    weight = np.repeat(weights, len(azimuths)) * 2 * pi / len(azimuths)
    values = real_harmonics(directions, l_first + l_second)
    first = values[:, l_first**2 : (l_first + 1) ** 2]
    second = values[:, l_second**2 : (l_second + 1) ** 2]
    integrals: FloatArray = np.einsum("n,na,nb,nc->abc", weight, first, second, values, optimize=True)
    integrals[np.abs(integrals) < 1e-14] = 0.0
    integrals.setflags(write=False)
    return integrals


def axis_rotations(directions: FloatArray) -> FloatArray:
    """Rotation matrices that carry the z axis to each direction.

    Parameters
    ----------
    directions : (n, 3) ndarray
        Unit vectors.

    Returns
    -------
    rotations : (n, 3, 3) ndarray
        Columns are the images of x, y and z; the third column is the direction. The images of x and y are
        free up to a turn about the direction.
    """
    directions = np.asarray(directions, dtype=np.float64)
    # The coordinate axis least along the direction is never parallel to it.
    helper = np.eye(3)[np.argmin(np.abs(directions), axis=1)]
    x_axis = helper - directions * np.sum(helper * directions, axis=1, keepdims=True)
    x_axis /= np.linalg.norm(x_axis, axis=1, keepdims=True)
    return np.stack([x_axis, np.cross(directions, x_axis), directions], axis=2)


def harmonic_rotations(rotations: FloatArray, l: int) -> FloatArray:
    """Matrices of rotations (or reflections) acting on the real harmonics of degree l.

    Parameters
    ----------
    rotations : (n, 3, 3) ndarray
        Orthogonal matrices.
    l : int
        Degree.

    Returns
    -------
    matrices : (n, 2*l + 1, 2*l + 1) ndarray
        D such that Y_lm(R^T r) = sum_k Y_lk(r) D_km: column m holds the image of Y_lm.

    Notes
    -----
    Y_lm(R^T r) is sampled on a fixed set of directions and projected back by least squares, which is exact
    because the rotated harmonics stay within degree l.
    """
    points, inverse = _sample_directions(l)
    turned = np.einsum("pi,nij->npj", points, rotations)
    values = real_harmonics(turned.reshape(-1, 3), l)[:, l * l :]
    return inverse @ values.reshape(len(rotations), len(points), 2 * l + 1)


@cache
def _sample_directions(l: int) -> tuple[FloatArray, FloatArray]:
    """Directions that determine degree l, and the pseudo-inverse of the harmonics on them."""
    cosines, _ = np.polynomial.legendre.leggauss(l + 2)
    azimuths = 2 * pi * (np.arange(2 * l + 2) + 0.25) / (2 * l + 2)
    sines = np.sqrt(1 - cosines**2)
    points = np.stack(
        [
            np.outer(sines, np.cos(azimuths)).ravel(),
            np.outer(sines, np.sin(azimuths)).ravel(),
            np.repeat(cosines, len(azimuths)),
        ],
        axis=1,
    )
    inverse = np.asarray(np.linalg.pinv(real_harmonics(points, l)[:, l * l :]), dtype=np.float64)
    return points, inverse
