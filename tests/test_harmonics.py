"""Real harmonics, their products and rotations against SciPy and angular-momentum algebra."""

from __future__ import annotations

from math import pi, sqrt

import numpy as np
import pytest
from scipy.linalg import expm
from scipy.spatial.transform import Rotation
from scipy.special import sph_harm_y

from ehmo.conventions import ORBITAL_NAMES
from ehmo.harmonics import MAX_L, axis_rotations, harmonic_rotations, product_integrals, real_harmonics
from tests.angular_momentum import complex_gaunt, momentum_matrices, real_from_complex

POLES_AND_AXES = np.array([[0, 0, 1], [0, 0, -1], [1, 0, 0], [0, -1, 0]], dtype=float)


def random_directions(count: int, seed: int = 0) -> np.ndarray:
    vectors = np.random.default_rng(seed).normal(size=(count, 3))
    return vectors / np.linalg.norm(vectors, axis=1, keepdims=True)


def random_orthogonal(seed: int, improper: bool = False) -> np.ndarray:
    return Rotation.random(random_state=seed).as_matrix() * (-1 if improper else 1)


@pytest.mark.parametrize("l", range(MAX_L + 1))
def test_values_against_scipy_sph_harm_y(l):
    directions = np.concatenate([random_directions(60), POLES_AND_AXES])
    theta, phi = np.arccos(directions[:, 2]), np.arctan2(directions[:, 1], directions[:, 0])
    values = real_harmonics(directions, MAX_L)
    for m in range(-l, l + 1):
        complex_value = (-1) ** m * sqrt(2) * sph_harm_y(l, abs(m), theta, phi)
        expected = complex_value.imag if m < 0 else complex_value.real / (1 if m else sqrt(2))
        np.testing.assert_allclose(values[:, l * l + l + m], expected, rtol=0, atol=2e-14 * (2 * l + 1))


@pytest.mark.parametrize("l", range(MAX_L + 1))
def test_addition_theorem_unsoeld_1927(l):
    values = real_harmonics(random_directions(30), l)[:, l * l :]
    np.testing.assert_allclose((values**2).sum(axis=1), (2 * l + 1) / (4 * pi), rtol=1e-13)


def test_names_follow_the_functions_they_stand_for():
    # Law: each name is the polynomial, up to a positive factor (z2 = 3z^2 - r^2 and so on).
    x, y, z = (directions := random_directions(50)).T
    polynomials = {
        "s": 1 + 0 * x,
        "py": y,
        "pz": z,
        "px": x,
        "dxy": x * y,
        "dyz": y * z,
        "dz2": 3 * z**2 - 1,
        "dxz": x * z,
        "dx2-y2": x**2 - y**2,
        "fy(3x2-y2)": y * (3 * x**2 - y**2),
        "fxyz": x * y * z,
        "fyz2": y * (5 * z**2 - 1),
        "fz3": z * (5 * z**2 - 3),
        "fxz2": x * (5 * z**2 - 1),
        "fz(x2-y2)": z * (x**2 - y**2),
        "fx(x2-3y2)": x * (x**2 - 3 * y**2),
    }
    values = real_harmonics(directions, 3)
    for column, name in enumerate(name for names in ORBITAL_NAMES for name in names):
        ratio = values[:, column] / polynomials[name]
        np.testing.assert_allclose(ratio, ratio[0], rtol=1e-10, err_msg=name)
        assert ratio[0] > 0, name


def test_degree_beyond_the_limit_is_refused():
    with pytest.raises(ValueError, match=f"l_max is {MAX_L + 1}"):
        real_harmonics(POLES_AND_AXES, MAX_L + 1)


@pytest.mark.parametrize(("l_a", "l_b"), [(a, b) for a in range(4) for b in range(4)])
def test_product_integrals_from_wigner_3j_gaunt_1929(l_a, l_b):
    integrals = product_integrals(l_a, l_b)
    first, second = real_from_complex(l_a), real_from_complex(l_b)
    for degree in range(l_a + l_b + 1):
        gaunt = np.zeros((2 * l_a + 1, 2 * l_b + 1, 2 * degree + 1))
        for x in range(-l_a, l_a + 1):
            for y in range(-l_b, l_b + 1):
                if abs(x + y) <= degree:
                    value = complex_gaunt((l_a, l_b, degree), (x, y, -x - y))
                    gaunt[l_a + x, l_b + y, degree - x - y] = value
        expected = np.einsum("ax,by,cz,xyz->abc", first, second, real_from_complex(degree), gaunt)
        block = integrals[:, :, degree**2 : (degree + 1) ** 2]
        np.testing.assert_allclose(block, expected, rtol=0, atol=1e-13)


def test_product_integral_of_three_z_functions_by_hand():
    # int Y10 Y10 Y20 = 1/sqrt(5 pi), int Y20^3 = sqrt(5/pi)/7 (elementary integrals of Legendre polynomials).
    assert product_integrals(1, 1)[1, 1, 6] == pytest.approx(1 / sqrt(5 * pi), abs=1e-14)
    assert product_integrals(2, 2)[2, 2, 6] == pytest.approx(sqrt(5 / pi) / 7, abs=1e-14)


@pytest.mark.parametrize("improper", [False, True], ids=["rotation", "improper"])
@pytest.mark.parametrize("l", range(5))
def test_rotation_matrices_turn_the_functions(l, improper):
    rotation = random_orthogonal(3, improper)
    points = random_directions(20, seed=9)
    matrix = harmonic_rotations(rotation[None], l)[0]
    turned = real_harmonics(points @ rotation, l)[:, l * l :]  # Y(R^T r)
    np.testing.assert_allclose(turned, real_harmonics(points, l)[:, l * l :] @ matrix, rtol=0, atol=1e-13)


@pytest.mark.parametrize("improper", [(False, False), (True, False), (True, True)], ids=str)
@pytest.mark.parametrize("l", range(4))
def test_rotation_matrices_are_an_orthogonal_representation(l, improper):
    first, second = random_orthogonal(1, improper[0]), random_orthogonal(2, improper[1])
    a, b, both = harmonic_rotations(np.array([first, second, first @ second]), l)
    np.testing.assert_allclose(a @ a.T, np.eye(2 * l + 1), rtol=0, atol=1e-13)
    np.testing.assert_allclose(a @ b, both, rtol=0, atol=1e-13)
    np.testing.assert_allclose(harmonic_rotations(np.eye(3)[None], l)[0], np.eye(2 * l + 1), rtol=0, atol=1e-13)


@pytest.mark.parametrize("l", range(4))
def test_inversion_multiplies_by_the_parity(l):
    matrix = harmonic_rotations(-np.eye(3)[None], l)[0]
    np.testing.assert_allclose(matrix, (-1) ** l * np.eye(2 * l + 1), rtol=0, atol=1e-13)


@pytest.mark.parametrize("l", range(4))
def test_rotation_is_the_exponential_of_angular_momentum(l):
    # D(n, angle) = exp(-i angle n.L), Wigner 1931.
    axis, angle = random_directions(1, seed=4)[0], 0.83
    generator = np.einsum("i,ijk->jk", axis, momentum_matrices(l))
    expected = expm(-1j * angle * generator)
    assert np.abs(expected.imag).max() < 1e-12
    matrix = harmonic_rotations(Rotation.from_rotvec(angle * axis).as_matrix()[None], l)[0]
    np.testing.assert_allclose(matrix, expected.real, rtol=0, atol=1e-12)


@pytest.mark.parametrize("l", range(4))
def test_character_of_a_rotation(l):
    # Law: chi = sin((l + 1/2) angle) / sin(angle / 2).
    for angle in (0.3, 1.1, 2.9):
        rotation = Rotation.from_rotvec(angle * random_directions(1, seed=6)[0]).as_matrix()
        character = np.trace(harmonic_rotations(rotation[None], l)[0])
        assert character == pytest.approx(np.sin((l + 0.5) * angle) / np.sin(angle / 2), abs=1e-12)


def test_axis_rotations_are_proper_and_end_on_the_direction():
    directions = np.concatenate([random_directions(50, seed=2), POLES_AND_AXES, -POLES_AND_AXES])
    rotations = axis_rotations(directions)
    np.testing.assert_allclose(rotations[:, :, 2], directions, rtol=0, atol=1e-15)
    np.testing.assert_allclose(np.linalg.det(rotations), 1, rtol=1e-13)
    np.testing.assert_allclose(
        rotations @ rotations.swapaxes(1, 2), np.broadcast_to(np.eye(3), rotations.shape), rtol=0, atol=1e-14
    )
