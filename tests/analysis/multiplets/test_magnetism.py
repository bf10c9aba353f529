"""Moments, zero-field splittings and g tensors against closed formulas and finite fields."""

from __future__ import annotations

from math import exp, sqrt

import numpy as np
import pytest
from scipy.linalg import expm
from scipy.spatial.transform import Rotation

from ehmo.analysis.multiplets import (
    d1_square_pyramid_g,
    effective_moment,
    magnetic_properties,
    octahedral_g,
    orbital_momentum,
    reduced_momentum,
    spin_only_moment,
    spin_orbit_states,
)
from ehmo.analysis.multiplets.effective_spin import spin_matrices, spin_splitting
from ehmo.analysis.multiplets.magnetism import moment_operators
from ehmo.units import BOLTZMANN_PER_CM_K, ELECTRON_G
from tests.analysis.multiplets.fields import octahedral_eV, racah, random_field_eV, tetragonal_eV, turned

REPULSION = racah(900, 4000)
PYRAMID = {"b1": 16000, "a1": 30000, "b2": 0, "e": 13000}


@pytest.mark.parametrize(("unpaired", "moment"), [(0, 0.0), (1, 1.73), (2, 2.83), (3, 3.87), (4, 4.90), (5, 5.92)])
def test_spin_only_moments(unpaired, moment):
    # Figgis & Lewis, Prog. Inorg. Chem. 6, 37 (1964) (memory).
    assert spin_only_moment(unpaired) == pytest.approx(moment, abs=0.005)


@pytest.mark.parametrize("temperature", [1.0, 50.0, 300.0])
@pytest.mark.parametrize(("n_electrons", "two_s"), [(3, 3), (5, 5), (8, 2)])
def test_without_coupling_and_orbital_moment_the_spin_alone_counts(n_electrons, two_s, temperature):
    none = 0.0 * orbital_momentum(2)
    states = spin_orbit_states(octahedral_eV(10000), n_electrons, REPULSION, 0.0, none)
    expected = ELECTRON_G / 2 * spin_only_moment(two_s)
    assert effective_moment(states, temperature) == pytest.approx(expected, abs=1e-6)


# J of the ground level by Hund's rules, with L and S.
HUND = [
    (1, 2, 0.5, 1.5),
    (2, 3, 1, 2),
    (3, 3, 1.5, 1.5),
    (6, 2, 2, 4),
    (7, 3, 1.5, 4.5),
    (8, 3, 1, 4),
    (9, 2, 0.5, 2.5),
]


@pytest.mark.parametrize(("n_electrons", "l", "s", "j"), HUND)
def test_cold_free_ions_have_the_moment_of_lande(n_electrons, l, s, j):
    # g_J [J(J+1)]^(1/2) with g_J = 1 + (g_e - 1)[J(J+1) + S(S+1) - L(L+1)] / 2J(J+1): Van Vleck 1932 (memory).
    states = spin_orbit_states(np.zeros((5, 5)), n_electrons, REPULSION, 20.0)
    g = 1 + (ELECTRON_G - 1) * (j * (j + 1) + s * (s + 1) - l * (l + 1)) / (2 * j * (j + 1))
    assert effective_moment(states, 0.002) == pytest.approx(g * sqrt(j * (j + 1)), rel=5e-4)


@pytest.mark.parametrize("x", [0.2, 1.0, 3.0, 10.0])
def test_t2g1_follows_kotani(x):
    # mu^2 = [8 + (3x - 8) exp(-3x/2)] / x [2 + exp(-3x/2)], x = zeta/kT, g_e taken as 2: Kotani 1949 (memory).
    zeta = 400.0
    states = spin_orbit_states(octahedral_eV(5e7), 1, None, zeta)
    temperature = zeta / (BOLTZMANN_PER_CM_K * x)
    damping = exp(-1.5 * x)
    expected = (8 + (3 * x - 8) * damping) / (x * (2 + damping))
    assert effective_moment(states, temperature) == pytest.approx(sqrt(expected), rel=3e-3)


def test_t2g1_has_no_moment_in_the_cold():
    # Kotani 1949 (memory): spin and orbital moment of the quartet cancel for k = 1, not for k < 1.
    cold = 0.01
    whole = spin_orbit_states(octahedral_eV(5e7), 1, None, 400.0)
    assert effective_moment(whole, cold) < 0.02
    reduced = spin_orbit_states(octahedral_eV(5e7), 1, None, 400.0, 0.8 * orbital_momentum(2))
    assert effective_moment(reduced, cold) > 0.2


def test_t2g4_has_only_temperature_independent_paramagnetism():
    # J = 0 ground level: mu falls as T^(1/2) (Kotani 1949; memory).
    states = spin_orbit_states(octahedral_eV(40000), 4, racah(500, 2000), 3000.0)
    one, four = effective_moment(states, np.array([10.0, 40.0]))
    assert states.levels[1][0] == 1
    assert four / one == pytest.approx(2, rel=1e-6)


@pytest.mark.parametrize(
    ("ion", "n_electrons", "B", "delta", "zeta", "lower", "upper"),
    [
        # Ranges at room temperature for octahedral complexes: Figgis & Lewis 1964 (memory); B and delta of aqua ions,
        # orbital reduction 0.9 (common practice).
        ("Cr(III)", 3, 725, 17400, 275, 3.7, 3.9),
        ("Mn(II)", 5, 850, 7800, 300, 5.65, 6.1),
        ("Fe(II)", 6, 900, 10400, 400, 5.0, 5.7),
        ("Co(II)", 7, 880, 9300, 515, 4.3, 5.4),
        ("Ni(II)", 8, 930, 8500, 630, 2.8, 3.5),
        ("Cu(II)", 9, 1000, 12000, 830, 1.7, 2.2),
    ],
)
def test_room_temperature_moments_lie_in_the_observed_range(ion, n_electrons, B, delta, zeta, lower, upper):
    result = magnetic_properties(octahedral_eV(delta), n_electrons, racah(B, 4.5 * B), zeta, 0.9 * orbital_momentum(2))
    assert lower < result.effective_moment < upper
    assert result.temperature_K == 298.15


@pytest.mark.parametrize(("n_electrons", "temperature"), [(1, 298.15), (2, 80.0), (3, 298.15), (7, 20.0)])
def test_effective_moment_against_the_free_energy_in_a_finite_field(n_electrons, temperature):
    # chi = -d2F/dB2 by differences, F from the eigenvalues in the field: independent of Van Vleck's expansion.
    states = spin_orbit_states(random_field_eV(5, 8, width_per_cm=1500), n_electrons, REPULSION, 500.0)
    kT = BOLTZMANN_PER_CM_K * temperature
    step = 0.05 * kT
    zero_field = (states.vectors * states.energies_per_cm) @ states.vectors.conj().T

    def free_energy(field, moment):
        levels = np.linalg.eigvalsh(zero_field + field * moment)
        return levels[0] - kT * np.log(np.sum(np.exp(-(levels - levels[0]) / kT)))

    total = 0.0
    for moment in moment_operators(states):
        values = [free_energy(k * step, moment) for k in (-2, -1, 0, 1, 2)]
        # Five-point second derivative.
        total -= np.dot([-1 / 12, 4 / 3, -5 / 2, 4 / 3, -1 / 12], values) / step**2
    assert effective_moment(states, temperature) == pytest.approx(sqrt(kT * total), rel=1e-4)


def test_g_of_a_vanadyl_like_ion_approaches_the_first_order_formulas():
    # g_par = g_e - 8 zeta/E(b1), g_perp = g_e - 2 zeta/E(e); the rest falls with zeta^2.
    errors = []
    for zeta in (2.0, 20.0, 200.0):
        g = magnetic_properties(tetragonal_eV(**PYRAMID), 1, None, zeta).g_tensor
        parallel, perpendicular = d1_square_pyramid_g(zeta, 16000, 13000)
        found = g.along([0, 0, 1]), g.along([1, 0, 0])
        assert g.along([0, 1, 0]) == pytest.approx(found[1], abs=1e-9)
        errors.append(max(abs(found[0] - parallel), abs(found[1] - perpendicular)))
        assert abs(found[0] - parallel) < 0.05 * (ELECTRON_G - parallel)
        assert abs(found[1] - perpendicular) < 0.1 * (ELECTRON_G - perpendicular)
    assert errors[1] == pytest.approx(100 * errors[0], rel=0.1)
    assert errors[2] == pytest.approx(100 * errors[1], rel=0.1)


def test_metal_shares_enter_g_as_in_the_first_order_formulas():
    shares = {"xy": 0.9, "xz": 0.8, "x2-y2": 0.7}
    momentum = reduced_momentum(2, np.eye(5), np.array([0.9, 0.8, 0.75, 0.8, 0.7]))
    g = magnetic_properties(tetragonal_eV(**PYRAMID), 1, None, 5.0, momentum).g_tensor
    parallel, perpendicular = d1_square_pyramid_g(5.0, 16000, 13000, shares["xy"], shares["x2-y2"], shares["xz"])
    assert g.along([0, 0, 1]) - ELECTRON_G == pytest.approx(parallel - ELECTRON_G, rel=2e-3)
    assert g.along([1, 0, 0]) - ELECTRON_G == pytest.approx(perpendicular - ELECTRON_G, rel=2e-3)


def test_g_values_of_vanadyl_are_of_the_observed_size():
    # Aqua vanadyl: g_par 1.933, g_perp 1.981 (Ballhausen & Gray 1962; memory). Metal shares of 0.9 and a free-ion zeta
    # near 250 are common practice.
    momentum = 0.9 * orbital_momentum(2)
    g = magnetic_properties(tetragonal_eV(**PYRAMID), 1, None, 200.0, momentum).g_tensor
    assert g.along([0, 0, 1]) == pytest.approx(1.933, abs=0.02)
    assert g.along([1, 0, 0]) == pytest.approx(1.981, abs=0.015)


@pytest.mark.parametrize(("n_electrons", "sign_and_spin"), [(3, 3), (8, -2)])
@pytest.mark.parametrize("k", [1.0, 0.7])
def test_octahedral_g_approaches_its_first_order_formula(n_electrons, sign_and_spin, k):
    # g_e - 8 k^2 lambda/delta, lambda = zeta/3 of d3 and -zeta/2 of d8 (Ballhausen 1962; memory). 4T2g of d3 and
    # 3T2g of d8 lie at delta exactly.
    zeta, delta = 2.0, 15000.0
    momentum = k * orbital_momentum(2)
    result = magnetic_properties(octahedral_eV(delta), n_electrons, REPULSION, zeta, momentum)
    shift = octahedral_g(zeta / sign_and_spin, delta, k) - ELECTRON_G
    np.testing.assert_allclose(result.g_tensor.values - ELECTRON_G, shift, rtol=3e-3)
    assert result.g_tensor.effective_spin == abs(sign_and_spin) / 2
    assert result.zero_field_splitting.D_per_cm == 0
    assert result.zero_field_splitting.E_per_cm == 0


@pytest.mark.parametrize(("n_electrons", "sign_and_spin"), [(3, 3), (8, -2)])
def test_D_goes_with_the_anisotropy_of_g(n_electrons, sign_and_spin):
    # D = lambda (g_par - g_perp)/2 where only the ground L S term couples: Abragam & Bleaney 1970 (memory). The other
    # terms are moved away by an immense repulsion.
    zeta = 5.0
    field = tetragonal_eV(b1=15000, a1=13000, b2=0, e=1500)
    result = magnetic_properties(field, n_electrons, racah(3e7, 1.3e8), zeta)
    split, g = result.zero_field_splitting, result.g_tensor
    expected = zeta / sign_and_spin * (g.along([0, 0, 1]) - g.along([1, 0, 0])) / 2
    assert split.D_per_cm == pytest.approx(expected, rel=1e-2)
    assert abs(split.E_per_cm) < 1e-9
    np.testing.assert_allclose(split.axes, np.eye(3), rtol=0, atol=1e-3)


@pytest.mark.parametrize("spin", [1.0, 1.5, 2.0, 2.5])
@pytest.mark.parametrize(("D", "E"), [(2.5, 0.4), (-3.0, -0.9), (0.8, 0.0)])
def test_splitting_of_a_given_spin_hamiltonian_is_recovered(spin, D, E):
    s = spin_matrices(round(2 * spin))
    rotation = Rotation.random(random_state=5).as_matrix()
    x, y, z = np.tensordot(rotation, s, axes=1)
    hamiltonian = D * (z @ z - spin * (spin + 1) / 3 * np.eye(len(z))) + E * (x @ x - y @ y) + 7.0 * np.eye(len(z))
    split = spin_splitting(hamiltonian)
    assert (split.D_per_cm, split.E_per_cm) == pytest.approx((D, E), abs=1e-9)
    assert split.residual_per_cm < 1e-9
    np.testing.assert_allclose(np.abs(split.axes[2] @ rotation[2]), 1, rtol=0, atol=1e-9)
    if E:
        np.testing.assert_allclose(np.abs(split.axes @ rotation.T), np.eye(3), rtol=0, atol=1e-9)


def test_rhombicity_is_brought_into_its_customary_range():
    # D = 1, E = 0.9 is the same tensor as one with |E/D| < 1/3 in other axes.
    s = spin_matrices(2)
    split = spin_splitting(s[2] @ s[2] + 0.9 * (s[0] @ s[0] - s[1] @ s[1]))
    assert 0 <= split.E_per_cm / split.D_per_cm <= 1 / 3
    assert split.D_per_cm == pytest.approx(-1.85, abs=1e-9)
    assert split.E_per_cm == pytest.approx(-0.05, abs=1e-9)


@pytest.mark.parametrize("n_electrons", [2, 8])
def test_levels_of_a_triplet_are_those_of_D_and_E(n_electrons):
    # S = 1: D/3 + E, D/3 - E and -2D/3, nothing else.
    field = random_field_eV(5, 20 + n_electrons, width_per_cm=6000)
    result = magnetic_properties(field, n_electrons, REPULSION, 100.0)
    split = result.zero_field_splitting
    D, E = split.D_per_cm, split.E_per_cm
    levels = np.sort([D / 3 + E, D / 3 - E, -2 * D / 3])
    np.testing.assert_allclose(result.level_energies_per_cm[:3], levels - levels[0], rtol=0, atol=1e-6)
    assert split.residual_per_cm < 1e-6
    assert 0 <= E / D <= 1 / 3


def test_kramers_doublets_of_a_quartet_are_split_by_D_and_E():
    # S = 3/2: 2 (D^2 + 3 E^2)^(1/2).
    field = octahedral_eV(16000) + random_field_eV(5, 31, width_per_cm=800)
    result = magnetic_properties(field, 3, REPULSION, 250.0)
    D, E = result.zero_field_splitting.D_per_cm, result.zero_field_splitting.E_per_cm
    assert result.level_energies_per_cm[1] == pytest.approx(2 * sqrt(D * D + 3 * E * E), rel=1e-6)
    assert result.g_tensor.effective_spin == 1.5
    assert result.doublet_g_tensor.effective_spin == 0.5


def test_doublet_of_a_strongly_split_quartet_has_the_g_of_the_textbooks():
    # S = 3/2, D large and positive: g_par' = g_par, g_perp' = 2 g_perp (Abragam & Bleaney 1970; memory).
    field = tetragonal_eV(b1=16000, a1=16500, b2=0, e=-500)
    result = magnetic_properties(field, 3, REPULSION, 250.0)
    real, doublet = result.g_tensor, result.doublet_g_tensor
    assert result.zero_field_splitting.E_per_cm == 0
    axial, planar = [0, 0, 1], [1, 0, 0]
    factors = (1, 2) if result.zero_field_splitting.D_per_cm > 0 else (3, 0)
    assert doublet.along(axial) == pytest.approx(factors[0] * real.along(axial), abs=2e-3)
    assert doublet.along(planar) == pytest.approx(factors[1] * real.along(planar), abs=2e-3)


def test_axes_turn_with_the_molecule():
    rotation = Rotation.random(random_state=2).as_matrix()
    field = tetragonal_eV(**PYRAMID)
    straight = magnetic_properties(field, 1, None, 200.0)
    askew = magnetic_properties(turned(field, rotation), 1, None, 200.0)
    np.testing.assert_allclose(straight.g_tensor.values, askew.g_tensor.values, rtol=0, atol=1e-8)
    unique = int(np.argmin(straight.g_tensor.values))
    np.testing.assert_allclose(np.abs(straight.g_tensor.axes[unique]), [0, 0, 1], rtol=0, atol=1e-6)
    np.testing.assert_allclose(np.abs(askew.g_tensor.axes[unique] @ rotation[:, 2]), 1, rtol=0, atol=1e-6)
    assert askew.effective_moment == pytest.approx(straight.effective_moment, abs=1e-8)
    for result in (straight, askew):
        np.testing.assert_allclose(result.g_tensor.axes @ result.g_tensor.axes.T, np.eye(3), rtol=0, atol=1e-9)
        assert np.linalg.det(result.g_tensor.axes) == pytest.approx(1)


def test_tensors_turn_by_the_same_rotation_as_the_field():
    # A small turn about a general axis, by the exponential of the generator of rotations.
    generator = np.array([[0, -0.3, 0.2], [0.3, 0, -0.1], [-0.2, 0.1, 0]])
    rotation = expm(generator)
    field = octahedral_eV(9000) + random_field_eV(5, 17, width_per_cm=900)
    straight = magnetic_properties(field, 8, REPULSION, 500.0)
    askew = magnetic_properties(turned(field, rotation), 8, REPULSION, 500.0)
    assert askew.zero_field_splitting.D_per_cm == pytest.approx(straight.zero_field_splitting.D_per_cm, abs=1e-6)
    for name in ("zero_field_splitting", "g_tensor"):
        before, after = getattr(straight, name).axes, getattr(askew, name).axes
        np.testing.assert_allclose(np.abs(after @ rotation @ before.T), np.eye(3), rtol=0, atol=1e-5)


@pytest.mark.parametrize(
    ("n_electrons", "delta", "words"),
    [
        (1, 20000, ("S = 1/2 does not split", "no Kramers doublet is lowest")),
        (2, 17000, ("orbitally degenerate", "even number of electrons")),
        (4, 10000, ("orbitally degenerate", "even number of electrons")),
        (6, 40000, ("a singlet", "even number of electrons")),
        (7, 9000, ("orbitally degenerate",)),
    ],
)
def test_what_cannot_be_given_is_withheld_with_its_reason(n_electrons, delta, words):
    result = magnetic_properties(octahedral_eV(delta), n_electrons, REPULSION, 300.0)
    assert result.zero_field_splitting is None
    assert len(result.withheld) == len(words)
    for reason, word in zip(result.withheld, words, strict=True):
        assert word in reason


def test_strong_mixing_withholds_the_spin_hamiltonian():
    field = octahedral_eV(10000) + tetragonal_eV(b1=0, a1=0, b2=150, e=0)
    result = magnetic_properties(field, 7, REPULSION, 800.0)
    assert result.zero_field_splitting is None
    assert "lies in the ground term" in result.withheld[0]
    assert result.g_tensor is result.doublet_g_tensor
    assert result.g_tensor.effective_spin == 0.5
