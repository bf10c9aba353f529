"""Wolfsberg-Helmholz Hamiltonian against its formula, element by element."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from tests.geometries import SPECIES
from tests.numeric_boxes import PLAIN, Job, matrices

SOME_SPECIES = ["[VO(OH2)5]2+", "UO2 2+", "CrO2Cl2"]


def element(h_i: float, h_j: float, s: float, K: float, weighting: bool) -> float:
    """Ammeter, Burgi, Thibeault, Hoffmann, J. Am. Chem. Soc. 100, 3686 (1978) (memory)."""
    delta = (h_i - h_j) / (h_i + h_j)
    weighted = K + delta**2 + delta**4 * (1 - K) if weighting else K
    return weighted * s * (h_i + h_j) / 2


@pytest.mark.parametrize("weighting", [True, False], ids=["weighted", "plain"])
@pytest.mark.parametrize("name", SOME_SPECIES)
def test_every_element_by_a_loop_ammeter_1978(name, weighting, standard):
    species = SPECIES[name]
    job = Job.of(species, standard, settings=replace(PLAIN, weighting=weighting, K=1.9))
    plan, overlap, hamiltonian = matrices(job)
    diagonal = [
        shell.h_ii_eV
        for symbol in species.symbols
        for shell in standard.element(symbol).shells
        for _ in range(2 * shell.l + 1)
    ]
    expected = np.diag(np.array(diagonal))
    for i in range(len(plan.basis)):
        for j in range(len(plan.basis)):
            if i != j:
                expected[i, j] = element(diagonal[i], diagonal[j], overlap[i, j], 1.9, weighting)
    np.testing.assert_allclose(hamiltonian, expected, rtol=0, atol=1e-12)
    np.testing.assert_array_equal(hamiltonian, hamiltonian.T)


@pytest.mark.parametrize("weighting", [True, False], ids=["weighted", "plain"])
@pytest.mark.parametrize("name", SOME_SPECIES)
def test_equal_channel_constants_give_the_plain_path(name, weighting, standard):
    plain = replace(PLAIN, weighting=weighting)
    split = replace(plain, K_sigma=1.75, K_pi=1.75, K_delta=1.75)
    first = matrices(Job.of(SPECIES[name], standard, settings=plain))
    second = matrices(Job.of(SPECIES[name], standard, settings=split))
    np.testing.assert_allclose(second[1], first[1], rtol=0, atol=1e-14)
    np.testing.assert_allclose(second[2], first[2], rtol=0, atol=1e-12)


def test_weighting_is_linear_in_the_constant_of_each_channel_along_z(standard):
    # In a diatomic along z every element belongs to one |m|, so its own K enters the formula of 1978.
    by_m = {0: 1.67, 1: 2.00, 2: 1.9, 3: 1.75}
    settings = replace(PLAIN, K_sigma=by_m[0], K_pi=by_m[1], K_delta=by_m[2])
    job = Job(("V", "Mo"), np.array([[0, 0, 0], [0, 0, 2.2]]), 0, 1, standard, settings)
    plan, overlap, hamiltonian = matrices(job)
    basis = plan.basis
    m = np.arange(len(basis)) - basis.shell_start[basis.shell_of] - basis.shell_l[basis.shell_of]
    h = hamiltonian.diagonal()
    for i in range(basis.atom_start[1]):
        for j in range(basis.atom_start[1], len(basis)):
            expected = element(h[i], h[j], overlap[i, j], by_m[abs(int(m[i]))], True)
            assert hamiltonian[i, j] == pytest.approx(expected, abs=1e-12)


def test_shells_of_one_atom_do_not_mix(standard):
    # U carries 6p and 7p: after orthogonalisation S and therefore H vanish between them.
    plan, overlap, hamiltonian = matrices(Job.of(SPECIES["UO2 2+"], standard))
    for atom in range(3):
        own = plan.basis.functions_of(atom)
        off = hamiltonian[own, own] - np.diag(hamiltonian[own, own].diagonal())
        assert not off.any()
        np.testing.assert_array_equal(overlap[own, own], np.eye(own.stop - own.start))
