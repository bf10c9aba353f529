"""Counter-ions of groups 1 and 2: point charges, left out, or with functions of their own."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

import basis_params
from ehmo.electronic.ewald import lattice_interaction
from ehmo.records.bloch import LatticeBond
from ehmo.units import COULOMB_EV_A
from tests.crystal.runs import PLAIN, order_rows, run_crystal
from tests.crystal.structures import Crystal
from tests.molecule_builder import polar

CELL = np.diag([6.0, 6.4, 6.8])
CHROMATE = [
    np.zeros(3),
    *(polar(1.64, theta, phi) for theta, phi in [(0, 0), (109.47, 0), (109.47, 120), (109.47, 240)]),
]
SALT = Crystal(
    ("K", "Cr", "O", "O", "O", "O", "Ca"),
    np.array([[3.0, 3.2, 0.2], *CHROMATE, [3.1, 0.1, 3.5]]),
    CELL,
)
"""Made up: a chromate ion with one cation of either group, and so one electron more."""

POTASSIUM = Crystal(("K", "Cr", "O", "O", "O", "O", "K"), SALT.positions_A, CELL)
"""The same with two potassium ions: neutral."""

BONDS = [LatticeBond(1, k, (0, 0, 0)) for k in (2, 3, 4, 5)]


def test_cations_are_left_out_and_their_electrons_are_with_the_rest(standard):
    salt = run_crystal(POTASSIUM, BONDS, standard, mesh=(2, 2, 2))
    ion = Crystal(POTASSIUM.symbols[1:6], POTASSIUM.positions_A[1:6], CELL)
    bonds = [LatticeBond(bond.metal - 1, bond.donor - 1, bond.translation) for bond in BONDS]
    alone = run_crystal(ion, bonds, standard, mesh=(2, 2, 2), charge=-2)
    assert salt.electrons.total == alone.electrons.total == 32
    assert salt.atoms.tolist() == [1, 2, 3, 4, 5]
    assert salt.ions.tolist() == [0, 6]
    assert salt.charges[[0, 6]].tolist() == [1, 1]
    assert salt.charges.sum() == pytest.approx(0, abs=1e-8)
    assert salt.charges[1:6] == pytest.approx(alone.charges, abs=1e-10)
    assert order_rows(salt) == pytest.approx(order_rows(alone), abs=1e-10)


def test_an_ion_of_group_two_counts_twice(standard):
    bonding = run_crystal(SALT, BONDS, standard, mesh=(1, 1, 1))
    assert bonding.ion_charges.tolist() == [1, 2]
    assert bonding.electrons.total == 33


def test_point_charges_act_in_the_self_consistent_model(standard):
    settled = run_crystal(POTASSIUM, BONDS, standard, mesh=(1, 1, 1), charge_model="self-consistent")
    assert settled.charges.sum() == pytest.approx(0, abs=1e-8)
    moved_positions = POTASSIUM.positions_A.copy()
    moved_positions[0] = [2.2, 2.0, 1.6]
    moved = Crystal(POTASSIUM.symbols, moved_positions, CELL)
    polarised = run_crystal(moved, BONDS, standard, mesh=(1, 1, 1), charge_model="self-consistent")
    # A cation draws electrons towards the oxygen that it comes near to.
    distances = np.linalg.norm(moved_positions[2:6] - moved_positions[0], axis=1)
    nearest = 2 + int(distances.argmin())
    assert polarised.charges[nearest] < settled.charges[nearest] - 0.02


def test_energy_holds_the_interaction_of_all_charges(standard):
    # The energy is variational, so a weight of the charge potential too small to move the charges adds (1/2) q gamma q.
    weight = 1e-6
    weak = replace(PLAIN, lambda_=weight)
    acting = run_crystal(POTASSIUM, BONDS, standard, mesh=(1, 1, 1), charge_model="self-consistent", settings=weak)
    fixed = run_crystal(POTASSIUM, BONDS, standard, mesh=(1, 1, 1))
    softness = [0.0 if s == "K" else COULOMB_EV_A / basis_params.atom(s).hardness_U_eV for s in POTASSIUM.symbols]
    gamma = lattice_interaction(POTASSIUM.positions_A, np.array(softness), CELL, 1.0)
    added = 0.5 * fixed.charges @ gamma @ fixed.charges
    assert (acting.state.energy_eV - fixed.state.energy_eV) / weight == pytest.approx(added, rel=1e-4)


def test_cations_with_functions_on_request(standard):
    bonding = run_crystal(POTASSIUM, BONDS, standard, mesh=(1, 1, 1), cations_basis=True)
    assert len(bonding.ions) == 0
    assert len(bonding.atoms) == 7
    assert 0 < bonding.charges[0] < 1.2
    assert bonding.charges.sum() == pytest.approx(0, abs=1e-8)


def test_a_metal_of_group_two_keeps_its_functions_where_its_bonds_are_asked_for(standard):
    bonding = run_crystal(SALT, [LatticeBond(6, 2, (0, 0, 0))], standard, mesh=(1, 1, 1))
    assert bonding.ions.tolist() == [0]
    assert 6 in bonding.atoms


def test_electrons_make_up_for_a_cation_too_many(standard):
    bonding = run_crystal(SALT, BONDS, standard, mesh=(1, 1, 1), charge_model="self-consistent")
    assert bonding.charges.sum() == pytest.approx(0, abs=1e-8)
    assert bonding.electrons.total % 2 == 1
