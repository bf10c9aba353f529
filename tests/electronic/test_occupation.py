"""Aufbau, Pauli, Hund, and equal shares within degenerate sets."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ehmo.conventions import DEGENERACY_TOLERANCE_EV
from ehmo.electronic.occupation import fill, frontier_set
from ehmo.errors import ElectronCountError

T2_BELOW_E = np.array([-10.0, -10.0, -10.0, -9.0, -9.0])


@pytest.mark.parametrize(
    ("n_electrons", "unpaired", "alpha", "beta"),
    [
        (1, 1, [1 / 3] * 3 + [0, 0], [0] * 5),
        (2, 2, [2 / 3] * 3 + [0, 0], [0] * 5),
        (2, 0, [1 / 3] * 3 + [0, 0], [1 / 3] * 3 + [0, 0]),
        (3, 3, [1] * 3 + [0, 0], [0] * 5),
        (4, 4, [1] * 3 + [1 / 2] * 2, [0] * 5),
        (5, 5, [1] * 5, [0] * 5),
        (5, 1, [1] * 3 + [0, 0], [2 / 3] * 3 + [0, 0]),
        (6, 4, [1] * 5, [1 / 3] * 3 + [0, 0]),
        (10, 0, [1] * 5, [1] * 5),
    ],
)
def test_d_shell_of_an_octahedron_high_and_low_spin(n_electrons, unpaired, alpha, beta):
    np.testing.assert_allclose(fill(T2_BELOW_E, n_electrons, unpaired), [alpha, beta], rtol=0, atol=1e-15)


@given(
    gaps=st.lists(st.sampled_from([0.0, 1e-6, 0.5 * DEGENERACY_TOLERANCE_EV, 0.01, 1.0]), min_size=1, max_size=14),
    data=st.data(),
)
def test_count_spin_and_pauli_limit_hold_for_any_levels(gaps, data):
    energies = -20 + np.cumsum(gaps)
    n_beta = data.draw(st.integers(0, len(energies)))
    n_alpha = data.draw(st.integers(max(1, n_beta), len(energies)))
    alpha, beta = fill(energies, n_alpha + n_beta, n_alpha - n_beta)
    assert alpha.sum() == pytest.approx(n_alpha, abs=1e-12)
    assert beta.sum() == pytest.approx(n_beta, abs=1e-12)
    for spin in (alpha, beta):
        assert (spin >= 0).all()
        assert (spin <= 1).all()
        assert (np.diff(spin) <= 0).all()
        partial = (spin > 0) & (spin < 1)
        if partial.any():
            assert np.ptp(spin[partial]) == 0
    assert (alpha >= beta).all()


def test_sharing_reaches_just_as_far_as_the_tolerance():
    for gap, shared in ((0.9 * DEGENERACY_TOLERANCE_EV, True), (1.1 * DEGENERACY_TOLERANCE_EV, False)):
        alpha, _ = fill(np.array([-1.0, -1.0 + gap]), 1, 1)
        assert (alpha[1] > 0) is np.bool_(shared)


def test_frontier_set_joins_levels_by_small_steps():
    energies = np.array([-5.0, -3.0, -2.99, -2.98, -1.0])
    assert frontier_set(energies, 2, 0.02) == (1, 4)
    assert frontier_set(energies, 0, 0.02) == (0, 1)
    assert frontier_set(energies, 4, 0.02) == (4, 5)


@pytest.mark.parametrize(
    ("n_electrons", "unpaired", "message"),
    [
        (3, 0, "3 valence electrons cannot have 0 unpaired"),
        (2, 1, "2 valence electrons cannot have 1 unpaired"),
        (2, 4, "2 valence electrons cannot have 4 unpaired"),
        (2, -2, "2 valence electrons cannot have -2 unpaired"),
        (-2, 0, "-2 valence electrons"),
        (11, 1, "6 electrons of one spin do not fit into 5 orbitals"),
        (6, 6, "6 electrons of one spin do not fit into 5 orbitals"),
    ],
)
def test_electrons_that_do_not_fit_are_refused_in_words(n_electrons, unpaired, message):
    with pytest.raises(ElectronCountError, match=message):
        fill(T2_BELOW_E, n_electrons, unpaired)


@pytest.mark.parametrize(("n_electrons", "unpaired"), [(3, 0), (2, 4), (-2, 0), (11, 1)])
def test_refusal_states_a_mend(n_electrons, unpaired):
    with pytest.raises(ElectronCountError) as caught:
        fill(T2_BELOW_E, n_electrons, unpaired)
    assert caught.value.mend
