"""The ladder: the orbitals it takes, the effective matrix, and the spin it asks for."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.analysis.ladder import LadderError, ladders
from ehmo.analysis.spin_choice import choose_spin
from ehmo.calculate import calculate_bonding
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options
from ehmo.structure import perceive
from ehmo.units import PER_CM_PER_EV
from tests.analysis.ladder_cases import OCTAHEDRON, field_of, ladder_case, ladder_of_field
from tests.geometries import SPECIES

LADDERS = ["[VO(OH2)5]2+", "[FeO(OH2)5]2+", "MnO4 -", "RuO4", "Cr(CO)6", "[UO2(OH2)5]2+", "PuO2 2+", "[CoCl4]2-"]


@pytest.mark.parametrize("name", LADDERS)
def test_effective_matrix_has_the_orbital_energies_as_eigenvalues(name):
    # des Cloizeaux 1960: the effective Hamiltonian keeps the exact energies.
    case = ladder_case(name)
    energies = case.bonding.state.energies_eV[[level.orbital for level in case.ladder.levels]]
    np.testing.assert_allclose(np.linalg.eigvalsh(case.ladder.field_eV), np.sort(energies), rtol=0, atol=1e-9)
    np.testing.assert_allclose(case.ladder.field_eV, case.ladder.field_eV.T, rtol=0, atol=1e-12)


@pytest.mark.parametrize(
    ("name", "electrons"),
    [
        ("[VO(OH2)5]2+", 1),
        ("[FeO(OH2)5]2+", 4),
        ("MnO4 -", 0),
        ("RuO4", 0),
        ("OsO4", 0),
        ("FeO4 2-", 2),
        ("Cr(CO)6", 6),
        ("Cr(CO)5(C(OMe)Me)", 6),
        ("[Co(NH3)6]3+", 6),
        ("[Fe(OH2)6]3+", 5),
        ("[Ni(OH2)6]2+", 8),
        ("UO2 2+", 0),
        ("[UO2(OH2)5]2+", 0),
        ("NpO2 2+", 1),
        ("PuO2 2+", 2),
    ],
)
def test_ladder_holds_the_electrons_of_textbook_counting(name, electrons):
    levels = ladder_case(name).ladder.levels
    assert sum(level.electrons for level in levels) == pytest.approx(electrons, abs=0.05)


def test_levels_of_aqua_vanadyl_ballhausen_gray_1962():
    # b2 < e < b1 < a1 (Ballhausen & Gray, Inorg. Chem. 1, 111, 1962; memory).
    levels = ladder_case("[VO(OH2)5]2+").ladder.levels
    assert levels[0].function == "dxy"
    assert {levels[1].function, levels[2].function} == {"dxz", "dyz"}
    assert [level.function for level in levels[3:]] == ["dx2-y2", "dz2"]
    assert not any(level.inverted for level in levels)


def test_d_below_oxygen_2p_is_called_inverted():
    # In RuO4 the bonding partners hold more d than the levels of the ladder.
    levels = ladder_case("RuO4").ladder.levels
    assert all(level.inverted and level.partner_share > level.metal_share for level in levels)


def test_bonding_d_levels_of_carbonyls_are_taken_and_the_ladder_says_so():
    ladder = ladder_case("Cr(CO)6").ladder
    assert "bonding or not" in ladder.selection
    assert [round(level.electrons) for level in ladder.levels] == [2, 2, 2, 0, 0]


def test_field_turns_with_the_molecule(standard):
    # The local axes turn with the atoms, so the matrix in them stays.
    species, name = SPECIES["[VO(OH2)5]2+"], "[VO(OH2)5]2+"
    turn = np.linalg.qr(np.random.default_rng(3).normal(size=(3, 3)))[0]
    fragment = Fragment(species.symbols, species.positions_A @ (turn * np.linalg.det(turn)).T, 2, 1)
    coordination = perceive(fragment)
    bonding = calculate_bonding(fragment, coordination, standard, standard.settings, Options())
    overlap = np.sum([orders.orbital_overlap for orders in bonding.orders], axis=0)
    (turned,) = ladders(coordination.frames, bonding.plan.basis, bonding.bonded, bonding.state, overlap)
    # x may point at another of the four equal donors: dxz and dyz may change places.
    kept, before = np.diag(turned.field_eV), np.diag(ladder_case(name).ladder.field_eV)
    np.testing.assert_allclose(kept[[0, 2, 4]], before[[0, 2, 4]], rtol=0, atol=1e-6)
    np.testing.assert_allclose(np.sort(kept), np.sort(before), rtol=0, atol=1e-6)


def test_metal_without_d_functions_has_no_ladder(standard):
    fragment = Fragment(("Zn", "Cl", "Cl"), np.array([[0, 0, 0], [0, 0, 2.1], [0, 0, -2.1]]), 0, 0)
    coordination = perceive(fragment)
    bonding = calculate_bonding(fragment, coordination, standard, standard.settings, Options())
    overlap = np.sum([orders.orbital_overlap for orders in bonding.orders], axis=0)
    with pytest.raises(LadderError, match="no d or f functions"):
        ladders(coordination.frames, bonding.plan.basis, bonding.bonded, bonding.state, overlap)


def test_f_ladder_of_uranyl_has_phi_and_delta_below_pi_and_sigma():
    # 5f phi and delta nonbonding, pi and sigma antibonding (Denning 1992; memory).
    levels = ladder_case("UO2 2+").ladder.levels
    low = {level.function for level in levels[:4]}
    assert low == {"fxyz", "fz(x2-y2)", "fx(x2-3y2)", "fy(3x2-y2)"}
    assert levels[6].function == "fz3"
    assert all(level.metal_share > 0.95 for level in levels[:4])


OCTAHEDRAL = ladder_of_field(field_of(OCTAHEDRON, np.full(6, 1.0), np.zeros(6)))
TEN_DQ = 3 * PER_CM_PER_EV


@pytest.mark.parametrize(
    ("n", "candidates", "pairing", "expected"),
    [
        # Strong and weak field on either side of 10 Dq = P (Griffith 1961; common practice).
        (4, (2, 4), 0.9 * TEN_DQ, 2),
        (4, (2, 4), 1.1 * TEN_DQ, 4),
        (5, (1, 3, 5), 0.9 * TEN_DQ, 1),
        (5, (1, 3, 5), 1.1 * TEN_DQ, 5),
        (6, (0, 2, 4), 0.9 * TEN_DQ, 0),
        (6, (0, 2, 4), 1.1 * TEN_DQ, 4),
        (7, (1, 3), 0.9 * TEN_DQ, 1),
        (7, (1, 3), 1.1 * TEN_DQ, 3),
        (3, (1, 3), 0.1 * TEN_DQ, 3),
        (8, (0, 2), 0.1 * TEN_DQ, 2),
    ],
)
def test_spin_of_an_octahedron_turns_where_splitting_equals_pairing(n, candidates, pairing, expected):
    choice = choose_spin(OCTAHEDRAL, n, candidates, pairing, "test ion")
    assert choice.unpaired_electrons == expected
    assert choice.margin_per_cm > 0
    assert "test ion" in choice.reason
