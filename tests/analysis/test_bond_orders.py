"""Mayer and Wiberg orders: plain sums, closed forms, valence sums, PySCF densities."""

from __future__ import annotations

import numpy as np
import pyscf
import pytest
from pyscf.lo import orth

from ehmo.analysis import analyse_bonding
from ehmo.analysis.bonded import bonded_functions
from ehmo.records.basis import Basis
from ehmo.records.electronic import ElectronicState, OverlapSpectrum
from tests.analysis import plain_loops
from tests.geometries import SPECIES
from tests.numeric_boxes import Job, bond, run, shell, table

LOOPED = ["[VO(OH2)5]2+", "[FeO(OH2)5]2+", "MnO4 -", "FeO4 2-", "[MoOCl5]2-", "NpO2 2+", "[PuO2(OH2)5]2+"]


def functions(basis: Basis, atom: int) -> np.ndarray:
    return np.flatnonzero(basis.atom_of == atom)


@pytest.mark.parametrize("name", LOOPED)
def test_orders_are_the_plain_sums(name, standard):
    outcome = run(Job.of(SPECIES[name], standard, self_consistent=True))
    basis, S = outcome.plan.basis, outcome.overlap
    spins = [plain_loops.density(outcome.state.coefficients, filling) for filling in outcome.state.occupations]
    orthogonal = [plain_loops.lowdin(P, S) for P in spins]
    for link, orders in zip(outcome.bonds, outcome.orders, strict=True):
        pair = functions(basis, link.metal), functions(basis, link.donor)
        assert orders.mayer == pytest.approx(plain_loops.mayer(spins, S, *pair), abs=1e-10)
        assert orders.wiberg == pytest.approx(plain_loops.wiberg(orthogonal, *pair), abs=1e-9)


@pytest.mark.parametrize(
    ("charge", "unpaired", "order"), [(0, 0, 1), (1, 1, 0.5), (-1, 1, 0.5), (0, 2, 0)], ids=["H2", "H2+", "H2-", "3H2"]
)
def test_hydrogen_molecule_in_closed_form(charge, unpaired, order, standard):
    # Each spin gives half a bond, an antibonding electron takes half away; triplet: no bond (Mayer 1983).
    outcome = run(Job(("H", "H"), np.array([[0, 0, 0], [0, 0, 0.8]]), charge, unpaired, standard), (bond(0, 1),))
    assert outcome.orders[0].mayer == pytest.approx(order, abs=1e-12)
    assert outcome.orders[0].wiberg == pytest.approx(order, abs=1e-12)


def test_one_pair_between_two_functions_has_the_product_of_gross_populations_as_mayer_order():
    # One orbital (a, b): (PS)_12 (PS)_21 = (a^2 + abS)(b^2 + abS).
    made_up = table(Li=(1, (shell(2, 0, 0.65, h_ii_eV=-5.4),)), H=(1, (shell(1, 0, 1.3),)))
    outcome = run(Job(("Li", "H"), np.array([[0, 0, 0], [0, 0, 1.6]]), 0, 0, made_up), (bond(0, 1),))
    assert outcome.orders[0].mayer == pytest.approx(outcome.populations.gross.prod(), abs=1e-12)
    # Wiberg 1968: q_A + q_B = 2 and B = 2 q_A - q_A^2 = q_A q_B in an orthogonal basis.
    root = plain_loops.lowdin(
        outcome.state.coefficients[:, :1] @ outcome.state.coefficients[:, :1].T * 2, outcome.overlap
    )
    assert outcome.orders[0].wiberg == pytest.approx(root.diagonal().prod(), abs=1e-12)


@pytest.mark.parametrize("name", ["VOCl3", "MnO4 -", "UO2 2+", "Cr(CO)6", "VO(OCH3)3"])
def test_orders_of_a_closed_shell_metal_add_up_to_its_valence(name, standard):
    # Idempotency, PSP = 2P, gives sum_B B_AB = 2 Q_A - sum_(ij on A) (PS)_ij (PS)_ji (Mayer 1983).
    species = SPECIES[name]
    links = tuple(bond(0, k) for k in range(1, len(species.symbols)))
    outcome = run(Job.of(species, standard), links)
    C, filling = outcome.state.coefficients, outcome.state.occupations.sum(axis=0)
    PS = (C * filling) @ C.T @ outcome.overlap
    own = outcome.plan.basis.functions_of(0)
    valence = 2 * outcome.populations.gross[own].sum() - np.sum(PS[own, own] * PS[own, own].T)
    assert sum(orders.mayer for orders in outcome.orders) == pytest.approx(valence, abs=1e-9)


@pytest.mark.parametrize("spread", [0.02, 0.4])
def test_orders_fall_as_a_bond_is_stretched(spread, standard):
    # Physics: at 6 A nothing is left of a bond between neutral closed shells.
    lengths = 1.57, 1.57 + spread, 6.0
    found = []
    for length in lengths:
        positions = SPECIES["VOCl3"].positions_A.copy()
        positions[1] = [0, 0, length]
        orders = run(Job(SPECIES["VOCl3"].symbols, positions, 0, 0, standard), (bond(0, 1),)).orders[0]
        found.append((orders.mayer, orders.wiberg, orders.overlap_population))
    assert (np.diff(np.array(found), axis=0) < 0).all()
    assert max(map(abs, found[-1])) < 0.02


MOLECULES = {
    "N2": ("N 0 0 0; N 0 0 1.098", 0, 0, {(0, 1): 3.0}),
    "O2 triplet": ("O 0 0 0; O 0 0 1.208", 0, 2, {(0, 1): 2.0}),
    "water": ("O 0 0 0; H 0.757 0 0.587; H -0.757 0 0.587", 0, 0, {}),
    "ScO doublet": ("Sc 0 0 0; O 0 0 1.668", 0, 1, {}),
    "VO+ triplet": ("O 0 0 1.56; V 0.1 0.2 0", 1, 2, {}),
    "TiOF2": ("Ti 0 0 0; O 0 0 1.62; F 1.5 0 -0.9; F -1.5 0.2 -0.9", 0, 0, {}),
}


@pytest.mark.parametrize("name", MOLECULES)
def test_orders_and_charges_on_a_pyscf_density(name):
    """RHF and ROHF in STO-3G: the analysis of the same orbitals and overlap, with PySCF's own Mulliken charges.

    PySCF has no Mayer routine; the reference is the usual form with total and spin density, P = Pa + Pb and
    Q = Pa - Pb: B = sum (PS)(PS) + (QS)(QS) (Mayer 1983). N2 and O2 come out at 3 and 2 in a minimal basis by symmetry.
    """
    atoms, charge, spin, known = MOLECULES[name]
    molecule = pyscf.M(atom=atoms, charge=charge, spin=spin, basis="sto-3g", verbose=0)
    calculation = molecule.RHF() if spin == 0 else molecule.ROHF()
    calculation.kernel()  # converged or not, its orbitals are orthonormal and its density is one to analyse
    basis, order = _basis_of(molecule)
    S = molecule.intor("int1e_ovlp")
    occupations = np.array([calculation.mo_occ > 0, calculation.mo_occ > 1], dtype=float)
    C = calculation.mo_coeff
    alpha, beta = ((C * filling) @ C.T for filling in occupations)
    sorted_S = S[np.ix_(order, order)]
    spectrum = OverlapSpectrum(sorted_S, *np.linalg.eigh(sorted_S))
    state = ElectronicState(np.asarray(calculation.mo_energy), C[order], occupations, 0.0, "fixed", 1, 0.0)
    pairs = [(i, j) for i in range(molecule.natm) for j in range(i)]
    bonds = [bond(*p) for p in pairs]
    bonded = bonded_functions(bonds, basis, spectrum, state)
    populations, orders = analyse_bonding(bonds, molecule.atom_coords(unit="Ang"), basis, spectrum, state, bonded)

    # mulliken_pop of the total density: its one-density form serves restricted and open shells alike.
    _, charges = pyscf.scf.hf.mulliken_pop(molecule, alpha + beta, S, verbose=0)
    np.testing.assert_allclose(populations.charges, charges, rtol=0, atol=1e-10)
    PS, QS = (alpha + beta) @ S, (alpha - beta) @ S
    to_lowdin = np.linalg.inv(orth.lowdin(S))
    slices = molecule.aoslice_by_atom()[:, 2:]
    for (i, j), found in zip(pairs, orders, strict=True):
        a, b = slice(*slices[i]), slice(*slices[j])
        mayer = sum(np.sum(M[a, b] * M[b, a].T) for M in (PS, QS))
        assert found.mayer == pytest.approx(mayer, abs=1e-10)
        wiberg = sum(2 * np.sum((to_lowdin @ P @ to_lowdin)[a, b] ** 2) for P in (alpha, beta))
        assert found.wiberg == pytest.approx(wiberg, abs=1e-8)
        overlap_population = 2 * np.sum((alpha + beta)[a, b] * S[a, b])
        assert found.overlap_population == pytest.approx(overlap_population, abs=1e-10)
    for pair, value in known.items():
        assert orders[pairs.index(pair[::-1])].mayer == pytest.approx(value, abs=1e-6)


def _basis_of(molecule) -> tuple[Basis, np.ndarray]:
    """PySCF's functions as a basis, and the order that takes its p functions x, y, z to m = -1, 0, 1."""
    atoms, ns, ls, order = [], [], [], []
    start = 0
    for k in range(molecule.nbas):
        l = molecule.bas_angular(k)
        for _ in range(molecule.bas_nctr(k)):
            places = [1, 2, 0] if l == 1 else range(2 * l + 1)
            order += [start + place for place in places]
            start += 2 * l + 1
            atoms.append(molecule.bas_atom(k))
            ns.append(l + 1 + sum(a == atoms[-1] and m == l for a, m in zip(atoms[:-1], ls, strict=True)))
            ls.append(l)
    symbols = tuple(molecule.atom_symbol(k) for k in range(molecule.natm))
    types = np.arange(len(ls))
    basis = Basis(symbols, molecule.atom_charges(), atoms, ns, ls, types, np.full(len(ls), -10.0))
    return basis, np.array(order)
