"""Two-centre integrals against closed formulas."""

from __future__ import annotations

from itertools import product
from math import exp, sqrt

import numpy as np
import pytest

from ehmo.orbitals.quadrature import channel_overlaps
from ehmo.orbitals.radial import radial_function
from tests.numeric_boxes import shell
from tests.orbitals.closed_overlaps import closed_overlap

Function = tuple[int, int, float]


def quadrature(a: Function, b: Function, m: int, distance: float) -> float:
    functions = [radial_function(shell(*f)) for f in (a, b)]
    return float(channel_overlaps(*functions, np.array([distance]))[0, m])


# Mulliken, Rieke, Orloff, Orloff, J. Chem. Phys. 17, 1248 (1949), equal exponents, p = zeta R (memory; each was
# checked against the 60-digit formula of closed_overlaps). Their axes face each other, ours are parallel: a p
# function of the second atom changes sign in sigma.
MULLIKEN_1949 = {
    "1s-1s": ((1, 0), (1, 0), 0, lambda p: 1 + p + p**2 / 3),
    "1s-2s": ((1, 0), (2, 0), 0, lambda p: sqrt(3) / 2 * (1 + p + 4 * p**2 / 9 + p**3 / 9)),
    "1s-2p sigma": ((1, 0), (2, 1), 0, lambda p: -p / 2 * (1 + p + p**2 / 3)),
    "2s-2s": ((2, 0), (2, 0), 0, lambda p: 1 + p + 4 * p**2 / 9 + p**3 / 9 + p**4 / 45),
    "2p-2p pi": ((2, 1), (2, 1), 1, lambda p: 1 + p + 2 * p**2 / 5 + p**3 / 15),
    "2p-2p sigma": ((2, 1), (2, 1), 0, lambda p: 1 + p + p**2 / 5 - 2 * p**3 / 15 - p**4 / 15),
}


@pytest.mark.parametrize("p", [0.5, 1.0, 2.3, 5.0, 12.0])
@pytest.mark.parametrize("pair", MULLIKEN_1949)
def test_equal_exponents_mulliken_rieke_orloff_orloff_1949(pair, p):
    a, b, m, polynomial = MULLIKEN_1949[pair]
    for zeta in (0.7, 2.275):
        value = quadrature((*a, zeta), (*b, zeta), m, p / zeta)
        assert value == pytest.approx(exp(-p) * polynomial(p), rel=0, abs=1e-12)


@pytest.mark.parametrize("p", [0.8, 2.0, 6.0])
@pytest.mark.parametrize("t", [0.2, -0.35, 0.6])
def test_1s_1s_unequal_exponents_mulliken_1949(p, t):
    # S = sqrt(1 - t^2)/(t p) [-(1-k)(2(1+k) + pa) exp(-pa) + (1+k)(2(1-k) + pb) exp(-pb)], k = (t + 1/t)/2 (memory).
    k, pa, pb = (t + 1 / t) / 2, (1 + t) * p, (1 - t) * p
    expected = -(1 - k) * (2 * (1 + k) + pa) * exp(-pa) + (1 + k) * (2 * (1 - k) + pb) * exp(-pb)
    value = quadrature((1, 0, 1 + t), (1, 0, 1 - t), 0, p)
    assert value == pytest.approx(sqrt(1 - t * t) / (t * p) * expected, rel=0, abs=1e-12)


@pytest.mark.parametrize("ratio", [1.0, 1 + 1e-9, 1.01, 2.7], ids="exponent ratio {}".format)
@pytest.mark.parametrize(("n_a", "l_a"), [(1, 0), (6, 0), (7, 0), (2, 1), (6, 1), (3, 2), (5, 2), (4, 3), (5, 3)])
def test_a_and_b_integrals_with_60_digits(n_a, l_a, ratio):
    for (n_b, l_b), distance in product([(1, 0), (7, 0), (2, 1), (7, 1), (3, 2), (5, 3)], [0.7, 3.1, 11.0]):
        for m in range(min(l_a, l_b) + 1):
            a, b = (n_a, l_a, 1.4), (n_b, l_b, 1.4 * ratio)
            assert quadrature(a, b, m, distance) == pytest.approx(closed_overlap(a, b, m, distance), rel=0, abs=1e-12)


@pytest.mark.parametrize("distance", [0.7, 3.0, 10.0, 25.0])
def test_tight_d_with_diffuse_s_keeps_1e_12(distance):
    # The nodes in nu must resolve exp(-q nu) with q = (9 - 0.65) R/2, up to 104.
    a, b = (3, 2, 9.0), (6, 0, 0.65)
    assert quadrature(a, b, 0, distance) == pytest.approx(closed_overlap(a, b, 0, distance), rel=0, abs=1e-12)


@pytest.mark.parametrize(("l_a", "l_b"), [(a, b) for a in range(4) for b in range(4)])
def test_exchange_of_centres_gives_the_parity_of_both_functions(l_a, l_b):
    # Law: seen from the other end z turns round, so S_ba = (-1)^(l_a + l_b) S_ab.
    a, b = radial_function(shell(5, l_a, 1.9)), radial_function(shell(4, l_b, 1.1))
    distances = np.array([0.9, 3.3, 7.0])
    forward, backward = channel_overlaps(a, b, distances), channel_overlaps(b, a, distances)
    np.testing.assert_allclose(backward, (-1) ** (l_a + l_b) * forward, rtol=0, atol=1e-13)


@pytest.mark.parametrize(("n", "l"), [(1, 0), (7, 0), (6, 1), (5, 2), (5, 3)])
def test_identical_functions_overlap_towards_one_at_short_distance(n, l):
    # Law: S -> 1 - O(R^2), so a tenth of R leaves a hundredth of 1 - S.
    function = radial_function(shell(n, l, 1.5))
    deficit = 1 - channel_overlaps(function, function, np.array([1e-2, 1e-3]))
    assert (deficit > 0).all()
    np.testing.assert_allclose(deficit[0] / deficit[1], 100, rtol=0.03)
