"""Bond order by textbook counting: the expected order of every class of oxo compound and its relatives."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest

from ehmo.analysis.formal_order import formal_orders
from ehmo.records.coordination import DonorKind
from tests.analysis.ladder_cases import ladder_case

# Orders by counting in the textbooks: mono-oxo triple bonds Ballhausen & Gray 1962; dioxo and trioxo Nugent & Mayer,
# Metal-Ligand Multiple Bonds, 1988; actinyls Denning 1992 (all memory).
EXPECTED = {
    "[VO(OH2)5]2+": {DonorKind.OXO: 3},
    "[VOCl4]2-": {DonorKind.OXO: 3},
    "[MoOCl5]2-": {DonorKind.OXO: 3},
    "[ReOCl4]-": {DonorKind.OXO: 3},
    "[FeO(OH2)5]2+": {DonorKind.OXO: 2},
    "cis-[MoO2Cl4]2-": {DonorKind.OXO: Fraction(5, 2)},
    "fac-[MoO3F3]3-": {DonorKind.OXO: 2},
    "trans-[OsO2Cl4]2-": {DonorKind.OXO: 2},
    "VOCl3": {DonorKind.OXO: 3},
    "VO(OCH3)3": {DonorKind.OXO: 3, DonorKind.ALKOXO: 1},
    "CrO2Cl2": {DonorKind.OXO: 2, DonorKind.HALIDE: 1},
    "MnO4 -": {DonorKind.OXO: Fraction(3, 2)},
    "OsO4": {DonorKind.OXO: Fraction(3, 2)},
    "MoS4 2-": {DonorKind.SULFIDO: Fraction(3, 2)},
    "[MoNCl4]-": {DonorKind.NITRIDO: 3},
    "[RuNCl4]-": {DonorKind.NITRIDO: 3},
    "V(NC6H5)Cl3": {DonorKind.IMIDO_LINEAR: 3},
    "MoO(NCH3)Cl2, bent": {DonorKind.OXO: 2, DonorKind.IMIDO_BENT: 2},
    "Ti(NMe2)Cl3": {DonorKind.AMIDO: 2, DonorKind.HALIDE: 1},
    "Ta(CH2)Cl3": {DonorKind.CARBENE: 2},
    "Cr(CO)5(C(OMe)Me)": {DonorKind.CARBENE: 2, DonorKind.CARBONYL: 1},
    "W(CH)Cl3": {DonorKind.CARBYNE: 3},
    "UO2 2+": {DonorKind.OXO: 3},
    "[NpO2(OH2)5]2+": {DonorKind.OXO: 3, DonorKind.AQUA: 1},
    "PuO2 2+": {DonorKind.OXO: 3},
    "Cr(CO)6": {DonorKind.CARBONYL: 1},
    "[Fe(CN)5(NO)]2-": {DonorKind.NITROSYL_LINEAR: 1},
    "[Ni(OH2)6]2+": {DonorKind.AQUA: 1},
}


def orders_of(name: str):
    case = ladder_case(name)
    f_shell = case.ladder.angular_momentum == 3
    return case, formal_orders(case.bonds, case.directions, case.normals, case.ladder, with_f=f_shell)


@pytest.mark.parametrize("name", EXPECTED)
def test_order_by_counting(name):
    case, orders = orders_of(name)
    for kind, expected in EXPECTED[name].items():
        found = {order.order for bond, order in zip(case.bonds, orders, strict=True) if bond.kind is kind}
        assert found == {Fraction(expected)}


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("[VO(OH2)5]2+", "triple: one sigma, two pi"),
        ("[FeO(OH2)5]2+", "double: one sigma, one pi"),
        ("cis-[MoO2Cl4]2-", "between double and triple: one sigma, 3/2 pi"),
        ("MnO4 -", "between single and double: one sigma, 1/2 pi"),
    ],
)
def test_words(name, words):
    assert orders_of(name)[1][0].words == words


def test_debatable_counts_state_their_rule():
    assert "upper limit 9/4" in orders_of("MnO4 -")[1][0].rule
    assert "six-coordinate" in orders_of("CrO2Cl2")[1][0].rule
    assert "5/2" in orders_of("CrO2Cl2")[1][0].rule
    assert "by convention" in orders_of("Cr(CO)6")[1][0].rule
    assert orders_of("[VO(OH2)5]2+")[1][0].rule == ""


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "MnO4 -", "CrO2Cl2", "cis-[MoO2Cl4]2-", "UO2 2+"])
def test_small_irregularities_do_not_change_the_count(name):
    case, regular = orders_of(name)
    noise = np.random.default_rng(1).normal(size=case.directions.shape) * 0.03
    shaken = case.directions + noise
    shaken /= np.linalg.norm(shaken, axis=1)[:, None]
    f_shell = case.ladder.angular_momentum == 3
    again = formal_orders(case.bonds, shaken, case.normals, case.ladder, with_f=f_shell)
    assert [order.order for order in again] == [order.order for order in regular]


def test_without_a_ladder_multiple_bonds_have_no_order_and_single_ones_do():
    case = ladder_case("[VO(OH2)5]2+")
    orders = formal_orders(case.bonds, case.directions, case.normals, None)
    assert [None if order is None else order.order for order in orders] == [None, 1, 1, 1, 1, 1]
