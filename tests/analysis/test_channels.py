"""Bond channels: eigenvalues of the spin-resolved Löwdin blocks, names from |m| about the bond axis."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import special_ortho_group

from ehmo.analysis.channels import CLOSE_WEIGHTS, bond_channels, momentum_shares, squared_momenta
from tests.analysis import plain_loops
from tests.geometries import SPECIES
from tests.numeric_boxes import Job, Outcome, bond, run

LOOPED = ["[VO(OH2)5]2+", "[FeO(OH2)5]2+", "MnO4 -", "FeO4 2-", "CH3ReO3", "VO(OCH3)3", "UO2 2+", "[PuO2(OH2)5]2+"]


@pytest.fixture(scope="module", params=LOOPED)
def outcome(request, standard) -> Outcome:
    return run(Job.of(SPECIES[request.param], standard, self_consistent=True))


def lowdin_densities(outcome: Outcome) -> list[np.ndarray]:
    C, S = outcome.state.coefficients, outcome.overlap
    return [plain_loops.lowdin((C * filling) @ C.T, S) for filling in outcome.state.occupations]


def pair_functions(outcome: Outcome, link) -> tuple[np.ndarray, np.ndarray]:
    atom_of = outcome.plan.basis.atom_of
    return np.flatnonzero(atom_of == link.metal), np.flatnonzero(atom_of == link.donor)


def test_weights_are_the_eigenvalues_up_to_the_turning_of_close_ones(outcome):
    densities = lowdin_densities(outcome)
    for link, orders in zip(outcome.bonds, outcome.orders, strict=True):
        matrix = plain_loops.channel_matrix(densities, *pair_functions(outcome, link))
        exact = np.linalg.eigvalsh(matrix)[::-1]
        found = orders.channel_weights
        assert found.sum() == pytest.approx(exact.sum(), abs=1e-9)
        # Schur 1923: the diagonal in any orthonormal basis is majorised by the eigenvalues.
        assert (np.cumsum(found) <= np.cumsum(exact) + 1e-9).all()
        assert np.abs(found - exact).max() <= CLOSE_WEIGHTS
        np.testing.assert_allclose(
            np.einsum("ki,ij,kj->k", orders.metal_hybrids, matrix, orders.metal_hybrids), found, rtol=0, atol=1e-9
        )


@pytest.mark.parametrize("name", ["MnO4 -", "FeO4 2-", "[CrNCl4]2-", "[FeO(OH2)5]2+", "UO2 2+", "NpO2 2+", "VOCl3"])
def test_weights_on_a_symmetry_axis_are_exactly_the_eigenvalues(name, standard):
    # The axis keeps sigma from pi, so nothing is left to turn; about C3 traces of pi and delta may still mix.
    outcome = run(Job.of(SPECIES[name], standard, self_consistent=True))
    link, orders = min(zip(outcome.bonds, outcome.orders, strict=True), key=lambda pair: pair[0].donor)
    exact = np.linalg.eigvalsh(plain_loops.channel_matrix(lowdin_densities(outcome), *pair_functions(outcome, link)))[
        ::-1
    ]
    strong = exact > 0.1
    assert strong.sum() >= 3
    np.testing.assert_allclose(orders.channel_weights[strong], exact[strong], rtol=0, atol=1e-9)


def test_weights_add_up_to_the_wiberg_order(outcome):
    for orders in outcome.orders:
        assert orders.channel_weights.sum() == pytest.approx(orders.wiberg, abs=1e-12)
        assert (np.diff(orders.channel_weights) <= 1e-12).all()
        assert orders.channel_weights[-1] > -1e-12


def test_hybrids_are_orthonormal_and_shares_add_up(outcome):
    for orders in outcome.orders:
        hybrids = orders.metal_hybrids
        np.testing.assert_allclose(hybrids @ hybrids.T, np.eye(len(hybrids)), rtol=0, atol=1e-10)
        np.testing.assert_allclose((orders.donor_hybrids**2).sum(axis=1), 1, rtol=0, atol=1e-10)
        np.testing.assert_allclose(orders.channel_shares.sum(axis=1), 1, rtol=0, atol=1e-9)
        assert orders.channel_shares.min() > -1e-9


def test_donor_hybrids_of_a_closed_shell_are_the_singular_vectors(standard):
    # P_MX = U s V^T with weights s^2. The two pi channels are degenerate: their donor hybrids may turn together.
    for name in ("[MoNCl4]-", "[RuNCl4]-", "UO2 2+"):
        outcome = run(Job.of(SPECIES[name], standard))
        link, orders = min(zip(outcome.bonds, outcome.orders, strict=True), key=lambda pair: pair[0].donor)
        block = sum(lowdin_densities(outcome))[np.ix_(*pair_functions(outcome, link))]
        coupling = orders.metal_hybrids[:4] @ block @ orders.donor_hybrids[:4].T
        squares = np.diag(np.linalg.svd(block, compute_uv=False) ** 2)
        np.testing.assert_allclose(coupling @ coupling.T, squares, rtol=0, atol=1e-9)
        np.testing.assert_allclose(coupling.T @ coupling, squares, rtol=0, atol=1e-9)


def test_donor_hybrids_carry_the_same_symmetry_as_their_metal_hybrids(outcome):
    layouts = outcome.plan.basis.layouts
    positions = positions_of(outcome)
    for link, orders in zip(outcome.bonds, outcome.orders, strict=True):
        axis = positions[link.donor] - positions[link.metal]
        squared = squared_momenta((axis / np.linalg.norm(axis))[None], layouts[link.donor])
        strong = orders.channel_weights > 0.2
        shares = momentum_shares(orders.donor_hybrids[strong].T[None], squared)[0]
        kinds = orders.channel_shares[strong].argmax(axis=1)
        np.testing.assert_array_equal(shares.argmax(axis=1), kinds)


def positions_of(outcome: Outcome) -> np.ndarray:
    symbols = outcome.plan.basis.symbols
    return next(SPECIES[name].positions_A for name in LOOPED if SPECIES[name].symbols == symbols)


@pytest.mark.parametrize("layout", [(0,), (1,), (0, 1, 2), (0, 0, 1, 1, 2, 3), (3, 2)])
def test_squared_momentum_about_any_axis_against_angular_momentum_matrices(layout):
    rng = np.random.default_rng(3)
    directions = rng.normal(size=(6, 3))
    directions /= np.linalg.norm(directions, axis=1, keepdims=True)
    expected = [plain_loops.squared_momentum(direction, layout) for direction in directions]
    np.testing.assert_allclose(squared_momenta(directions, layout), expected, rtol=0, atol=1e-12)


def test_shares_are_weights_of_the_eigenvectors_of_squared_momentum():
    rng = np.random.default_rng(8)
    layout = (0, 1, 2, 3)
    direction = rng.normal(size=3)
    direction /= np.linalg.norm(direction)
    values, vectors = np.linalg.eigh(plain_loops.squared_momentum(direction, layout))
    hybrids = np.linalg.qr(rng.normal(size=(16, 16)))[0]
    weights = (vectors.T @ hybrids) ** 2
    expected = [[weights[np.rint(values) == m * m, k].sum() for m in range(4)] for k in range(16)]
    found = momentum_shares(hybrids[None], squared_momenta(direction[None], layout))[0]
    np.testing.assert_allclose(found, expected, rtol=0, atol=1e-11)


def test_a_made_up_density_of_one_sigma_two_pi_and_one_delta_channel_is_taken_apart():
    # d with d along z, m = 0, +-1, 2 coupled with 0.9, 0.7, 0.7, 0.3 in one closed shell: weights are the squares.
    couplings = {2: 0.9, 1: 0.7, 3: 0.7, 4: 0.3}
    total = np.zeros((5, 5))
    for place, strength in couplings.items():
        total[place, place] = strength
    blocks = np.array([total, total])[:, None] / 2
    channels = bond_channels(blocks, np.array([[0, 0, 1.0]]), (2,), (2,))
    np.testing.assert_allclose(channels.weights[0], [0.81, 0.49, 0.49, 0.09, 0], rtol=0, atol=1e-12)
    np.testing.assert_array_equal(channels.shares[0].argmax(axis=1)[:4], [0, 1, 1, 2])


def test_close_sigma_and_pi_weights_of_a_mixed_density_are_told_apart():
    # Law: equal sigma and pi weights leave any mixture as eigenvectors; the axis alone must decide.
    mixture = special_ortho_group.rvs(3, random_state=4)
    weights = np.diag([0.85, 0.80, 0.80]) ** 0.5
    twisted = mixture @ weights @ mixture.T / 2
    channels = bond_channels(np.array([twisted, twisted])[:, None], np.array([[0, 0, 1.0]]), (1,), (1,))
    assert sorted(channels.shares[0].argmax(axis=1)) == [0, 1, 1]
    np.testing.assert_allclose(channels.shares[0].max(axis=1), 1, rtol=0, atol=1e-9)
    assert channels.weights.sum() == pytest.approx(2.45, abs=1e-12)


def test_a_half_filled_pi_antibonding_level_is_halved_only_if_the_spins_are_summed(standard):
    # S = 2 oxoiron(IV): alpha pi* is full, beta empty. P_MX of the sum loses what each spin has apart.
    outcome = run(Job.of(SPECIES["[FeO(OH2)5]2+"], standard, self_consistent=True))
    oxo = next(k for k, link in enumerate(outcome.bonds) if link.donor == 1)
    first, second = pair_functions(outcome, outcome.bonds[oxo])
    alpha, beta = lowdin_densities(outcome)
    block = (alpha + beta)[np.ix_(first, second)]
    pi = [c.weight for c in outcome.orders[oxo].channels if c.type == "pi"][:2]
    z = plain_loops.squared_momentum(np.array([0, 0, 1.0]), outcome.plan.basis.layouts[0])
    summed, hybrids = np.linalg.eigh(block @ block.T)
    summed_pi = [w for w, h in zip(summed[::-1], hybrids.T[::-1], strict=True) if abs(h @ z @ h - 1) < 0.1][:2]
    for resolved, lost in zip(pi, summed_pi, strict=True):
        assert resolved > 1.2 * lost
    # A closed shell loses nothing.
    closed = run(Job.of(SPECIES["MnO4 -"], standard))
    total = sum(lowdin_densities(closed))[np.ix_(*pair_functions(closed, closed.bonds[0]))]
    np.testing.assert_allclose(
        closed.orders[0].channel_weights[:4], np.linalg.svd(total, compute_uv=False)[:4] ** 2, rtol=0, atol=1e-9
    )


def test_no_electron_of_one_spin_leaves_the_channels_of_the_other(standard):
    # H2+ : one alpha electron, 2 (1/2)^2 = 1/2.
    outcome = run(Job(("H", "H"), np.array([[0, 0, 0], [0, 0, 1.06]]), 1, 1, standard), (bond(0, 1),))
    (channel,) = outcome.orders[0].channels
    assert channel.type == "sigma"
    assert channel.weight == pytest.approx(0.5, abs=1e-12)
