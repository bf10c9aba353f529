"""Fixed and self-consistent charges."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy import constants
from scipy.linalg import expm

import basis_params
from ehmo.electronic.charges import CHARGE_TOLERANCE, charge_interaction, mulliken_charges
from ehmo.errors import ConvergenceError, ElectronCountError
from tests.geometries import SPECIES
from tests.numeric_boxes import PLAIN, Job, Outcome, interaction, matrices, run, solve_state

ISSUE_LIMIT = 40
E2_EV_A = constants.e / (4 * np.pi * constants.epsilon_0) * 1e10


def energy(job: Job, outcome: Outcome, coefficients: np.ndarray) -> float:
    """Tr(P H0) + (lambda/2) sum gamma q q, from the density alone."""
    density = (coefficients * outcome.state.occupations.sum(axis=0)) @ coefficients.T
    gross = np.einsum("ij,ij->i", density, outcome.overlap)
    core = outcome.plan.basis.core_charges
    charges = core - np.bincount(outcome.plan.basis.atom_of, weights=gross, minlength=len(core))
    return float(np.sum(density * outcome.hamiltonian) + 0.5 * charges @ interaction(job) @ charges)


@pytest.mark.parametrize("name", SPECIES)
def test_every_species_converges_within_40_diagonalisations(name, standard):
    outcome = run(Job.of(SPECIES[name], standard, self_consistent=True, max_iterations=ISSUE_LIMIT))
    assert outcome.state.iterations <= ISSUE_LIMIT
    assert outcome.state.charge_residual < CHARGE_TOLERANCE
    assert outcome.state.charge_model == "self-consistent"


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "MnO4 -", "UO2 2+", "[FeO(OH2)5]2+"])
def test_converged_charges_reproduce_themselves(name, standard):
    job = Job.of(SPECIES[name], standard, self_consistent=True)
    outcome = run(job)
    shift = -0.5 * (interaction(job) @ outcome.populations.charges)[outcome.plan.basis.atom_of]
    shifted = outcome.hamiltonian + outcome.overlap * (shift[:, None] + shift)
    again = solve_state(replace(job, self_consistent=False), outcome.plan, outcome.overlap, shifted)
    charges = mulliken_charges(again.coefficients, outcome.overlap, again.occupations.sum(axis=0), outcome.plan.basis)
    np.testing.assert_allclose(charges, outcome.populations.charges, rtol=0, atol=2e-8)
    np.testing.assert_allclose(again.energies_eV, outcome.state.energies_eV, rtol=0, atol=1e-6)


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "MnO4 -", "UO2 2+"])
def test_energy_follows_from_the_density(name, standard):
    job = Job.of(SPECIES[name], standard, self_consistent=True)
    outcome = run(job)
    assert outcome.state.energy_eV == pytest.approx(energy(job, outcome, outcome.state.coefficients), abs=1e-8)


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "MnO4 -", "UO2 2+", "VOCl3"])
def test_energy_is_stationary_against_orbital_rotations(name, standard):
    # Law: with exactly this H the energy is variational. Orbitals of fixed charges are not stationary.
    job = Job.of(SPECIES[name], standard, self_consistent=True)
    outcome, fixed = run(job), run(replace(job, self_consistent=False))
    rng = np.random.default_rng(5)
    size, step = len(outcome.overlap), 1e-3
    steepest_fixed = 0.0
    for _ in range(5):
        kappa = rng.normal(size=(size, size))
        kappa -= kappa.T
        kappa *= step / np.linalg.norm(kappa)
        slopes = [
            (
                energy(job, result, result.state.coefficients @ expm(kappa))
                - energy(job, result, result.state.coefficients @ expm(-kappa))
            )
            / (2 * step)
            for result in (outcome, fixed)
        ]
        assert abs(slopes[0]) < 1e-5
        steepest_fixed = max(steepest_fixed, abs(slopes[1]))
    assert steepest_fixed > 1e-2


@pytest.mark.parametrize("name", ["VOCl3", "[TiF6]2-", "Cr(CO)6"])
def test_frontier_rotation_raises_the_energy_to_second_order(name, standard):
    job = Job.of(SPECIES[name], standard, self_consistent=True)
    outcome = run(job)
    state = outcome.state
    rises = []
    for angle in (0.02, 0.04):
        turned = state.coefficients.copy()
        homo, lumo = state.coefficients[:, state.homo], state.coefficients[:, state.lumo]
        turned[:, state.homo] = np.cos(angle) * homo + np.sin(angle) * lumo
        turned[:, state.lumo] = np.cos(angle) * lumo - np.sin(angle) * homo
        rises.append(energy(job, outcome, turned) - state.energy_eV)
    assert rises[0] > 0
    assert rises[1] / rises[0] == pytest.approx(4, abs=0.1)


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "MnO4 -", "PuO2 2+"])
def test_lambda_zero_equals_fixed_charges(name, standard):
    job = Job.of(SPECIES[name], standard, settings=replace(PLAIN, lambda_=0.0))
    fixed, consistent = run(job), run(replace(job, self_consistent=True))
    np.testing.assert_allclose(consistent.populations.charges, fixed.populations.charges, rtol=0, atol=1e-12)
    np.testing.assert_allclose(consistent.state.energies_eV, fixed.state.energies_eV, rtol=0, atol=1e-12)
    assert consistent.state.energy_eV == pytest.approx(fixed.state.energy_eV, abs=1e-10)
    assert fixed.state.charge_residual == 0


@pytest.mark.parametrize("self_consistent", [False, True])
def test_charges_add_up_to_the_charge_of_the_fragment(self_consistent, standard):
    for species in SPECIES.values():
        charges = run(Job.of(species, standard, self_consistent=self_consistent), ()).populations.charges
        assert charges.sum() == pytest.approx(species.charge, abs=1e-10), species.name


def test_self_consistency_pulls_the_charges_together(standard):
    # Physics: the potential of a positive atom stabilises its own functions, so large charges shrink.
    for name in ("MnO4 -", "VOCl3", "[VO(OH2)5]2+"):
        job = Job.of(SPECIES[name], standard)
        fixed, consistent = run(job), run(replace(job, self_consistent=True))
        assert 0 < consistent.populations.charges[0] < fixed.populations.charges[0]


def test_interaction_on_one_atom_is_its_hardness_and_far_apart_coulomb():
    hardness = np.array([7.2, 12.1])
    for distance in (1e3, 1e4):
        gamma = charge_interaction(np.array([[0, 0, 0], [0, 0, distance]]), hardness, 1.0)
        np.testing.assert_allclose(gamma.diagonal(), hardness, rtol=1e-14)
        assert gamma[0, 1] == gamma[1, 0]
        assert gamma[0, 1] == pytest.approx(E2_EV_A / distance, rel=3 / distance**2)


def test_interaction_klopman_1964_ohno_1964_by_hand():
    # R = 3, U = 14.3996/2 and 14.3996/6 make a = 4: gamma = 14.3996/5.
    gamma = charge_interaction(np.array([[0, 0, 0], [0, 3.0, 0]]), E2_EV_A / np.array([2.0, 6.0]), 0.5)
    assert gamma[0, 1] == pytest.approx(0.5 * E2_EV_A / 5, rel=1e-9)
    assert gamma[0, 0] == pytest.approx(0.5 * E2_EV_A / 2, rel=1e-12)


def test_interaction_is_positive_definite_for_every_species():
    # Law: otherwise the charges could gain energy without limit.
    for species in SPECIES.values():
        hardness = np.array([basis_params.atom(symbol).hardness_U_eV for symbol in species.symbols])
        gamma = charge_interaction(species.positions_A, hardness, 1.0)
        assert np.linalg.eigvalsh(gamma)[0] > 0, species.name


@pytest.mark.parametrize("limit", [1, 2])
def test_charges_that_do_not_settle_are_an_error_that_says_so(limit, standard):
    job = Job.of(SPECIES["VOCl3"], standard, self_consistent=True, max_iterations=limit)
    with pytest.raises(ConvergenceError, match=f"still change by .* e after {limit} iterations") as caught:
        run(job)
    assert caught.value.mend


def test_homonuclear_diatomic_is_neutral(standard):
    positions = np.array([[0, 0, 0], [0, 0, 1.098]])
    outcome = run(Job(("N", "N"), positions, 0, 0, standard, self_consistent=True), ())
    np.testing.assert_allclose(outcome.populations.charges, 0, atol=1e-12)
    assert outcome.state.iterations == 1


def test_mulliken_charges_of_a_heteronuclear_pair_by_hand(standard):
    # One orbital c = (a, b): q_A = 1 - 2 (a^2 + a b S) for two electrons, Mulliken 1955.
    plan, overlap, _ = matrices(Job(("H", "H"), np.array([[0, 0, 0], [0, 0, 0.9]]), 0, 0, standard))
    s, ratio = overlap[0, 1], 0.4
    a = 1 / np.sqrt(1 + ratio**2 + 2 * ratio * s)
    C = np.array([[a, 0.0], [ratio * a, 0.0]])
    charges = mulliken_charges(C, overlap, np.array([2.0, 0.0]), plan.basis)
    expected = 1 - 2 * np.array([a * a + ratio * a * a * s, (ratio * a) ** 2 + ratio * a * a * s])
    np.testing.assert_allclose(charges, expected, rtol=0, atol=1e-14)


@pytest.mark.parametrize("self_consistent", [False, True])
def test_no_electrons_at_all_is_refused_in_words(self_consistent, standard):
    job = Job(("Ti", "Cl"), np.array([[0, 0, 0], [0, 0, 2.2]]), 11, 0, standard, self_consistent=self_consistent)
    with pytest.raises(ElectronCountError):
        run(job)
