"""Overlap matrices against PySCF, and their laws."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from ehmo.errors import InputError, ParameterError
from ehmo.harmonics import harmonic_rotations, real_harmonics
from ehmo.orbitals.overlap import ChannelScale, overlap_matrix, scaled_overlap_matrices
from ehmo.orbitals.pairs import orbital_plan
from ehmo.units import BOHR_A
from tests.geometries import SPECIES
from tests.numeric_boxes import shell, table
from tests.orbitals.gaussian_expansion import PYSCF_ORDER, gaussian_overlap, uncontracted

# Shapes only: every l with several n, single and double zeta, and two shells of one l.
MADE_UP = table(
    H=(1, (shell(1, 0, 1.3), shell(2, 1, 1.1), shell(3, 2, 1.6), shell(4, 3, 2.0))),
    V=(
        5,
        (
            shell(4, 0, 1.3),
            shell(4, 1, 0.9),
            shell(3, 2, 4.75, 1.7, coefficients=(0.4755, 0.7052)),
            shell(5, 3, 4.9, 2.1, coefficients=(0.7844, 0.3908)),
        ),
    ),
    Cs=(1, (shell(6, 0, 1.06), shell(6, 1, 0.95), shell(5, 2, 1.9, 0.9, coefficients=(0.5, 0.62)), shell(4, 3, 5.0))),
    U=(
        6,
        (
            shell(7, 0, 1.914),
            shell(6, 1, 4.033),
            shell(7, 1, 1.914),
            shell(6, 2, 2.581, 1.207, coefficients=(0.7608, 0.4126)),
            shell(5, 3, 4.943, 2.106, coefficients=(0.7844, 0.3908)),
        ),
    ),
)
VECTORS_A = {
    "along z": (0.0, 0.0, 1.6),
    "against z": (0.0, 0.0, -2.9),
    "along x": (1.9, 0.0, 0.0),
    "against y": (0.0, -1.2, 0.0),
    "askew": (0.7, -1.1, 1.3),
    "far": (-4.1, 2.2, 3.0),
}


@pytest.mark.parametrize(
    "pair", [("H", "H"), ("H", "V"), ("V", "V"), ("Cs", "V"), ("U", "H"), ("Cs", "U"), ("U", "U")], ids="-".join
)
def test_every_pair_of_l_against_pyscf(pair):
    # Cross-check, PySCF 2.14: the expansion's own error with this grid is below 1e-12.
    shells = {symbol: MADE_UP.element(symbol).shells for symbol in pair}
    plan = orbital_plan(pair, MADE_UP)
    for vector in VECTORS_A.values():
        positions = np.array([(0.3, -0.2, 0.1), np.add((0.3, -0.2, 0.1), vector)])
        expected = gaussian_overlap(pair, positions / BOHR_A, shells)
        np.testing.assert_allclose(overlap_matrix(plan, positions), expected, rtol=0, atol=1e-11)


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "UO2 2+", "ReO4 -", "Cr(CO)6"])
def test_whole_molecule_against_pyscf(name, standard):
    species = SPECIES[name]
    shells = {symbol: standard.element(symbol).shells for symbol in species.symbols}
    expected = gaussian_overlap(species.symbols, species.positions_A / BOHR_A, shells)
    overlap = overlap_matrix(orbital_plan(species.symbols, standard), species.positions_A)
    np.testing.assert_allclose(overlap, expected, rtol=0, atol=1e-11)


@pytest.mark.parametrize("l", range(4))
def test_order_and_phase_of_pyscf_functions_by_evaluation(l):
    # What the map PYSCF_ORDER assumes: same signs, and p in the order x, y, z.
    molecule = uncontracted(["H"], np.zeros((1, 3)), {"H": (shell(l + 1, l, 1.0),)})
    directions = np.random.default_rng(l).normal(size=(40, 3))
    directions /= np.linalg.norm(directions, axis=1, keepdims=True)
    size = 2 * l + 1
    middle = molecule.nao // size // 2
    values = molecule.eval_gto("GTOval_sph", directions)[:, middle * size : (middle + 1) * size]
    harmonics = real_harmonics(directions, l)[:, l * l :]
    ratio = values[:, PYSCF_ORDER[l]] / harmonics
    np.testing.assert_allclose(ratio, ratio[0, 0], rtol=1e-9)
    assert ratio[0, 0] > 0


@pytest.mark.parametrize("name", SPECIES)
def test_unit_diagonal_symmetric_positive_definite(name, standard):
    species = SPECIES[name]
    overlap = overlap_matrix(orbital_plan(species.symbols, standard), species.positions_A)
    assert (overlap.diagonal() == 1).all()
    assert (overlap == overlap.T).all()
    assert np.linalg.eigvalsh(overlap)[0] > 0.02


@pytest.mark.parametrize("improper", [False, True], ids=["rotation", "rotation with reflection"])
def test_functions_turn_with_the_molecule(improper):
    # Law: S(R x) = D S(x) D^T with D the representation on the shells.
    symbols = ("U", "H", "V", "Cs")
    positions = np.array([[0, 0, 0], [1.4, 0.3, -0.9], [-1.2, 2.0, 0.8], [0.5, -2.2, 2.4]])
    rotation = Rotation.from_rotvec([0.4, -1.3, 0.9]).as_matrix() * (-1 if improper else 1)
    plan = orbital_plan(symbols, MADE_UP)
    turn = np.zeros((len(plan.basis), len(plan.basis)))
    for start, l in zip(plan.basis.shell_start, plan.basis.shell_l, strict=True):
        own = slice(start, start + 2 * l + 1)
        turn[own, own] = harmonic_rotations(rotation[None], int(l))[0]
    scale = ChannelScale((1.6, 1.9, 2.1, 1.75), 0.3, (1.9, 0.4, 1.5, 2.4))
    for before, after in zip(
        scaled_overlap_matrices(plan, positions, scale),
        scaled_overlap_matrices(plan, positions @ rotation.T + 3.0, scale),
        strict=True,
    ):
        np.testing.assert_allclose(after, turn @ before @ turn.T, rtol=0, atol=1e-11)


def test_order_of_atoms_only_reorders_the_matrix():
    symbols = np.array(["V", "H", "U", "Cs", "H", "V"])
    positions = np.random.default_rng(4).normal(size=(6, 3)) * 2.0
    new_order = np.array([3, 5, 1, 0, 4, 2])
    plan = orbital_plan(tuple(symbols), MADE_UP)
    moved = orbital_plan(tuple(symbols[new_order]), MADE_UP)
    functions = np.concatenate([np.arange(len(plan.basis))[plan.basis.functions_of(a)] for a in new_order])
    overlap = overlap_matrix(plan, positions)
    np.testing.assert_allclose(
        overlap_matrix(moved, positions[new_order]), overlap[np.ix_(functions, functions)], rtol=0, atol=1e-12
    )


def test_one_factor_for_all_channels_scales_every_two_centre_element():
    symbols, positions = ("U", "V"), np.array([[0, 0, 0], [1.1, -0.7, 1.5]])
    plan = orbital_plan(symbols, MADE_UP)
    overlap, scaled = scaled_overlap_matrices(plan, positions, ChannelScale((1.75,) * 4))
    np.testing.assert_allclose(scaled, 1.75 * (overlap - np.eye(len(overlap))), rtol=0, atol=1e-13)


def test_channel_factors_act_on_their_own_m_along_z():
    # Along z the blocks are diagonal in m, so each element shows its factor.
    plan = orbital_plan(("U", "V"), MADE_UP)
    positions = np.array([[0, 0, 0], [0, 0, 1.8]])
    by_m = (1.6, 1.9, 2.1, 2.4)
    overlap, scaled = scaled_overlap_matrices(plan, positions, ChannelScale(by_m))
    basis = plan.basis
    m = np.arange(len(basis)) - basis.shell_start[basis.shell_of] - basis.shell_l[basis.shell_of]
    block = np.ix_(basis.atom_of == 0, basis.atom_of == 1)
    factor = np.where(m[:, None] == m, np.array(by_m)[np.abs(m)], 0)[block]
    np.testing.assert_allclose(scaled[block], overlap[block] * factor, rtol=0, atol=1e-12)
    assert (np.abs(overlap[block][factor > 0]) > 1e-6).all()


def test_decay_with_distance_calzaferri_1989():
    # K(R) = 1 + (K - 1) exp(-decay (R - R0)): at R0 it is K, one decay length further K - 1 is 1/e.
    plan = orbital_plan(("H", "H"), MADE_UP)
    scale = ChannelScale((1.75,) * 4, 0.5, (0.4, 0.6))
    for distance, K in ((1.0, 1.75), (3.0, 1 + 0.75 / np.e), (0.6, 1 + 0.75 * np.exp(0.2))):
        overlap, scaled = scaled_overlap_matrices(plan, np.array([[0, 0, 0], [0, 0, distance]]), scale)
        np.testing.assert_allclose(scaled[:16, 16:], K * overlap[:16, 16:], rtol=1e-12, atol=1e-14)


def test_single_atom_has_the_unit_matrix():
    np.testing.assert_array_equal(overlap_matrix(orbital_plan(("U",), MADE_UP), np.zeros((1, 3))), np.eye(19))


def test_more_pairs_than_one_chunk_give_the_same_elements():
    # 96 atoms make 4560 pairs of one kind; elements must not depend on where a chunk ends.
    small = table(H=(1, (shell(1, 0, 1.3),)))
    positions = np.stack(np.meshgrid(range(4), range(4), range(6), indexing="ij"), axis=-1).reshape(-1, 3) * 0.9
    overlap = overlap_matrix(orbital_plan(("H",) * 96, small), positions)
    p = np.linalg.norm(positions[:, None] - positions, axis=2) / BOHR_A * 1.3
    np.testing.assert_allclose(overlap, np.exp(-p) * (1 + p + p * p / 3), rtol=0, atol=1e-10)


def test_atoms_on_top_of_each_other_are_named():
    plan = orbital_plan(("V", "H", "H"), MADE_UP)
    with pytest.raises(InputError, match=r"H2 and H3 are only 0\.010"):
        overlap_matrix(plan, np.array([[0, 0, 0], [1.5, 0, 0], [1.5, 0.01, 0]]))


def test_missing_element_is_a_parameter_error_that_names_it():
    with pytest.raises(ParameterError, match="'Xe'"):
        orbital_plan(("V", "Xe"), MADE_UP)
