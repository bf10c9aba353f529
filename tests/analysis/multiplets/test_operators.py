"""Operators of open shells against PySCF's full configuration interaction and against plain second quantisation."""

from __future__ import annotations

from functools import reduce

import numpy as np
import pytest
from pyscf import fci

from ehmo.analysis.multiplets.determinants import fermion_space, multipoles, shell_repulsion, shell_space
from ehmo.analysis.multiplets.irreps import minors
from ehmo.analysis.multiplets.momentum import orbital_momentum, reduced_momentum, spin_momentum
from ehmo.analysis.multiplets.spin_adapted import spin_spaces
from tests.analysis.multiplets.fields import n_determinants
from tests.angular_momentum import complex_gaunt, momentum_matrices, real_from_complex

SLATER = {2: (60000.0, 40000.0), 3: (52000.0, 41000.0, 28000.0)}


def repulsion_integrals(l):
    """(ij|kl) of a shell from Gaunt's integrals of complex harmonics and the Slater integrals."""
    m = range(-l, l + 1)
    total = np.zeros((2 * l + 1,) * 4, dtype=complex)
    for k, integral in zip(range(2, 2 * l + 1, 2), SLATER[l], strict=True):
        # c[q, a, b] is the integral of conj(Y_la) Y_kq Y_lb.
        c = np.array(
            [[[(-1) ** a * complex_gaunt((l, k, l), (-a, q, b)) for b in m] for a in m] for q in range(-k, k + 1)]
        )
        signs = np.array([(-1) ** q for q in range(-k, k + 1)])
        # sum_q Y_kq(1) conj(Y_kq(2)), conj(Y_kq) = (-1)^q Y_k,-q
        total += integral * 4 * np.pi / (2 * k + 1) * np.einsum("q,qab,qcd->abcd", signs, c, c[::-1])
    u = real_from_complex(l)
    real = np.einsum("ia,jb,kc,ld,abcd->ijkl", u.conj(), u, u.conj(), u, total, optimize=True)
    assert np.abs(real.imag).max() < 1e-6
    return real.real


@pytest.mark.parametrize("l", [2, 3])
def test_multipoles_give_the_repulsion_integrals_of_complex_harmonics(l):
    found = sum(
        F * np.einsum("qij,qkl->ijkl", matrices, matrices)
        for F, (matrices, _) in zip(SLATER[l], multipoles(l), strict=True)
    )
    np.testing.assert_allclose(found, repulsion_integrals(l), rtol=0, atol=1e-6)


@pytest.mark.parametrize(("l", "n_electrons"), [(2, 2), (2, 3), (2, 4), (2, 5), (2, 7), (3, 2), (3, 3)])
def test_spin_free_energies_in_a_field_without_symmetry_equal_those_of_pyscf(l, n_electrons):
    n = 2 * l + 1
    field = np.random.default_rng(n_electrons).normal(size=(n, n)) * 5000
    field = field + field.T
    found = []
    for space in spin_spaces(l, n_electrons):
        matrix = space.one_body(field) + np.tensordot(SLATER[l], space.repulsion, axes=1)
        found += np.linalg.eigvalsh(matrix).tolist()
    low = n_electrons // 2
    sector = (n_electrons - low, low)
    size = fermion_space(n, sector[0]).size * fermion_space(n, sector[1]).size
    # The lowest M_S holds every S once; pspace with all determinants is the whole matrix.
    _, theirs = fci.direct_spin1.pspace(field, repulsion_integrals(l), n, sector, np=size)
    np.testing.assert_allclose(np.sort(found), np.linalg.eigvalsh(theirs), rtol=0, atol=1e-6)


@pytest.mark.parametrize(("l", "n_electrons"), [(2, 2), (2, 5), (2, 8), (3, 3)])
def test_all_determinants_and_spin_functions_have_the_same_repulsion(l, n_electrons):
    whole = np.linalg.eigvalsh(np.tensordot(SLATER[l], shell_repulsion(l, n_electrons), axes=1))
    parts = []
    for space in spin_spaces(l, n_electrons):
        levels = np.linalg.eigvalsh(np.tensordot(SLATER[l], space.repulsion, axes=1))
        parts += np.repeat(levels, space.two_s + 1).tolist()
    assert len(parts) == n_determinants(l, n_electrons)
    np.testing.assert_allclose(np.sort(parts), whole, rtol=0, atol=1e-6)


def annihilators(n_modes):
    """Jordan-Wigner matrices of a_0 .. in the space of all occupations."""
    lower, z, unit = np.array([[0, 1], [0, 0]]), np.diag([1, -1]), np.eye(2)
    return [reduce(np.kron, [z] * mode + [lower] + [unit] * (n_modes - mode - 1)) for mode in range(n_modes)]


@pytest.mark.parametrize("n_particles", [0, 1, 3, 6])
def test_one_body_operators_against_jordan_wigner(n_particles):
    rng = np.random.default_rng(5)
    h = rng.normal(size=(6, 6)) + 1j * rng.normal(size=(6, 6))
    a = annihilators(6)
    whole = sum(h[p, q] * a[p].T @ a[q] for p in range(6) for q in range(6))
    space = fermion_space(6, n_particles)
    # a†_i a†_j .. |> with i < j < .. is a basis vector of the product space with a plus sign.
    places = [sum(1 << (5 - mode) for mode in string) for string in space.strings]
    np.testing.assert_allclose(space.one_body(h), whole[np.ix_(places, places)], rtol=0, atol=1e-12)


@pytest.mark.parametrize("l", [1, 2, 3])
def test_orbital_momentum_equals_that_of_the_complex_basis(l):
    np.testing.assert_allclose(orbital_momentum(l), momentum_matrices(l), rtol=0, atol=1e-12)


@pytest.mark.parametrize(("l", "n_electrons"), [(2, 1), (2, 4), (2, 5), (3, 2)])
def test_spin_of_a_shell_obeys_the_commutation_rule(l, n_electrons):
    x, y, z = spin_momentum(l, n_electrons)
    np.testing.assert_allclose(x @ y - y @ x, 1j * z, rtol=0, atol=1e-12)
    assert len(z) == shell_space(l, n_electrons).size


def test_reduced_momentum_scales_each_element_by_the_roots_of_the_shares():
    # Law: <a|l|b> of orbitals with metal shares alpha^2, beta^2 is alpha beta times that of the metal functions.
    rng = np.random.default_rng(7)
    orbitals = np.linalg.qr(rng.normal(size=(5, 5)))[0]
    shares = rng.uniform(0.3, 1, size=5)
    reduced = orbitals.T @ reduced_momentum(2, orbitals, shares) @ orbitals
    free = orbitals.T @ orbital_momentum(2) @ orbitals
    np.testing.assert_allclose(reduced, free * np.sqrt(np.outer(shares, shares)), rtol=0, atol=1e-12)
    np.testing.assert_allclose(
        reduced_momentum(2, orbitals, np.full(5, 0.8)), 0.8 * orbital_momentum(2), rtol=0, atol=1e-12
    )


@pytest.mark.parametrize("order", [0, 1, 2, 3, 5])
def test_minors_of_a_product_are_products_of_minors(order):
    # Cauchy and Binet.
    rng = np.random.default_rng(2)
    first, second = rng.normal(size=(2, 5, 5))
    np.testing.assert_allclose(
        minors(first, order) @ minors(second, order), minors(first @ second, order), rtol=0, atol=1e-9
    )
