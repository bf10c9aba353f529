"""Ligand charges and the matching behind them."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from ehmo.records.fragment import Fragment
from ehmo.structure import perceive
from ehmo.structure.elements import OXIDATION_STATES, valence_d_or_f_electrons
from ehmo.structure.matching import maximum_matching, unsatisfied
from tests.geometries import SPECIES
from tests.molecule_builder import Molecule
from tests.structure.ligand_cases import CASES, ferrocene, titanyl_porphyrin

COUNTS = {
    "[VO(OH2)5]2+": ("V", 4, 1), "VOCl3": ("V", 5, 0), "MnO4 -": ("Mn", 7, 0), "FeO4 2-": ("Fe", 6, 2),
    "CrO2Cl2": ("Cr", 6, 0), "[FeO(OH2)5]2+": ("Fe", 4, 4), "UO2 2+": ("U", 6, 0), "NpO2 2+": ("Np", 6, 1),
    "PuO2 2+": ("Pu", 6, 2), "VO4 3-": ("V", 5, 0), "RuO4": ("Ru", 8, 0), "OsO4": ("Os", 8, 0),
    "[MoNCl4]-": ("Mo", 6, 0), "[CrNCl4]2-": ("Cr", 5, 1), "[RuNCl4]-": ("Ru", 6, 2), "V(NC6H5)Cl3": ("V", 5, 0),
    "Ti(OCH3)4": ("Ti", 4, 0), "Ti(NMe2)4": ("Ti", 4, 0), "Ta(CH2)Cl3": ("Ta", 5, 0), "W(CH)Cl3": ("W", 6, 0),
    "W(CCH3)(OCH3)3": ("W", 6, 0), "Cr(CO)5(C(OMe)Me)": ("Cr", 0, 6), "Cr(CO)6": ("Cr", 0, 6),
    "[Fe(CN)5(NO)]2-": ("Fe", 2, 6), "[Co(NH3)5(NO)]2+": ("Co", 3, 6), "[Co(OH2)6]2+": ("Co", 2, 7),
    "CH3ReO3": ("Re", 7, 0), "MoS4 2-": ("Mo", 6, 0), "trans-[OsO2Cl4]2-": ("Os", 6, 2),
}  # fmt: skip
"""Oxidation states and d (f) counts of textbook formulas (common practice)."""


@pytest.mark.parametrize("name", COUNTS)
def test_ligand_charges_give_the_textbook_oxidation_state(name):
    symbol, state, electrons = COUNTS[name]
    species = SPECIES[name]
    ligands = perceive(species.fragment()).ligands
    assert species.charge - sum(ligand.charge for ligand in ligands) == state
    assert valence_d_or_f_electrons(symbol, state) == electrons


@pytest.mark.parametrize("name", CASES)
def test_charges_of_typical_ligands(name):
    fragment, _, charge = CASES[name]
    ligand = next(ligand for ligand in perceive(fragment).ligands if ligand.formula != "Cl")
    assert ligand.charge == charge
    assert ligand.charge_reason


def test_macrocycle_and_cyclopentadienyl():
    assert [ligand.charge for ligand in perceive(titanyl_porphyrin()).ligands] == [-2, -2]
    assert [ligand.charge for ligand in perceive(ferrocene()).ligands] == [-1, -1]


def _free_ion(build) -> int | None:
    """Charge of an ion far from a titanium tetrachloride that makes the fragment a metal compound."""
    ion = Molecule("X")
    build(ion)
    symbols, points = tuple(ion.symbols[1:]), np.array(ion.points[1:]) + np.array([0.0, 0.0, 40.0])
    host = SPECIES["TiCl4"]
    fragment = Fragment((*host.symbols, *symbols), np.vstack([host.positions_A, points]))
    ligand = next(ligand for ligand in perceive(fragment).ligands if max(ligand.atoms) == len(fragment) - 1)
    assert ligand.metals == ()
    return ligand.charge


def _centre(symbol, other, length, count):
    def build(m):
        atom = m.donor(symbol, 5.0, 0.0)
        corners = np.array([[1, 1, 1], [1, -1, -1], [-1, 1, -1], [-1, -1, 1]]) / np.sqrt(3)
        if count == 3:
            corners = np.array([[1, 0, 0], [-0.5, np.sqrt(0.75), 0], [-0.5, -np.sqrt(0.75), 0]])
        if count == 6:
            corners = np.vstack([np.eye(3), -np.eye(3)])
        for corner in corners[:count]:
            m.put(other, m.points[atom] + length * corner, atom)

    return build


@pytest.mark.parametrize(
    ("name", "build", "charge"),
    [
        ("chloride", lambda m: m.donor("Cl", 5.0, 0.0), -1),
        ("sodium", lambda m: m.donor("Na", 5.0, 0.0), 1),
        ("barium", lambda m: m.donor("Ba", 5.0, 0.0), 2),
        ("ammonium", _centre("N", "H", 1.02, 4), 1),
        ("water", lambda m: m.water(5.0, 0.0), 0),
        ("perchlorate", _centre("Cl", "O", 1.43, 4), -1),
        ("sulfate", _centre("S", "O", 1.48, 4), -2),
        ("phosphate", _centre("P", "O", 1.54, 4), -3),
        ("silicate", _centre("Si", "O", 1.63, 4), -4),
        ("nitrate", _centre("N", "O", 1.24, 3), -1),
        ("carbonate", _centre("C", "O", 1.29, 3), -2),
        ("sulfite, planar", _centre("S", "O", 1.52, 3), -2),
        ("chlorate, planar", _centre("Cl", "O", 1.49, 3), -1),
        ("tetrafluoroborate", _centre("B", "F", 1.39, 4), -1),
        ("hexafluorophosphate", _centre("P", "F", 1.60, 6), -1),
        ("tetrachloroaluminate", _centre("Al", "Cl", 2.13, 4), -1),
        ("bromide of caesium", lambda m: m.donor("Br", 5.0, 0.0), -1),
    ],
)
def test_charges_of_free_ions(name, build, charge):
    assert _free_ion(build) == charge


def test_missing_hydrogens_leave_the_charge_open():
    fragment, _, _ = CASES["acetylacetonato"]
    heavy = [k for k, symbol in enumerate(fragment.symbols) if symbol != "H"]
    stripped = Fragment(tuple(fragment.symbols[k] for k in heavy), fragment.positions_A[heavy])
    ligand = next(ligand for ligand in perceive(stripped).ligands if ligand.formula == "C5O2")
    assert ligand.charge is None
    assert "hydrogens seem to be missing" in ligand.charge_reason


graphs = st.integers(1, 9).flatmap(
    lambda n: st.sets(st.tuples(st.integers(0, n - 1), st.integers(0, n - 1))).map(lambda edges: (n, edges))
)


@settings(max_examples=200, deadline=None, derandomize=True)
@given(graphs)
def test_matching_is_valid_and_largest(graph):
    """Law: no edge set without common vertices is larger (all subsets tried)."""
    size, raw = graph
    edges = {(min(e), max(e)) for e in raw if e[0] != e[1]}
    near = [sorted({b for a, b in edges if a == v} | {a for a, b in edges if b == v}) for v in range(size)]
    partner = maximum_matching(near)
    for vertex, mate in enumerate(partner):
        assert mate == -1 or (partner[mate] == vertex and mate in near[vertex])

    @cache
    def largest(free: frozenset[int]) -> int:
        if not free:
            return 0
        vertex = min(free)
        rest = free - {vertex}
        return max([largest(rest)] + [1 + largest(rest - {mate}) for mate in near[vertex] if mate in rest])

    assert sum(mate != -1 for mate in partner) == 2 * largest(frozenset(range(size)))


def test_open_valences_of_small_molecules():
    chain = {0: [1], 1: [0]}
    assert unsatisfied({0: 3, 1: 2}, chain) == {0: 1}  # CN: triple bond counted twice over, one valence left
    assert unsatisfied({0: 2, 1: 2}, chain) == {}  # N2
    ring = {k: [(k + 1) % 5, (k - 1) % 5] for k in range(5)}
    assert sum(unsatisfied(dict.fromkeys(range(5), 1), ring).values()) == 1  # cyclopentadienyl


def test_oxidation_states_leave_no_negative_electron_count():
    for symbol, states in OXIDATION_STATES.items():
        counts = [valence_d_or_f_electrons(symbol, state) for state in states]
        assert all(count is None or 0 <= count <= 14 for count in counts), symbol
