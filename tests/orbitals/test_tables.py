"""Piecewise polynomials against the quadrature they stand for, and their limits."""

from __future__ import annotations

from itertools import combinations_with_replacement

import numpy as np
import pytest

from basis_params import Shell
from ehmo.conventions import NEGLECTED_OVERLAP
from ehmo.errors import ParameterError
from ehmo.orbitals.quadrature import channel_overlaps
from ehmo.orbitals.radial import orthogonal_radial_functions
from ehmo.orbitals.tables import LOG_STEP, SHORTEST_BOHR, overlap_table, table_positions
from tests.numeric_boxes import shell
from tests.orbitals.closed_overlaps import closed_overlap

ACTINIDE = (
    shell(7, 0, 1.914),
    shell(6, 1, 4.033),
    shell(7, 1, 1.914),
    shell(6, 2, 2.581, 1.207, coefficients=(0.7608, 0.4126)),
    shell(5, 3, 4.943, 2.106, coefficients=(0.7844, 0.3908)),
)
LIGHT = (shell(2, 0, 2.275), shell(2, 1, 2.275))
DIFFUSE = (shell(6, 0, 0.9), shell(6, 1, 0.8), shell(5, 2, 1.0))
HYDROGEN = (shell(1, 0, 1.3),)
SETS = {"actinide": ACTINIDE, "light": LIGHT, "diffuse": DIFFUSE, "1s": HYDROGEN}


def from_table(first: tuple[Shell, ...], second: tuple[Shell, ...], distances: np.ndarray) -> np.ndarray:
    table = overlap_table(first, second)
    segments, powers = table_positions(distances)
    pieces = table.coefficients[np.minimum(segments, len(table.coefficients) - 1)]
    return np.einsum("rk,rkc->rc", powers, pieces)


def by_quadrature(first: tuple[Shell, ...], second: tuple[Shell, ...], distances: np.ndarray) -> np.ndarray:
    pairs = [(a, b) for a in orthogonal_radial_functions(first) for b in orthogonal_radial_functions(second)]
    return np.concatenate([channel_overlaps(a, b, distances) for a, b in pairs], axis=1)


@pytest.mark.parametrize(("a", "b"), list(combinations_with_replacement(SETS, 2)))
def test_table_follows_quadrature_to_1e_11_and_neglects_less_than_it_says(a, b):
    distances = SHORTEST_BOHR * np.exp(np.linspace(0, 5.5, 211) + 1e-9)
    table = from_table(SETS[a], SETS[b], distances)
    exact = by_quadrature(SETS[a], SETS[b], distances)
    kept = table.any(axis=1)
    np.testing.assert_allclose(table[kept], exact[kept], rtol=0, atol=1e-11)
    assert not kept[-1]
    assert np.abs(exact[~kept]).max() < NEGLECTED_OVERLAP


@pytest.mark.parametrize(("n_b", "l_b"), [(1, 0), (2, 1), (3, 2), (5, 3)])
@pytest.mark.parametrize(("n_a", "l_a"), [(2, 0), (2, 1), (5, 2), (4, 3)])
def test_closed_formulas_through_the_table_to_1e_10(n_a, l_a, n_b, l_b):
    distances = np.array([0.71, 1.9, 3.004, 6.6, 14.0])
    values = from_table((shell(n_a, l_a, 2.1),), (shell(n_b, l_b, 1.35),), distances)
    for m in range(min(l_a, l_b) + 1):
        closed = [closed_overlap((n_a, l_a, 2.1), (n_b, l_b, 1.35), m, d) for d in distances]
        np.testing.assert_allclose(values[:, m], closed, rtol=0, atol=1e-10)


def test_pieces_join_without_a_step():
    joints = SHORTEST_BOHR * np.exp(LOG_STEP * np.arange(1, 25))
    below = from_table(ACTINIDE, LIGHT, joints * (1 - 1e-13))
    above = from_table(ACTINIDE, LIGHT, joints * (1 + 1e-13))
    np.testing.assert_allclose(below, above, rtol=0, atol=1e-11)


def test_shortest_distance_falls_into_the_first_piece():
    segments, powers = table_positions(np.array([SHORTEST_BOHR]))
    assert segments[0] == 0
    assert powers[0, 1] == pytest.approx(-1)


def test_table_is_read_only():
    with pytest.raises(ValueError, match="read-only"):
        overlap_table(LIGHT, HYDROGEN).coefficients[0, 0, 0] = 1.0


def test_exponent_too_small_is_refused():
    with pytest.raises(ParameterError, match="exponent"):
        overlap_table((shell(1, 0, 0.01),), (shell(1, 0, 0.01),))


@pytest.mark.parametrize("n", [1, 4, 7])
def test_exponent_that_the_refusal_recommends_is_accepted(n):
    # The message says: use exponents above 0.1 bohr^-1.
    table = overlap_table((shell(n, 0, 0.12),), (shell(n, 0, 0.12),))
    assert np.isfinite(table.coefficients).all()
