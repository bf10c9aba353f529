"""Spin-orbit levels against closed formulas of free ions and of t2g shells."""

from __future__ import annotations

from collections import Counter

import numpy as np
import pytest

from ehmo.analysis.multiplets import free_ion_terms, orbital_momentum, spin_orbit_states
from ehmo.analysis.multiplets.spin_orbit import ground_multiplet
from ehmo.records.multiplets import ElectronRepulsion
from tests.analysis.multiplets.fields import (
    n_determinants,
    octahedral_eV,
    racah,
    random_field_eV,
    tetragonal_eV,
    turned,
)

D, F = np.zeros((5, 5)), np.zeros((7, 7))
REPULSION = {2: racah(900, 4000), 3: ElectronRepulsion(52000.0, 41000.0, 28000.0)}


@pytest.mark.parametrize(
    ("field", "n_electrons", "degeneracies"), [(D, 1, [4, 6]), (D, 9, [6, 4]), (F, 1, [6, 8]), (F, 13, [8, 6])]
)
def test_one_electron_splits_by_the_interval_rule_and_one_hole_inverts_it(field, n_electrons, degeneracies):
    # zeta (l + 1/2) between j = l - 1/2 and l + 1/2: Condon & Shortley 1935 (memory).
    zeta = 800.0
    energies, found = spin_orbit_states(field, n_electrons, None, zeta).levels
    np.testing.assert_allclose(energies, [0, zeta * len(field) / 2], rtol=0, atol=1e-6)
    assert found.tolist() == degeneracies


@pytest.mark.parametrize(
    ("n_electrons", "l", "s", "sign"), [(2, 3, 1, 1), (3, 3, 1.5, 1), (4, 2, 2, 1), (6, 2, 2, -1), (7, 3, 1.5, -1)]
)
def test_lande_interval_rule_of_the_ground_term(n_electrons, l, s, sign):
    # E(J) - E(J-1) = lambda J with lambda = +-zeta / 2S for a shell less / more than half full: Condon & Shortley 1935
    # (memory). The rule is of first order: zeta is small against the repulsion.
    zeta = 0.5
    energies, degeneracies = spin_orbit_states(D, n_electrons, REPULSION[2], zeta).levels
    js = np.arange(abs(l - s), l + s + 1)[::sign]
    assert degeneracies[: len(js)].tolist() == (2 * js + 1).tolist()
    expected = sign * zeta / (2 * s) * (js * (js + 1) - js[0] * (js[0] + 1)) / 2
    np.testing.assert_allclose(energies[: len(js)], expected, rtol=2e-3, atol=1e-9)


@pytest.mark.parametrize(("l", "n_electrons"), [(2, 2), (2, 3), (2, 5), (2, 8), (3, 2), (3, 3)])
def test_levels_of_a_free_ion_are_the_J_of_its_terms(l, n_electrons):
    # Vector model: each term 2S+1 L gives J = |L-S| .. L+S.
    field = D if l == 2 else F
    _, degeneracies = spin_orbit_states(field, n_electrons, REPULSION[l], 450.0).levels
    expected = Counter()
    for term in free_ion_terms(l, n_electrons, REPULSION[l]).terms:
        two_l, two_s = term.degeneracy - 1, term.multiplicity - 1
        expected.update(two_j + 1 for two_j in range(abs(two_l - two_s), two_l + two_s + 1, 2))
    assert Counter(degeneracies.tolist()) == expected


def test_levels_of_f2_in_intermediate_coupling_keep_their_trace():
    # Sum rule: spin-orbit coupling has no trace over all states.
    states = spin_orbit_states(F, 2, REPULSION[3], 1900.0)
    without = spin_orbit_states(F, 2, REPULSION[3], 0.0)
    matrix = (states.vectors * states.energies_per_cm) @ states.vectors.conj().T
    shift = np.trace(matrix).real / len(matrix) - np.mean(without.energies_per_cm)
    # Both have their own zero: the ground level moves by what the mean seems to.
    assert shift > 0
    assert states.levels[1][0] == 9  # 3H4


@pytest.mark.parametrize(("n_electrons", "degeneracies"), [(1, [4, 2]), (5, [2, 4])])
def test_t2g_shell_splits_by_three_halves_of_zeta(n_electrons, degeneracies):
    # Kotani, J. Phys. Soc. Jpn. 4, 293 (1949); Griffith 1961 (memory). eg far away: the field is immense.
    zeta = 400.0
    states = spin_orbit_states(octahedral_eV(5e6), n_electrons, REPULSION[2], zeta)
    energies, found = states.levels
    assert found[:2].tolist() == degeneracies
    assert energies[1] - energies[0] == pytest.approx(1.5 * zeta, rel=4e-3)


def test_reduction_scales_the_splitting():
    half = spin_orbit_states(octahedral_eV(5e6), 1, None, 400.0, 0.5 * orbital_momentum(2)).levels[0]
    assert half[1] == pytest.approx(300, rel=1e-3)


@pytest.mark.parametrize("n_electrons", [1, 3, 5, 7, 9])
def test_odd_electrons_leave_kramers_pairs_in_any_field(n_electrons):
    states = spin_orbit_states(random_field_eV(5, n_electrons), n_electrons, REPULSION[2], 600.0)
    assert set(states.levels[1].tolist()) == {2}


@pytest.mark.parametrize("n_electrons", [2, 4, 8])
def test_even_electrons_can_split_completely(n_electrons):
    states = spin_orbit_states(random_field_eV(5, n_electrons), n_electrons, REPULSION[2], 600.0)
    assert set(states.levels[1].tolist()) == {1}


@pytest.mark.parametrize("n_electrons", range(1, 10))
def test_holes_are_electrons_with_field_and_coupling_reversed(n_electrons):
    field = random_field_eV(5, 3)
    electrons = spin_orbit_states(field, n_electrons, REPULSION[2], 500.0).energies_per_cm
    holes = spin_orbit_states(-field, 10 - n_electrons, REPULSION[2], -500.0).energies_per_cm
    np.testing.assert_allclose(electrons, holes, rtol=0, atol=1e-6)
    assert len(electrons) == n_determinants(2, n_electrons)


def test_levels_do_not_depend_on_how_the_molecule_lies():
    rotation = np.linalg.qr(np.random.default_rng(1).normal(size=(3, 3)))[0]
    field = tetragonal_eV(b1=15000, a1=26000, b2=0, e=9000)
    straight = spin_orbit_states(field, 3, REPULSION[2], 300.0).energies_per_cm
    askew = spin_orbit_states(turned(field, rotation), 3, REPULSION[2], 300.0).energies_per_cm
    np.testing.assert_allclose(straight, askew, rtol=0, atol=1e-6)


@pytest.mark.parametrize("n_electrons", [2, 3, 5, 7])
def test_without_coupling_the_lowest_states_are_the_spin_components_of_the_ground_term(n_electrons):
    field = random_field_eV(5, 6, width_per_cm=2000)
    states = spin_orbit_states(field, n_electrons, REPULSION[2], 0.0)
    ground = ground_multiplet(field, n_electrons, REPULSION[2])
    size = ground.two_s + 1
    np.testing.assert_allclose(ground.vectors.T @ ground.vectors, np.eye(size), rtol=0, atol=1e-10)
    inside = ground.vectors.T @ states.vectors[:, :size]
    np.testing.assert_allclose(inside @ inside.conj().T, np.eye(size), rtol=0, atol=1e-8)
    assert states.levels[1][0] == size
