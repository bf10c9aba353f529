"""Readings of multiply bonded donors: chemistry known from the textbooks sets the order."""

from __future__ import annotations

from functools import cache

import pytest

from ehmo.analysis.reactivity import donor_reactivity
from ehmo.records.reactivity import DonorReactivity
from tests.analysis.ladder_cases import ladder_case

LEANINGS = ("nucleophilic", "leans nucleophilic", "between", "leans electrophilic", "electrophilic")


@cache
def reading(name: str) -> DonorReactivity:
    case = ladder_case(name)
    b = case.bonding
    return donor_reactivity(case.coordination.bonds, b.orders, b.plan.basis, b.overlap.matrix, b.state, b.populations)[
        0
    ]


@pytest.mark.parametrize(
    ("softer", "harder"),
    [
        # Nugent & Mayer, Metal-Ligand Multiple Bonds, 1988 (memory): electrophilic character rises along a period
        # and with oxidation state; Fischer carbenes are electrophilic, Schrock ones nucleophilic.
        ("WO4 2-", "ReO4 -"),
        ("ReO4 -", "RuO4"),
        ("VO4 3-", "RuO4"),
        ("[MoNCl4]-", "[RuNCl4]-"),
        ("Ta(CH2)Cl3", "Cr(CO)5(C(OMe)Me)"),
        ("W(CH)Cl3", "[FeO(OH2)5]2+"),
    ],
)
def test_first_leans_more_to_the_nucleophilic_side(softer, harder):
    assert LEANINGS.index(reading(softer).leaning) < LEANINGS.index(reading(harder).leaning)


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "MnO4 -", "Ta(CH2)Cl3", "UO2 2+"])
def test_shares_are_shares(name):
    found = reading(name)
    assert -0.02 <= found.homo_share <= 1
    assert -0.02 <= found.lumo_share <= 1
    assert found.pi_star_gap_eV is None or found.pi_star_gap_eV > 0
