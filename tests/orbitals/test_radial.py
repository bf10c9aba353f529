"""One-centre radial functions."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad

from ehmo.errors import ParameterError
from ehmo.orbitals.radial import orthogonal_radial_functions, radial_function
from tests.numeric_boxes import shell

# Double-zeta 3d of vanadium as commonly tabulated (memory); here only a shape.
DOUBLE_ZETA = shell(3, 2, 4.75, 1.7, coefficients=(0.4755, 0.7052))


def value(function, r):
    return sum(weight * r ** (n - 1) * np.exp(-zeta * r) for n, zeta, weight in function.primitives)


@pytest.mark.parametrize(
    "entry", [shell(1, 0, 1.3), shell(7, 0, 1.9), shell(5, 3, 4.0), DOUBLE_ZETA], ids=lambda s: s.label
)
def test_norm_is_one_by_scipy_quadrature(entry):
    function = radial_function(entry)
    norm, _ = quad(lambda r: (r * value(function, r)) ** 2, 0, 60, epsabs=1e-13, limit=200)
    assert norm == pytest.approx(1, abs=1e-11)
    assert function.overlap(function) == pytest.approx(1, abs=1e-14)


def test_one_centre_overlap_by_scipy_quadrature():
    first, second = radial_function(shell(6, 1, 4.0)), radial_function(shell(7, 1, 1.6))
    expected, _ = quad(lambda r: r * r * value(first, r) * value(second, r), 0, 80, epsabs=1e-13, limit=200)
    assert first.overlap(second) == pytest.approx(expected, abs=1e-11)


def test_schmidt_orthogonalisation_keeps_the_innermost_shell_and_the_order_given():
    shells = (shell(7, 1, 1.6), shell(5, 1, 5.0), shell(6, 1, 3.0), shell(6, 0, 2.0))
    functions = orthogonal_radial_functions(shells)
    p = functions[:3]
    overlaps = np.array([[a.overlap(b) for b in p] for a in p])
    np.testing.assert_allclose(overlaps, np.eye(3), rtol=0, atol=1e-12)
    np.testing.assert_allclose(functions[1].primitives, radial_function(shells[1]).primitives, rtol=1e-14)
    np.testing.assert_allclose(functions[3].primitives, radial_function(shells[3]).primitives, rtol=1e-14)
    assert [f.l for f in functions] == [1, 1, 1, 0]


def test_the_same_shell_twice_is_refused():
    with pytest.raises(ParameterError):
        orthogonal_radial_functions((shell(2, 1, 1.5), shell(2, 1, 1.5)))
