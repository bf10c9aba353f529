"""Dipole integrals against PySCF, and their laws."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from ehmo.orbitals.dipole import dipole_integrals
from ehmo.orbitals.overlap import overlap_matrix
from ehmo.orbitals.pairs import orbital_plan
from ehmo.units import BOHR_A
from tests.geometries import SPECIES
from tests.orbitals.gaussian_expansion import gaussian_integrals
from tests.orbitals.test_overlap_matrix import MADE_UP, VECTORS_A


def dipoles(symbols, positions_A, table):
    plan = orbital_plan(tuple(symbols), table)
    overlap = overlap_matrix(plan, positions_A)
    return plan, overlap, dipole_integrals(plan, table, positions_A, overlap)


@pytest.mark.parametrize("pair", [("H", "V"), ("V", "V"), ("U", "Cs"), ("U", "U")], ids="-".join)
def test_every_pair_of_l_against_pyscf(pair):
    # Cross-check, PySCF 2.14, by the same expansion in Gaussians as the overlaps.
    shells = {symbol: MADE_UP.element(symbol).shells for symbol in pair}
    for vector in VECTORS_A.values():
        positions = np.array([(0.3, -0.2, 0.1), np.add((0.3, -0.2, 0.1), vector)])
        _, _, ours = dipoles(pair, positions, MADE_UP)
        theirs = gaussian_integrals(("int1e_r",), pair, positions / BOHR_A, shells)
        np.testing.assert_allclose(ours, BOHR_A * theirs, rtol=0, atol=3e-10)


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "UO2 2+"])
def test_shift_of_the_origin_adds_the_overlap(name, standard):
    species, shift = SPECIES[name], np.array([1.0, -2.0, 0.5])
    _, overlap, here = dipoles(species.symbols, species.positions_A, standard)
    _, _, there = dipoles(species.symbols, species.positions_A + shift, standard)
    np.testing.assert_allclose(there, here + shift[:, None, None] * overlap, rtol=0, atol=1e-12)


def test_a_turn_of_the_molecule_turns_transition_dipoles(standard):
    species = SPECIES["VOCl3"]
    turn = Rotation.random(rng=4).as_matrix()
    plan, overlap, here = dipoles(species.symbols, species.positions_A, standard)
    _, turned_overlap, there = dipoles(species.symbols, species.positions_A @ turn.T, standard)
    # s functions do not turn: between them the three matrices are the components of vectors.
    s = [i for i in range(len(plan.basis)) if plan.basis.shell_l[plan.basis.shell_of[i]] == 0]
    np.testing.assert_allclose(turned_overlap[np.ix_(s, s)], overlap[np.ix_(s, s)], rtol=0, atol=1e-12)
    expected = np.einsum("kl,lij->kij", turn, here[:, s][:, :, s])
    np.testing.assert_allclose(there[:, s][:, :, s], expected, rtol=0, atol=1e-12)


def test_order_of_the_atoms_does_not_matter(standard):
    # The mirror pair is built from the moments of the other atom.
    species = SPECIES["[UO2(OH2)5]2+"]
    plan, _, here = dipoles(species.symbols, species.positions_A, standard)
    _, _, there = dipoles(species.symbols[::-1], species.positions_A[::-1], standard)
    functions = np.arange(len(plan.basis))
    order = np.concatenate([functions[plan.basis.functions_of(a)] for a in range(len(species.symbols))[::-1]])
    np.testing.assert_allclose(there, here[:, order][:, :, order], rtol=0, atol=1e-11)
