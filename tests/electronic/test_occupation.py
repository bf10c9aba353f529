"""Aufbau, Pauli, Hund, and equal shares within degenerate sets."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ehmo.conventions import DEGENERACY_TOLERANCE_EV
from ehmo.electronic.occupation import fill, fill_smeared, frontier_set
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


def test_smeared_filling_is_fermi_dirac_about_a_common_level():
    # Law: with f = 1/(1 + exp((e - mu)/kT)) the difference of two logits is the difference of energies over kT.
    energies, width = np.array([-12.0, -11.99, -11.95, -9.0]), 0.02
    alpha, beta = fill_smeared(energies, 3, 1, width)
    for occupation, electrons in ((alpha, 2), (beta, 1)):
        assert occupation.sum() == pytest.approx(electrons, abs=1e-10)
        logits = np.log(occupation[:3] / (1 - occupation[:3]))
        np.testing.assert_allclose(np.diff(logits), -np.diff(energies[:3]) / width, rtol=1e-6)
    assert beta[3] < 1e-12


@pytest.mark.parametrize(("n_electrons", "unpaired"), [(1, 1), (4, 0), (5, 3), (10, 0)])
def test_narrow_smearing_equals_sharp_filling(n_electrons, unpaired):
    energies = np.array([-3.0, -2.0, -1.0, 0.0, 1.0])
    np.testing.assert_allclose(
        fill_smeared(energies, n_electrons, unpaired, 1e-3), fill(energies, n_electrons, unpaired), atol=1e-12
    )
