"""Mulliken populations: plain sums, closed forms, sum rules, PySCF."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.analysis.bonded import bonded_functions
from tests.analysis import plain_loops
from tests.geometries import SPECIES
from tests.numeric_boxes import Job, Outcome, bond, run, shell, table

LOOPED = ["[VO(OH2)5]2+", "[FeO(OH2)5]2+", "MnO4 -", "FeO4 2-", "[CrNCl4]2-", "NpO2 2+", "PuO2 2+", "VOCl3"]


def spin_densities(outcome: Outcome) -> list[np.ndarray]:
    return [plain_loops.density(outcome.state.coefficients, filling) for filling in outcome.state.occupations]


@pytest.fixture(scope="module", params=LOOPED)
def outcome(request, standard) -> Outcome:
    return run(Job.of(SPECIES[request.param], standard, self_consistent=True))


@pytest.fixture(scope="module")
def densities(outcome) -> list[np.ndarray]:
    return spin_densities(outcome)


def test_gross_net_and_charges_are_the_plain_sums(outcome, densities):
    P, basis = sum(densities), outcome.plan.basis
    gross = plain_loops.gross(P, outcome.overlap)
    np.testing.assert_allclose(outcome.populations.gross, gross, rtol=0, atol=1e-10)
    np.testing.assert_allclose(outcome.populations.net, P.diagonal(), rtol=0, atol=1e-10)
    by_atom = [sum(gross[i] for i in np.flatnonzero(basis.atom_of == a)) for a in range(len(basis.symbols))]
    np.testing.assert_allclose(outcome.populations.charges, basis.core_charges - by_atom, rtol=0, atol=1e-10)


def test_overlap_populations_by_atom_and_shell_are_the_plain_sums(outcome, densities):
    P, basis = sum(densities), outcome.plan.basis
    for found, group in (
        (outcome.populations.atom_overlap, basis.atom_of),
        (outcome.populations.shell_overlap, basis.shell_of),
    ):
        np.testing.assert_allclose(found, plain_loops.grouped(P, outcome.overlap, group), rtol=0, atol=1e-10)


def test_spin_populations_are_the_plain_sums(outcome, densities):
    difference = plain_loops.gross(densities[0] - densities[1], outcome.overlap)
    expected = np.bincount(outcome.plan.basis.atom_of, weights=difference)
    np.testing.assert_allclose(outcome.populations.spin, expected, rtol=0, atol=1e-10)


def test_overlap_population_of_each_orbital_is_the_plain_sum(outcome):
    basis, C = outcome.plan.basis, outcome.state.coefficients
    for link, orders in zip(outcome.bonds, outcome.orders, strict=True):
        expected = np.zeros(len(C))
        for k in range(len(C)):
            for i in range(*basis.functions_of(link.metal).indices(len(C))):
                for j in range(*basis.functions_of(link.donor).indices(len(C))):
                    expected[k] += 2 * 2 * C[i, k] * C[j, k] * outcome.overlap[i, j]
        np.testing.assert_allclose(orders.orbital_overlap, expected, rtol=0, atol=1e-10)


@pytest.mark.parametrize("self_consistent", [False, True])
@pytest.mark.parametrize("name", SPECIES)
def test_sum_rules(name, self_consistent, standard):
    species = SPECIES[name]
    outcome = run(Job.of(species, standard, self_consistent=self_consistent))
    populations, state, basis = outcome.populations, outcome.state, outcome.plan.basis
    electrons = basis.core_charges.sum() - species.charge
    assert populations.gross.sum() == pytest.approx(electrons, abs=1e-9)
    assert populations.spin.sum() == pytest.approx(species.unpaired_electrons, abs=1e-9)
    assert np.triu(populations.atom_overlap).sum() == pytest.approx(electrons, abs=1e-9)
    assert np.triu(populations.shell_overlap).sum() == pytest.approx(electrons, abs=1e-9)
    # Mulliken 1955: gross = net + half of every overlap population.
    half = populations.atom_overlap / 2
    gross = half.sum(axis=1) + half.diagonal()
    np.testing.assert_allclose(basis.core_charges - populations.charges, gross, rtol=0, atol=1e-9)
    np.testing.assert_allclose(populations.orbital_shares.sum(axis=1), 1, rtol=0, atol=1e-12)
    filling = state.occupations.sum(axis=0)
    for orders in outcome.orders:
        assert orders.orbital_overlap @ filling / 2 == pytest.approx(orders.overlap_population, abs=1e-9)


def test_shares_of_each_orbital_are_gross_populations_of_metal_donors_and_rest(outcome):
    basis, C = outcome.plan.basis, outcome.state.coefficients
    gross = C * (outcome.overlap @ C)
    metals = {link.metal for link in outcome.bonds}
    donors = {link.donor for link in outcome.bonds}
    for k in range(len(C)):
        expected = [0.0, 0.0, 0.0]
        for i in range(len(C)):
            atom = basis.atom_of[i]
            expected[0 if atom in metals else 1 if atom in donors else 2] += gross[i, k]
        np.testing.assert_allclose(outcome.populations.orbital_shares[k], expected, rtol=0, atol=1e-10)


def test_rows_of_the_bonded_atoms_are_those_of_the_whole_matrices(standard):
    outcome = run(Job.of(SPECIES["VO(OCH3)3"], standard))
    basis = outcome.plan.basis
    links = (bond(0, 16), bond(0, 2), bond(5, 2))  # any order, and one between two light atoms
    rows = np.flatnonzero(np.isin(basis.atom_of, [0, 2, 5, 16]))
    bonded = bonded_functions(links, basis, outcome.spectrum, outcome.state)
    C = outcome.state.coefficients
    np.testing.assert_allclose(bonded.coefficients, C[rows], rtol=0, atol=0)
    np.testing.assert_allclose(bonded.overlap, outcome.overlap[np.ix_(rows, rows)], rtol=0, atol=0)
    np.testing.assert_allclose(bonded.overlap_orbitals, (outcome.overlap @ C)[rows], rtol=0, atol=1e-12)
    orthonormal = bonded_functions(
        [bond(0, k) for k in range(1, len(basis.symbols))], basis, outcome.spectrum, outcome.state
    )
    np.testing.assert_allclose(
        orthonormal.lowdin_orbitals @ orthonormal.lowdin_orbitals.T, np.eye(len(C)), rtol=0, atol=1e-10
    )
    for atom in (0, 2, 5, 16):
        assert basis.atom_of[rows[bonded.start[atom]]] == atom


@pytest.mark.parametrize(
    ("charge", "unpaired", "factor"),
    [(0, 0, 2), (1, 1, 1), (-1, 1, None), (0, 2, None)],
    ids=["H2", "H2+", "H2-", "3H2"],
)
def test_hydrogen_molecule_in_closed_form(charge, unpaired, factor, standard):
    # c = (1, +-1) / sqrt(2 (1 +- S)): the bonding level adds S/(1+S), the antibonding -S/(1-S) per electron.
    outcome = run(Job(("H", "H"), np.array([[0, 0, 0], [0, 0, 0.8]]), charge, unpaired, standard), (bond(0, 1),))
    s = outcome.overlap[0, 1]
    up, down = outcome.state.occupations.sum(axis=0)
    expected = up * s / (1 + s) - down * s / (1 - s)
    assert outcome.orders[0].overlap_population == pytest.approx(expected, abs=1e-12)
    if factor:
        assert expected == pytest.approx(factor * s / (1 + s), abs=1e-12)
    net = up / (2 * (1 + s)) + down / (2 * (1 - s))
    np.testing.assert_allclose(outcome.populations.net, net, rtol=0, atol=1e-12)
    np.testing.assert_allclose(outcome.populations.gross, (up + down) / 2, rtol=0, atol=1e-12)


def test_heteronuclear_pair_by_the_quadratic_formula():
    # One s function on each atom: (a - E)(b - E) = (h - E s)^2.
    levels = -5.4, -13.6
    made_up = table(Li=(1, (shell(2, 0, 0.65, h_ii_eV=levels[0]),)), H=(1, (shell(1, 0, 1.3, h_ii_eV=levels[1]),)))
    outcome = run(Job(("Li", "H"), np.array([[0, 0, 0], [0, 0, 1.6]]), 0, 0, made_up), (bond(0, 1),))
    a, b = levels
    h, s = outcome.hamiltonian[0, 1], outcome.overlap[0, 1]
    A, B, Q = 1 - s * s, 2 * h * s - a - b, a * b - h * h
    E = (-B - np.sqrt(B * B - 4 * A * Q)) / (2 * A)
    ratio = (E - a) / (h - E * s)
    norm = 1 / (1 + ratio * ratio + 2 * ratio * s)
    assert outcome.state.energies_eV[0] == pytest.approx(E, abs=1e-10)
    expected = np.array([1 + ratio * s, ratio * ratio + ratio * s]) * 2 * norm
    np.testing.assert_allclose(outcome.populations.gross, expected, rtol=0, atol=1e-12)
    assert outcome.orders[0].overlap_population == pytest.approx(4 * norm * ratio * s, abs=1e-12)
    assert outcome.populations.charges[0] > 0 > outcome.populations.charges[1]
