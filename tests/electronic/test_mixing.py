"""Anderson's mixer on maps whose fixed point is known."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.electronic.mixing import AndersonMixer


def iterate(matrix: np.ndarray, offset: np.ndarray, steps: int, **settings) -> np.ndarray:
    mixer = AndersonMixer(np.zeros(len(offset)), **settings)
    for _ in range(steps):
        mixer.update(matrix @ mixer.value + offset)
    return mixer.value


@pytest.mark.parametrize("n", [1, 2, 4, 5])
def test_linear_map_is_solved_in_n_plus_two_steps_walker_ni_2011(n):
    # On a linear map the method equals GMRES: Walker, Ni, SIAM J. Numer. Anal. 49, 1715 (2011) (memory).
    # The map expands, so plain iteration would run away.
    rng = np.random.default_rng(n)
    basis = np.linalg.qr(rng.normal(size=(n, n)))[0]
    matrix = basis @ np.diag(np.linspace(-3.0, 0.5, n)) @ basis.T
    offset = rng.normal(size=n)
    exact = np.linalg.solve(np.eye(n) - matrix, offset)
    np.testing.assert_allclose(iterate(matrix, offset, n + 2), exact, rtol=0, atol=1e-6)


def test_depth_bounds_the_pairs_kept():
    # With one pair in five dimensions the method cannot know the map after seven steps.
    rng = np.random.default_rng(5)
    basis = np.linalg.qr(rng.normal(size=(5, 5)))[0]
    matrix = basis @ np.diag(np.linspace(-3.0, 0.5, 5)) @ basis.T
    offset = rng.normal(size=5)
    exact = np.linalg.solve(np.eye(5) - matrix, offset)
    assert np.abs(iterate(matrix, offset, 7, depth=1) - exact).max() > 1e-3


def test_more_unknowns_than_steps_kept_still_converge():
    rng = np.random.default_rng(8)
    basis = np.linalg.qr(rng.normal(size=(30, 30)))[0]
    matrix = basis @ np.diag(np.linspace(-2.0, 0.7, 30)) @ basis.T
    offset = rng.normal(size=30)
    exact = np.linalg.solve(np.eye(30) - matrix, offset)
    np.testing.assert_allclose(iterate(matrix, offset, 60), exact, rtol=0, atol=1e-7)


def test_first_step_is_the_damped_one():
    mixer = AndersonMixer(np.array([1.0, 2.0]), damping=0.25)
    mixer.update(np.array([3.0, -2.0]))
    np.testing.assert_allclose(mixer.value, [1.5, 1.0], rtol=1e-15)


@pytest.mark.parametrize("residual", [0.0, 1.0], ids=["at the fixed point", "residual that never changes"])
def test_residual_that_does_not_change_is_no_crash(residual):
    mixer = AndersonMixer(np.zeros(3))
    for _ in range(4):
        mixer.update(mixer.value + residual)
    assert np.isfinite(mixer.value).all()
