"""Charge and unpaired electrons: given, guessed with the reason, or refused with the candidates."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from ehmo.errors import ElectronCountError
from ehmo.records.fragment import Fragment
from ehmo.structure import assign_electrons, perceive
from tests.geometries import SPECIES
from tests.structure.ligand_cases import CASES, dichromate, ferrocene, titanyl_porphyrin


def _assign(fragment, **given):
    return assign_electrons(fragment, perceive(fragment), **given)


@pytest.mark.parametrize("name", SPECIES)
def test_given_values_are_used(name):
    species = SPECIES[name]
    in_file = _assign(species.fragment())
    by_option = _assign(species.bare(), charge=species.charge, unpaired=species.unpaired_electrons)
    assert (in_file.charge, in_file.unpaired_electrons) == (species.charge, species.unpaired_electrons)
    assert (by_option.charge, by_option.unpaired_electrons) == (species.charge, species.unpaired_electrons)
    assert (in_file.charge_reason, by_option.charge_reason) == ("given in the file", "given")


def test_options_win_over_the_file():
    fragment = replace(SPECIES["[VO(OH2)5]2+"].fragment(), charge=3, unpaired_electrons=0)
    found = _assign(fragment, charge=2, unpaired=1)
    assert (found.charge, found.unpaired_electrons) == (2, 1)


# Right by the formulas of the species.
GUESSED = [
    *("[VO(OH2)5]2+", "VOCl3", "CrO2Cl2", "VO4 3-", "CrO4 2-", "MnO4 -", "MoO4 2-", "TcO4 -", "RuO4", "WO4 2-"),
    *("ReO4 -", "OsO4", "UO2 2+", "[UO2(OH2)5]2+", "NpO2 2+", "[NpO2(OH2)5]2+", "PuO2 2+", "[PuO2(OH2)5]2+"),
    *("[VOCl4]2-", "[MoNCl4]-", "[CrNCl4]2-", "[MoOCl5]2-", "cis-[MoO2Cl4]2-", "fac-[MoO3F3]3-"),
    *("CH3ReO3", "V(NC6H5)Cl3", "V(NH)Cl3", "MoO(NCH3)Cl2, bent", "Ti(NMe2)Cl3", "Ti(NMe2)4", "VO(OCH3)3"),
    *("Ti(OCH3)4", "[Ti(OH2)6]3+", "Ta(CH2)Cl3", "W(CCH3)(OCH3)3", "W(CH)Cl3", "TiCl4"),
    *("[TiF6]2-", "VOS3 3-", "MoS4 2-"),
]


@pytest.mark.parametrize("name", GUESSED)
def test_guesses_that_come_out_right(name):
    species = SPECIES[name]
    found = _assign(species.bare())
    assert (found.charge, found.unpaired_electrons) == (species.charge, species.unpaired_electrons)
    assert found.charge_reason.startswith("guessed: ")
    assert found.unpaired_reason.startswith(("guessed: ", "only count of "))


OPEN_SPINS = {
    "[ReOCl4]-": (0, 2),
    "trans-[OsO2Cl4]2-": (0, 2),
    "[FeO(OH2)5]2+": (0, 2, 4),
    "[V(OH2)6]2+": (1, 3),
    "[Mn(OH2)6]2+": (1, 3, 5),
    "[Fe(OH2)6]2+": (0, 2, 4),
    "[Ni(OH2)6]2+": (0, 2),
    "[CoCl4]2-": (1, 3),
    "Cr(CO)6": (0, 2, 4),
    "Cr(CO)5(C(OMe)Me)": (0, 2, 4),
}


@pytest.mark.parametrize("name", OPEN_SPINS)
def test_spins_that_counting_leaves_open_are_listed_for_the_ladder(name):
    found = _assign(SPECIES[name].bare())
    assert found.charge == SPECIES[name].charge
    assert found.spin_candidates == OPEN_SPINS[name]
    assert found.unpaired_electrons == OPEN_SPINS[name][0]


@pytest.mark.parametrize("name", OPEN_SPINS)
def test_a_given_spin_leaves_nothing_open(name):
    assert _assign(SPECIES[name].bare(), unpaired=OPEN_SPINS[name][-1]).spin_candidates == ()


def test_a_given_oxidation_state_overrides_counting():
    found = _assign(SPECIES["[VO(OH2)5]2+"].fragment(), oxidation_state=5)
    assert (found.metal_oxidation_total, found.d_electrons) == (5, 0)


REFUSED = {
    "[CrO(OH2)5]2+": "4.38 for Cr(IV), does not decide; give the charge",
    "FeO4 2-": "does not decide; give the charge",
    "[Co(NH3)6]3+": "does not decide; give the charge: +1 for Co(I), +2 for Co(II), +3 for Co(III)",
    "MnO4 3-": "may lack hydrogen (hydroxo?); add the hydrogens (--hydrogens place) or give the charge",
    "[TiOCl4]2-": "O2 may lack hydrogen (hydroxo?)",
}


@pytest.mark.parametrize("name", REFUSED)
def test_refusals_name_the_candidates(name):
    with pytest.raises(ElectronCountError) as caught:
        _assign(SPECIES[name].bare())
    assert REFUSED[name] in str(caught.value)


@pytest.mark.parametrize(
    ("given", "said"),
    [
        ({"charge": 2, "unpaired": 0}, "0 unpaired electrons do not fit 81 electrons; with 81 electrons it is 1, 3, 5"),
        ({"charge": 3, "unpaired": 1}, "1 unpaired electrons do not fit 80"),
        ({"charge": 2, "unpaired": -1}, "-1 unpaired electrons are impossible"),
        ({"charge": 2, "unpaired": 83}, "83 unpaired electrons are impossible"),
        ({"charge": 90}, "charge +90 is impossible"),
        ({"charge": -101}, "charge -101 is impossible"),
        ({"charge": 4}, "asks for V(VI), 1 more electron than it has"),
    ],
)
def test_impossible_counts(given, said):
    """The electrons of [VO(OH2)5]2+ are 23 + 6 x 8 + 10 - 2 = 79 for V; with the sums below."""
    fragment = SPECIES["[VO(OH2)5]2+"].bare()
    electrons = 23 + 48 + 10 - 2
    said = said.replace("81 electrons", f"{electrons} electrons").replace("fit 80", f"fit {electrons - 1}")
    with pytest.raises(ElectronCountError) as caught:
        _assign(fragment, **given)
    assert said in str(caught.value)
    assert caught.value.mend


def test_guess_must_fit_a_given_spin():
    with pytest.raises(ElectronCountError, match="does not fit 0 unpaired electrons; give the charge"):
        _assign(SPECIES["[VO(OH2)5]2+"].bare(), unpaired=0)


def test_counts_and_oxidation_states():
    found = _assign(SPECIES["[FeO(OH2)5]2+"].fragment())
    assert (found.metal_oxidation_total, found.d_electrons) == (4, 4)
    found = _assign(SPECIES["PuO2 2+"].bare())
    assert (found.metal_oxidation_total, found.d_electrons) == (6, 2)
    assert "Hund's rule" in found.unpaired_reason


def test_several_d0_metals():
    found = _assign(dichromate())
    assert (found.charge, found.unpaired_electrons) == (-2, 0)
    assert (found.metal_oxidation_total, found.d_electrons) == (12, None)


def test_several_metals_with_electrons_are_refused():
    # Two chromium(V) 3.0 A apart may pair their electrons in a bond.
    with pytest.raises(ElectronCountError, match=r"2 metals hold 2 d or f electrons .*; give their number: 0, 2, 4"):
        _assign(dichromate(), charge=-4)


def test_d1_metals_far_from_one_another_have_parallel_spins():
    vanadyl = SPECIES["[VO(OH2)5]2+"]
    pair = Fragment(
        vanadyl.symbols * 2, np.vstack([vanadyl.positions_A, vanadyl.positions_A + np.array([9.0, 0.0, 0.0])])
    )
    found = _assign(pair, charge=4)
    assert found.unpaired_electrons == 2
    assert "V(IV) d1 at each of 2 metals" in found.unpaired_reason
    with pytest.raises(ElectronCountError, match="2 metals hold 4 d or f electrons"):
        _assign(pair, charge=2)  # V(III) d2 each: low or high spin is not told


def test_organometallic_and_macrocycle():
    iron = ferrocene()
    assert _assign(iron).spin_candidates == (0, 2, 4)
    assert _assign(iron, unpaired=0).charge == 0
    assert "eighteen-electron rule" in _assign(iron, unpaired=0).charge_reason
    assert _assign(titanyl_porphyrin()).charge == 0


def test_doubtful_hydrogens_run_with_a_given_charge_only():
    fragment, _, _ = CASES["bare O at 2.10"]
    with pytest.raises(ElectronCountError, match="O5 may lack hydrogen"):
        _assign(fragment)
    found = _assign(fragment, charge=-1, unpaired=0)
    assert found.metal_oxidation_total is None


def test_counter_ions_take_part_in_the_charge():
    chromate = SPECIES["CrO4 2-"]
    salt = Fragment((*chromate.symbols, "K", "K"), np.vstack([chromate.positions_A, [[3.5, 0, 0], [-3.5, 0, 0]]]))
    assert _assign(salt).charge == 0


def test_main_group_metals_are_closed_shells():
    fragment = Fragment(
        ("Al", "Cl", "Cl", "Cl"), np.array([[0, 0, 0], [2.06, 0, 0], [-1.03, 1.784, 0], [-1.03, -1.784, 0]])
    )
    found = _assign(fragment)
    assert (found.charge, found.unpaired_electrons) == (0, 0)


def test_lanthanides_follow_hund():
    fragment = Fragment(("Gd", "Cl", "Cl", "Cl"), np.array([[0, 0, 0], [2.6, 0, 0], [-1.3, 2.25, 0], [-1.3, -2.25, 0]]))
    assert _assign(fragment, charge=0).unpaired_electrons == 7
