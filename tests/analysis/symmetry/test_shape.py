"""Shape measures against published values, invariances and a search by brute force."""

from itertools import permutations

import numpy as np
import pytest

from ehmo.analysis.symmetry import find_symmetry, shape_measures
from ehmo.analysis.symmetry.shape import SHAPES, ideal_shape

ALL = [name for names in SHAPES.values() for name in names]


def measures(points: np.ndarray) -> dict[str, float]:
    return {measure.shape: measure.measure for measure in shape_measures(points[0], points[1:])}


@pytest.mark.parametrize("name", ALL)
def test_an_ideal_shape_of_any_size_place_orientation_and_numbering_measures_zero(name):
    rng = np.random.default_rng(2)
    turn, _ = np.linalg.qr(rng.normal(size=(3, 3)))
    points = 2.3 * ideal_shape(name) @ turn.T + [1.0, -4.0, 2.0]
    found = measures(np.concatenate([points[:1], rng.permutation(points[1:])]))
    assert found[name] == pytest.approx(0.0, abs=1e-10)
    assert min(found, key=found.get) == name
    assert list(found.values()) == sorted(found.values())


# Alvarez, Avnir, Llunell, Pinsky, New J. Chem. 26, 996 (2002) for six donors; Alvarez, Llunell, J. Chem. Soc., Dalton
# Trans. 2000, 3288 for five; Keinan, Avnir, Inorg. Chem. 40, 318 (2001) for four (all memory).
@pytest.mark.parametrize(
    ("name", "other", "published"),
    [
        ("octahedron", "trigonal prism", 16.73),
        ("tetrahedron", "square plane", 33.33),
        ("trigonal bipyramid", "square pyramid", 5.38),
        ("trigonal bipyramid", "square pyramid (flat base)", 7.34),
    ],
)
def test_distance_of_two_ideal_shapes(name, other, published):
    assert measures(ideal_shape(name))[other] == pytest.approx(published, abs=0.01)
    assert measures(ideal_shape(other))[name] == pytest.approx(published, abs=0.01)


@pytest.mark.parametrize("name", ["square plane", "trigonal bipyramid", "square pyramid"])
def test_no_assignment_is_better_than_the_one_found(name):
    rng = np.random.default_rng(6)
    points = ideal_shape(name) + rng.normal(0, 0.2, ideal_shape(name).shape)
    centred = points - points.mean(axis=0)
    found = measures(points)
    for other in SHAPES[len(points) - 1]:
        ideal = ideal_shape(other)
        best = 100.0
        for order in permutations(range(1, len(points))):
            moved = ideal[[0, *order]]
            left, _, right = np.linalg.svd(centred.T @ moved)
            turn = (left * [1, 1, np.sign(np.linalg.det(left @ right))]) @ right
            fitted = moved @ turn.T
            size = (fitted * centred).sum() / (fitted**2).sum()
            best = min(best, 100 * ((size * fitted - centred) ** 2).sum() / (centred**2).sum())
        assert found[other] == pytest.approx(best, abs=1e-9)


@pytest.mark.parametrize("spread", [3.0, 12.0, 30.0])
def test_flattened_tetrahedron_agrees_with_its_continuous_symmetry_measure(spread):
    # With all donors in one orbit and their centre at the metal, the nearest Td arrangement is the nearest tetrahedron.
    angle = np.radians(54.7356 + spread / 2)
    polar = [(angle, 0.0), (angle, np.pi), (np.pi - angle, np.pi / 2), (np.pi - angle, 3 * np.pi / 2)]
    donors = [(np.sin(t) * np.cos(p), np.sin(t) * np.sin(p), np.cos(t)) for t, p in polar]
    points = 2.0 * np.array([(0.0, 0.0, 0.0), *donors])
    symmetry = find_symmetry(points, [0, 1, 1, 1, 1], origin=0, tolerance_A=0.6)
    assert symmetry.group.name == "Td"
    assert symmetry.continuous_measure == pytest.approx(measures(points)["tetrahedron"], abs=1e-6)


def test_mirror_images_measure_the_same():
    rng = np.random.default_rng(8)
    points = ideal_shape("octahedron") + rng.normal(0, 0.2, (7, 3))
    assert measures(points * [1, 1, -1]) == pytest.approx(measures(points))


def test_coordination_numbers_without_a_shape_give_nothing():
    assert shape_measures(np.zeros(3), np.eye(3)[:1]) == ()
    assert shape_measures(np.zeros(3), np.random.default_rng(0).normal(size=(9, 3))) == ()
