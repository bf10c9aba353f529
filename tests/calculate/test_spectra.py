"""Ground terms, bands, spins and g values of whole reports, held against published assignments."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from ehmo import Fragment, Options, bond_report
from ehmo.records.bands import Band
from ehmo.records.report import BondReport
from tests.geometries import SPECIES


@cache
def report_on(name: str) -> BondReport:
    return bond_report(SPECIES[name].fragment())


def within_shell(name: str, *, spin_allowed: bool = True) -> list[Band]:
    return [
        b for b in report_on(name).spectroscopy.bands if b.kind != "charge transfer" and b.spin_allowed is spin_allowed
    ]


GROUND_TERMS = {
    # Ballhausen & Gray 1962; Gray & Hare 1962; Griffith 1961; Denning 1992 (all memory).
    "[VO(OH2)5]2+": "2B2",
    "[VOCl4]2-": "2B2",
    "[MoOCl5]2-": "2B2",
    "[CrNCl4]2-": "2B2",
    "[ReOCl4]-": "1A1",
    "[RuNCl4]-": "1A1",
    "MnO4 -": "1A1",
    "FeO4 2-": "3A2",
    "[Ti(OH2)6]3+": "2T2g",
    "[V(OH2)6]3+": "3T1g",
    "[V(OH2)6]2+": "4A2g",
    "[Cr(OH2)6]3+": "4A2g",
    "[Mn(OH2)6]2+": "6A1g",
    "[Fe(OH2)6]2+": "5T2g",
    "[Fe(OH2)6]3+": "6A1g",
    "[Co(OH2)6]2+": "4T1g",
    "[Ni(OH2)6]2+": "3A2g",
    "[Co(NH3)6]3+": "1A1g",
    "[CoCl4]2-": "4A2",
    "UO2 2+": "1Σg+",
    "Cr(CO)6": "1A1g",  # no Racah constants of Cr(0): by the filled t2g alone
}


@pytest.mark.parametrize("name", GROUND_TERMS)
def test_ground_term(name):
    assert report_on(name).spectroscopy.ground_term == GROUND_TERMS[name]


def test_ground_term_of_hypomanganate_once_the_oxidation_state_is_given():
    # Its long bonds leave open whether hydrogens are missing, so nothing is counted; 3A2 (Ballhausen 1962, memory).
    report = bond_report(SPECIES["MnO4 3-"].fragment(), options=Options(oxidation_state=5))
    assert report.spectroscopy.ground_term == "3A2"


BAND_ORDER = {
    # Order and symmetry of the first spin-allowed bands; their energies are another matter.
    "[VO(OH2)5]2+": ["2E", "2B1", "2A1"],  # Ballhausen & Gray 1962 (memory)
    "[V(OH2)6]2+": ["4T2g", "4T1g", "4T1g"],  # Figgis & Hitchman 2000 (memory)
    "[Cr(OH2)6]3+": ["4T2g", "4T1g", "4T1g"],
    "[Ni(OH2)6]2+": ["3T2g", "3T1g", "3T1g"],
    "[V(OH2)6]3+": ["3T2g", "3T1g", "3A2g"],
    "[CoCl4]2-": ["4T2", "4T1", "4T1"],
}


@pytest.mark.parametrize("name", BAND_ORDER)
def test_order_and_labels_of_the_bands(name):
    assert [band.upper_term for band in within_shell(name)][: len(BAND_ORDER[name])] == BAND_ORDER[name]


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "[VOCl4]2-", "[MoOCl5]2-"])
def test_tetragonal_oxo_ion_of_one_electron_ballhausen_gray_1962(name):
    # 2B2 -> 2E allowed in x, y with factor 2; 2B2 -> 2B1 above it, forbidden, factor 1 (memory).
    bands = {band.upper_term: band for band in within_shell(name)}
    assert bands["2E"].wavenumber_per_cm < bands["2B1"].wavenumber_per_cm
    assert (bands["2E"].degeneracy, bands["2E"].dipole_allowed, bands["2E"].polarisation) == (2, True, "x, y")
    assert (bands["2B1"].degeneracy, bands["2B1"].dipole_allowed) == (1, False)
    assert bands["2E"].oscillator_strength > 0
    assert bands["2B1"].oscillator_strength is None


def test_centre_of_inversion_forbids_every_band_within_the_shell():
    assert not any(
        b.dipole_allowed for b in within_shell("[Ni(OH2)6]2+") + within_shell("[Ni(OH2)6]2+", spin_allowed=False)
    )


@pytest.mark.parametrize(
    "name", ["VO4 3-", "CrO4 2-", "MnO4 -", "MoO4 2-", "TcO4 -", "RuO4", "WO4 2-", "ReO4 -", "OsO4"]
)
def test_first_charge_transfer_of_tetraoxo_ions_is_t1_to_2e(name):
    # 1A1 -> 1T2 from t1 (nonbonding O 2p) to 2e: Ballhausen & Liehr 1958, Holt & Ballhausen 1967 (memory).
    first = report_on(name).spectroscopy.bands[0]
    _, lower, _, _, upper = first.transition.split()
    assert (lower, upper) == ("t1", "e")
    assert "1T2" in first.upper_term
    assert first.dipole_allowed
    assert first.polarisation == "x, y, z"


def test_g_values_of_vanadyl_below_the_free_electron_ballhausen_gray_1962():
    # g_par 1.933 < g_perp 1.978 < g_e (memory): the signs and the order.
    g = report_on("[VO(OH2)5]2+").spectroscopy.magnetism.g_tensor
    parallel, perpendicular = g.along([0, 0, 1]), g.along([1, 0, 0])
    assert parallel < perpendicular < 2.0023
    first_order = report_on("[VO(OH2)5]2+").spectroscopy.first_order_g
    assert (parallel, perpendicular) == pytest.approx(first_order, abs=0.004)


def test_g_parallel_above_g_perpendicular_in_oxopentachloromolybdate():
    # 1.963 and 1.940 (Manoharan & Rogers 1968, memory): the order is that of the anion.
    g = report_on("[MoOCl5]2-").spectroscopy.magnetism.g_tensor
    assert g.along([0, 0, 1]) > g.along([1, 0, 0])


SPINS = [
    *("[VO(OH2)5]2+", "[ReOCl4]-", "FeO4 2-", "[CrO(OH2)5]2+", "[FeO(OH2)5]2+", "[V(OH2)6]3+", "[V(OH2)6]2+"),
    *("[Cr(OH2)6]3+", "[Mn(OH2)6]2+", "[Fe(OH2)6]2+", "[Fe(OH2)6]3+", "[Co(OH2)6]2+", "[Ni(OH2)6]2+", "[CoCl4]2-"),
    *("Cr(CO)6", "Cr(CO)5(C(OMe)Me)", "[Fe(CN)5(NO)]2-", "[Co(NH3)6]3+"),
]


@pytest.mark.parametrize("name", SPINS)
def test_ladder_against_pairing_energy_gives_the_known_spin(name):
    # Ground-state spins of the textbooks (Figgis & Hitchman 2000; memory); aqua oxoiron(IV) Pestovsky et al. 2005.
    species = SPECIES[name]
    report = bond_report(Fragment(species.symbols, species.positions_A, charge=species.charge))
    assert report.fragment.unpaired_electrons == species.unpaired_electrons
    if report.electrons.spin_candidates:
        assert "pairing energy" in report.electrons.unpaired_reason


def test_bond_valence_sums_back_the_counting_brown_altermatt_1985():
    # Known spheres: within 0.3 of the oxidation state.
    for name in ("[VO(OH2)5]2+", "VOCl3", "VO4 3-", "CrO4 2-", "MoO4 2-", "[Cr(OH2)6]3+", "[Ni(OH2)6]2+"):
        (site,) = report_on(name).sites
        assert site.bond_valence_sum == pytest.approx(site.oxidation_state, abs=0.35), name


def test_given_oxidation_state_overrides_counting_and_warns_of_the_lengths():
    report = bond_report(SPECIES["[VO(OH2)5]2+"].fragment(), options=Options(oxidation_state=5))
    (site,) = report.sites
    assert (site.oxidation_state, site.d_count) == (5, 0)
    assert any("bond-valence sum" in warning for warning in report.warnings)


# What cannot be had is said, and the rest of the report stands.


def two_metals() -> Fragment:
    oxo = SPECIES["[VOCl4]2-"]
    positions = np.vstack([oxo.positions_A, oxo.positions_A + np.array([12.0, 0, 0])])
    return Fragment(oxo.symbols * 2, positions, charge=-4, unpaired_electrons=2)


def test_several_metals_have_a_ladder_each_and_no_terms():
    report = bond_report(two_metals())
    assert [site.ladder is not None for site in report.sites] == [True, True]
    single = report_on("[VOCl4]2-").sites[0].ladder
    for site in report.sites:
        assert site.oxidation_state is None
        found = [level.energy_eV - site.ladder.levels[0].energy_eV for level in site.ladder.levels]
        expected = [level.energy_eV - single.levels[0].energy_eV for level in single.levels]
        np.testing.assert_allclose(found, expected, atol=0.02)
    assert report.spectroscopy.terms is None
    assert any("2 metals" in reason for reason in report.spectroscopy.withheld)
    assert len(report.orders) == 10


@pytest.mark.parametrize(
    ("symbols", "positions", "charge"),
    [
        (("Cu", "O", "O"), [[0, 0, 0], [0, 0, 1.85], [0, 0, -1.85]], -3),
        (
            ("Ag", "N", "H", "H", "H"),
            [[0, 0, 0], [0, 0, 2.1], [0.95, 0, 2.45], [-0.47, 0.82, 2.45], [-0.47, -0.82, 2.45]],
            1,
        ),
    ],
    ids=["d10 cuprate(I)", "d10 silver(I)"],
)
def test_full_shell_has_a_closed_shell_ground_term_and_no_bands(symbols, positions, charge):
    report = bond_report(Fragment(symbols, positions, charge, 0))
    assert report.spectroscopy.ground_term.startswith("1")
    assert report.spectroscopy.terms is None
    assert any("full" in reason for reason in report.spectroscopy.withheld)


def test_spin_that_the_shell_cannot_have_withholds_bands_and_says_so():
    species = SPECIES["[VO(OH2)5]2+"]
    report = bond_report(Fragment(species.symbols, species.positions_A, 2, 3))
    assert any("3 unpaired" in reason for reason in report.spectroscopy.withheld)
    assert report.orders


def test_ground_term_of_another_spin_withholds_magnetism_and_says_so():
    spectrum = report_on("[Mn(OH2)6]2+").spectroscopy
    assert spectrum.magnetism is None
    assert any("has not the 5 unpaired electrons" in reason for reason in spectrum.withheld)


def test_more_bands_than_the_shell_has_are_refused_and_the_rest_stands():
    options = Options(observed_bands_per_cm=(10000.0, 12000.0, 14000.0, 16000.0))
    report = bond_report(SPECIES["[VO(OH2)5]2+"].fragment(), options=options)
    assert report.spectroscopy.fit is None
    assert any("4 observed bands" in reason for reason in report.spectroscopy.withheld)
    assert report.spectroscopy.terms is not None


@pytest.mark.parametrize(
    ("name", "direction"),
    [
        ("MnO4 -", "LMCT"),  # t1 to e: Wolfsberg & Helmholz 1952, Ballhausen & Liehr 1958 (memory)
        ("CrO4 2-", "LMCT"),
        ("[UO2(OH2)5]2+", "LMCT"),  # Denning 1992 (memory)
        ("[VO(OH2)5]2+", "LMCT"),  # Ballhausen & Gray 1962 (memory)
        ("Cr(CO)6", "MLCT"),  # t2g to pi* of CO: Beach & Gray 1968 (memory)
    ],
)
def test_direction_of_the_first_strong_charge_transfer_band(name, direction):
    bands = [band for band in report_on(name).spectroscopy.bands if band.kind == "charge transfer"]
    first = next(band for band in bands if band.oscillator_strength > 0.01)
    assert first.direction == direction
    assert (first.to_metal > 0) is (direction == "LMCT")


def test_bands_within_a_ligand_have_no_direction_to_the_metal():
    # Phenyl pi to pi* of the imido ligand.
    bands = report_on("V(NC6H5)Cl3").spectroscopy.bands
    inside = [band for band in bands if band.direction == "intraligand"]
    assert inside
    assert all(abs(band.to_metal) < 0.2 for band in inside)


def test_weak_bands_that_symmetry_allows_are_not_called_forbidden():
    # C4v: e to b2 is allowed in x, y by the product E x B2 = E, however little the overlap gives it.
    bands = [b for b in report_on("[FeO(OH2)5]2+").spectroscopy.bands if b.kind == "charge transfer"]
    found = [b for b in bands if b.transition.split()[1::3] == ["e", "b2"] and b.oscillator_strength < 1e-4]
    assert found
    assert all(band.dipole_allowed and set(band.polarisation) <= set("xy, ") for band in found)


def test_bands_given_for_an_empty_shell_are_named_as_withheld():
    report = bond_report(SPECIES["VOCl3"].fragment(), options=Options(observed_bands_per_cm=(13000.0,)))
    assert any("observed bands" in reason for reason in report.spectroscopy.withheld)
