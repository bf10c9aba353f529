"""Terms of free ions against published closed expressions."""

from __future__ import annotations

from collections import Counter
from math import sqrt

import numpy as np
import pytest

from ehmo.analysis.multiplets import free_ion_terms
from ehmo.conventions import SHELL_LETTERS
from ehmo.records.multiplets import ElectronRepulsion
from tests.analysis.multiplets.fields import n_determinants, racah

# B and C of ratios near and far from those of real ions.
PAIRS = [(1000.0, 4500.0), (650.0, 1900.0), (700.0, 0.0)]


def d2(B, C):
    return {"3F": [0], "1D": [5 * B + 2 * C], "3P": [15 * B], "1G": [12 * B + 2 * C], "1S": [22 * B + 7 * C]}


def d3(B, C):
    root = sqrt(193 * B**2 + 8 * B * C + 4 * C**2)
    return {
        "4F": [0],
        "4P": [15 * B],
        "2G": [4 * B + 3 * C],
        "2H": [9 * B + 3 * C],
        "2P": [9 * B + 3 * C],
        "2F": [24 * B + 3 * C],
        "2D": [20 * B + 5 * C - root, 20 * B + 5 * C + root],
    }


def d4(B, C):
    f = 1.5 * sqrt(68 * B**2 + 4 * B * C + C**2)
    p = 0.5 * sqrt(912 * B**2 - 24 * B * C + 9 * C**2)
    g = 0.5 * sqrt(708 * B**2 - 12 * B * C + 9 * C**2)
    d = 1.5 * sqrt(144 * B**2 + 8 * B * C + C**2)
    s = 2 * sqrt(193 * B**2 + 8 * B * C + 4 * C**2)
    return {
        "5D": [0],
        "3H": [4 * B + 4 * C],
        "3G": [9 * B + 4 * C],
        "3F": [16 * B + 5.5 * C - f, 16 * B + 5.5 * C + f],
        "3D": [16 * B + 4 * C],
        "3P": [16 * B + 5.5 * C - p, 16 * B + 5.5 * C + p],
        "1I": [6 * B + 6 * C],
        "1G": [16 * B + 7.5 * C - g, 16 * B + 7.5 * C + g],
        "1F": [21 * B + 6 * C],
        "1D": [30 * B + 7.5 * C - d, 30 * B + 7.5 * C + d],
        "1S": [31 * B + 10 * C - s, 31 * B + 10 * C + s],
    }


def d5(B, C):
    root = 3 * sqrt(57 * B**2 + 2 * B * C + C**2)
    return {
        "6S": [0],
        "4G": [10 * B + 5 * C],
        "4P": [7 * B + 7 * C],
        "4D": [17 * B + 5 * C],
        "4F": [22 * B + 7 * C],
        "2I": [11 * B + 8 * C],
        "2H": [13 * B + 10 * C],
        "2G": [22 * B + 8 * C, 38 * B + 10 * C],
        "2F": [26 * B + 8 * C, 10 * B + 10 * C],
        "2D": [31 * B + 10 * C, 32 * B + 11 * C - root, 32 * B + 11 * C + root],
        "2P": [55 * B + 10 * C],
        "2S": [32 * B + 8 * C],
    }


@pytest.mark.parametrize(("B", "C"), PAIRS)
@pytest.mark.parametrize(("n_electrons", "formula"), [(2, d2), (3, d3), (4, d4), (5, d5), (6, d4), (7, d3), (8, d2)])
def test_terms_of_d_shells_racah_1942(n_electrons, formula, B, C):
    # Racah, Phys. Rev. 62, 438 (1942); Griffith, The Theory of Transition-Metal Ions (1961), table A29 (memory).
    terms = free_ion_terms(2, n_electrons, racah(B, C)).terms
    # Hund's rules hold for real ratios; with C = 0 another term may be lowest.
    hund = next(term for term in terms if term.label == next(iter(formula(B, C))))
    found = {}
    for term in terms:
        found.setdefault(term.label, []).append(term.energy_per_cm - hund.energy_per_cm)
    expected = {label: sorted(values) for label, values in formula(B, C).items()}
    assert {label: len(values) for label, values in found.items()} == {k: len(v) for k, v in expected.items()}
    for label, values in expected.items():
        np.testing.assert_allclose(found[label], values, rtol=0, atol=1e-6, err_msg=label)


def test_one_electron_and_one_hole_have_a_single_term_without_any_repulsion():
    assert [t.label for t in free_ion_terms(2, 1, None).terms] == ["2D"]
    assert [t.label for t in free_ion_terms(2, 9, None).terms] == ["2D"]
    assert [t.label for t in free_ion_terms(3, 1, None).terms] == ["2F"]
    assert [t.label for t in free_ion_terms(3, 13, None).terms] == ["2F"]


SLATER = ElectronRepulsion(52000.0, 41000.0, 28000.0)


def condon_f2(repulsion):
    """f2 in F_2 = F^2/225, F_4 = F^4/1089, F_6 = 25 F^6/184041 (Condon & Shortley 1935, section 7; memory)."""
    F2, F4, F6 = repulsion.F2_per_cm / 225, repulsion.F4_per_cm / 1089, repulsion.F6_per_cm * 25 / 184041
    return {
        "3P": 45 * F2 + 33 * F4 - 1287 * F6,
        "3F": -10 * F2 - 33 * F4 - 286 * F6,
        "3H": -25 * F2 - 51 * F4 - 13 * F6,
        "1S": 60 * F2 + 198 * F4 + 1716 * F6,
        "1D": 19 * F2 - 99 * F4 + 715 * F6,
        "1G": -30 * F2 + 97 * F4 + 78 * F6,
        "1I": 25 * F2 + 9 * F4 + F6,
    }


def racah_E(repulsion):
    """E1, E2, E3 of Racah, Phys. Rev. 76, 1352 (1949) (memory)."""
    F2, F4, F6 = repulsion.F2_per_cm / 225, repulsion.F4_per_cm / 1089, repulsion.F6_per_cm * 25 / 184041
    return (
        (70 * F2 + 231 * F4 + 2002 * F6) / 9,
        (F2 - 3 * F4 + 7 * F6) / 9,
        (5 * F2 + 6 * F4 - 91 * F6) / 3,
    )


@pytest.mark.parametrize("n_electrons", [2, 12])
def test_terms_of_f2_condon_and_shortley_1935(n_electrons):
    terms = free_ion_terms(3, n_electrons, SLATER).terms
    expected = condon_f2(SLATER)
    assert {t.label for t in terms} == set(expected)
    assert len(terms) == len(expected)
    for term in terms:
        assert term.energy_per_cm == pytest.approx(expected[term.label] - expected["3H"], abs=1e-6)


def test_terms_of_f2_in_the_parameters_of_racah_1949():
    E1, E2, E3 = racah_E(SLATER)
    expected = {
        "3H": -9 * E3,
        "3F": 0.0,
        "3P": 33 * E3,
        "1G": 2 * E1 - 260 * E2 - 4 * E3,
        "1D": 2 * E1 + 286 * E2 - 11 * E3,
        "1I": 2 * E1 + 70 * E2 + 7 * E3,
        "1S": 9 * E1,
    }
    for term in free_ion_terms(3, 2, SLATER).terms:
        assert term.energy_per_cm == pytest.approx(expected[term.label] + 9 * E3, abs=1e-6)


@pytest.mark.parametrize("n_electrons", [3, 11])
def test_quartets_of_f3_depend_on_E3_alone(n_electrons):
    # 4I -21 E3, 4F and 4S 0, 4G 12 E3, 4D 33 E3: Racah 1949; Wybourne, Spectroscopic Properties of Rare Earths (1965)
    # (memory).
    _, _, E3 = racah_E(SLATER)
    expected = {"4I": 0, "4F": 21 * E3, "4S": 21 * E3, "4G": 33 * E3, "4D": 54 * E3}
    terms = free_ion_terms(3, n_electrons, SLATER)
    assert terms.ground.label == "4I"
    found = {t.label: t.energy_per_cm for t in terms.terms if t.multiplicity == 4}
    assert found == pytest.approx(expected, abs=1e-6)


def test_terms_that_f3_has():
    # Condon & Shortley 1935, table 1.7 (memory): 4(SDFGI), 2P, 2D 2, 2F 2, 2G 2, 2H 2, 2I, 2K, 2L.
    expected = Counter({f"4{letter}": 1 for letter in "SDFGI"} | {f"2{letter}": 1 for letter in "PIKL"})
    expected.update({f"2{letter}": 2 for letter in "DFGH"})
    assert Counter(t.label for t in free_ion_terms(3, 3, SLATER).terms) == expected


@pytest.mark.parametrize(("l", "n_electrons"), [*((2, n) for n in range(1, 10)), *((3, n) for n in (1, 2, 3, 11))])
def test_all_states_of_a_shell_are_in_some_term(l, n_electrons):
    repulsion = racah(800, 3000) if l == 2 else SLATER
    terms = free_ion_terms(l, n_electrons, repulsion).terms
    assert sum(t.multiplicity * t.degeneracy for t in terms) == n_determinants(l, n_electrons)
    for term in terms:
        assert term.degeneracy == 2 * "SPDFGHIKL".index(term.irrep) + 1
        assert term.spread_per_cm < 1e-6
        assert term.share == pytest.approx(1, abs=1e-9)
        assert term.parent == term.irrep
        assert term.configuration == ((SHELL_LETTERS[l], n_electrons),)
