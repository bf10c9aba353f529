"""Laws that whole reports must keep: within irreps, between copies, under turns and reordering, for odd input."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

import basis_params
from ehmo import EhmoError, Fragment, Options, bond_report
from ehmo.analysis.formal_order import formal_orders
from ehmo.calculate import calculate_bonding, effective_settings
from ehmo.calculate.remarks import electronic_warnings
from ehmo.orbitals.dipole import dipole_integrals
from ehmo.report.ladder_text import ladder_text
from ehmo.units import BOHR_A, HARTREE_EV, PER_CM_PER_EV
from tests.geometries import SPECIES
from tests.molecule_builder import polar
from tests.structure.ligand_cases import dichromate

VOCL3 = np.array([[0, 0, 0], [0, 0, 1.57], [2.042, 0, -0.647], [-1.021, 1.768, -0.647], [-1.021, -1.768, -0.647]])


def heptoxide(symbol: str, charge: int, terminal: float, bridge: float, angle_deg: float = 130.0) -> Fragment:
    """Two MO3 units joined by one oxo ligand; Mn2O7 from Dronskowski et al. 1988 (memory, rounded)."""
    half, symbols, points = np.radians(angle_deg / 2), ["O"], [np.zeros(3)]
    for side in (1, -1):
        metal = np.array([side * bridge * np.sin(half), 0, bridge * np.cos(half)])
        towards = -metal / np.linalg.norm(metal)
        first = np.array([0, 1.0, 0])
        second = np.cross(towards, first)
        symbols.append(symbol)
        points.append(metal)
        for k in range(3):
            around, tilt = 2 * np.pi * k / 3, np.radians(109.47)
            across = np.cos(around) * first + side * np.sin(around) * second
            symbols.append("O")
            points.append(metal + terminal * (towards * np.cos(tilt) + np.sin(tilt) * across))
    return Fragment(tuple(symbols), np.array(points), charge, 0)


@pytest.mark.parametrize("name", ["MnO4 -", "OsO4", "ReO4 -", "VOCl3", "[Cr(OH2)6]3+"])
def test_degenerate_levels_have_one_share_and_one_partner(name):
    report = bond_report(SPECIES[name].fragment())
    by_irrep: dict[str, list] = {}
    for level in report.sites[0].ladder.levels:
        by_irrep.setdefault(report.irreps.labels[level.orbital], []).append(level)
    for levels in by_irrep.values():
        groups = np.split(levels, 1 + np.flatnonzero(np.diff([level.energy_eV for level in levels]) > 1e-3))
        for group in groups:
            assert np.ptp([level.partner_share for level in group]) < 1e-6
            assert np.ptp([level.metal_share for level in group]) < 1e-6


def test_level_of_a_metal_in_a_dimer_keeps_its_metal_share():
    one = bond_report(SPECIES["MnO4 -"].fragment()).sites[0].ladder
    for site in bond_report(heptoxide("Mn", 0, 1.585, 1.77)).sites:
        shares = [level.metal_share for level in site.ladder.levels]
        assert np.mean(shares) == pytest.approx(np.mean([level.metal_share for level in one.levels]), abs=0.1)
        assert not any(level.inverted for level in site.ladder.levels)


@pytest.mark.parametrize("name", ["OsO4", "VOCl3", "[VOCl4]2-"])
def test_two_copies_far_apart_have_the_ladder_of_one(name):
    species = SPECIES[name]
    one = bond_report(species.fragment(), options=Options(charge_model="fixed")).sites[0].ladder
    positions = np.vstack([species.positions_A, species.positions_A + np.array([0, 60.0, 0])])
    pair = Fragment(species.symbols * 2, positions, 2 * species.charge, 2 * species.unpaired_electrons)
    for site in bond_report(pair, options=Options(charge_model="fixed")).sites:
        for found, expected in zip(site.ladder.levels, one.levels, strict=True):
            assert found.energy_eV == pytest.approx(expected.energy_eV, abs=1e-6)
            assert found.metal_share == pytest.approx(expected.metal_share, abs=1e-6)
            assert found.inverted is expected.inverted


def test_metal_without_donors_beside_another_keeps_the_report_of_the_other():
    fragment = Fragment(("V", "O", "Cl", "Cl", "Cl", "Fe"), np.vstack([VOCL3, [[0, 0, -4.5]]]), 2, 4)
    report = bond_report(fragment, options=Options(charge_model="fixed"))
    vanadium, iron = report.sites
    assert vanadium.ladder is not None
    assert iron.ladder is None
    assert "no donors" in iron.ladder_withheld


def test_strength_of_a_band_into_a_half_filled_level_is_that_of_the_spin_that_can_jump(standard):
    # D2d tetrachloridocuprate(II): f = (2/3) dE sum n_i (1 - n_j) |D|^2 by plain loops (Mulliken 1939; memory).
    donors = [polar(2.25, theta, phi) for theta, phi in ((65, 0), (65, 180), (115, 90), (115, 270))]
    report = bond_report(Fragment(("Cu", *["Cl"] * 4), np.array([[0, 0, 0], *donors]), -2, 1))
    settings = effective_settings(standard.settings, Options())
    b = calculate_bonding(report.fragment, report.coordination, standard, settings, Options())
    C = b.state.coefficients
    D = C.T @ dipole_integrals(b.plan, standard, report.fragment.positions_A, b.overlap.matrix) @ C
    *filled, hole = report.sites[0].ladder.levels
    allowed = [band for band in report.spectroscopy.bands if band.kind == "d-d" and band.oscillator_strength]
    assert allowed
    for band in allowed:
        expected = 0.0
        for level in filled:
            if report.irreps.labels[level.orbital] == band.transition.split()[0]:
                movable = b.state.occupations[:, level.orbital] @ (1 - b.state.occupations[:, hole.orbital])
                squared = float((D[:, level.orbital, hole.orbital] ** 2).sum()) / BOHR_A**2
                expected += 2 / 3 * (hole.energy_eV - level.energy_eV) / HARTREE_EV * movable * squared
        assert band.oscillator_strength == pytest.approx(expected, rel=0.02)


def mono_oxo_uranium():
    points = np.array([[0, 0, 0], [0, 0, 1.8], [2.6, 0, -0.4], [-2.6, 0, -0.4], [0, 2.6, -0.4], [0, -2.6, -0.4]])
    report = bond_report(Fragment(("U", "O", *["Cl"] * 4), points, -2, 2))
    bonds, frame = report.coordination.bonds_of(0), report.coordination.frames[0]
    units = np.array([points[bond.donor] for bond in bonds]) @ frame.axes.T
    return report.sites[0].ladder, bonds, units / np.linalg.norm(units, axis=1)[:, None]


def test_electrons_in_pi_star_of_a_mono_oxo_actinide_undo_whole_bonds():
    ladder, bonds, units = mono_oxo_uranium()
    levels = tuple(
        replace(level, electrons=float(level.function in ("fxz2", "fyz2")), overlap_population=-0.2)
        for level in ladder.levels
    )
    # (2 sigma + 4 pi - 2)/2 = 2, as for the same electrons on a d metal.
    assert formal_orders(bonds, units, {}, replace(ladder, levels=levels), with_f=True)[0].order == 2


def test_electrons_in_the_sigma_frame_undo_sigma_bonds():
    # Four electrons in the eg-like pair of a mono-oxo octahedron: dz2 holds half of its sigma bond to the oxo donor.
    report = bond_report(SPECIES["[VO(OH2)5]2+"].fragment())
    ladder, bonds = report.sites[0].ladder, report.coordination.bonds_of(0)
    frame = report.coordination.frames[0]
    positions = report.fragment.positions_A
    units = (positions[[bond.donor for bond in bonds]] - positions[0]) @ frame.axes.T
    units /= np.linalg.norm(units, axis=1)[:, None]
    levels = tuple(replace(level, electrons=2.0 * (level.function == "dz2")) for level in ladder.levels)
    order = formal_orders(bonds, units, {}, replace(ladder, levels=levels))[0]
    # Squares of the sigma functions in dz2: 1 for each axial donor, 1/4 for each of four equatorial ones.
    assert float(order.sigma) == pytest.approx(1 - 1 / (1 + 1 + 4 / 4), abs=0.05)


@pytest.mark.parametrize("B", [float("nan"), float("inf"), -500.0, 0.0])
def test_senseless_racah_b_is_refused(B):
    with pytest.raises(EhmoError):
        Options(racah_B_per_cm=B)


def test_given_b_is_used_as_given_and_not_called_reduced():
    fragment = Fragment(("V", "O", "Cl", "Cl", "Cl"), VOCL3, -2, 2)
    text = ladder_text(bond_report(fragment, options=Options(racah_B_per_cm=600.0)))
    assert "B 600" in text
    assert "repulsion reduced" not in text


def test_symbols_may_be_a_list_and_coordinates_that_do_not_fit_are_refused_in_words():
    assert bond_report(Fragment(["V", "O", "Cl", "Cl", "Cl"], VOCL3)).orders
    for positions in ([[0, 0], [0, 1.6]], [[0, 0, 0]], [[0, 0, "a"], [0, 0, 1]]):
        with pytest.raises(EhmoError):
            Fragment(("V", "O"), positions)


def test_labels_do_not_depend_on_the_order_of_the_atoms():
    fragment, labels = SPECIES["CrO2Cl2"].fragment(), []
    for order in ([0, 1, 2, 3, 4], [0, 3, 4, 1, 2]):
        reordered = Fragment(tuple(fragment.symbols[i] for i in order), fragment.positions_A[order], 0, 0)
        report = bond_report(reordered)
        labels.append([report.irreps.labels[level.orbital] for level in report.sites[0].ladder.levels])
    assert labels[0] == labels[1]


def test_ground_term_that_rounding_would_choose_is_named_with_its_equal():
    fragment, found = SPECIES["NpO2 2+"].fragment(), set()
    for seed in range(6):
        turn = Rotation.random(rng=seed).as_matrix()
        report = bond_report(Fragment(fragment.symbols, fragment.positions_A @ turn.T, 2, 1))
        found.add(report.spectroscopy.ground_term)
        assert any("either may be the ground term" in warning for warning in report.warnings)
    assert found == {"2Δu or 2Φu"}


def test_levels_of_a_degenerate_set_are_named_after_different_functions():
    fragment = SPECIES["[Ni(OH2)6]2+"].fragment()
    for seed in range(6):
        turn = Rotation.random(rng=seed).as_matrix()
        report = bond_report(Fragment(fragment.symbols, fragment.positions_A @ turn.T, 2, 2))
        assert len({level.function for level in report.sites[0].ladder.levels}) == 5


def test_tetrahedral_levels_are_named_in_the_axes_of_the_cube():
    levels = bond_report(SPECIES["MnO4 -"].fragment()).sites[0].ladder.levels
    assert {level.function for level in levels[:2]} == {"dz2", "dx2-y2"}
    assert {level.function for level in levels[2:]} == {"dxy", "dxz", "dyz"}
    assert all(level.function_share > 0.99 for level in levels)


def test_ten_dq_of_a_tetrahedral_ion_is_four_thirds_sigma_less_sixteen_ninths_pi_schaffer_jorgensen_1965():
    parameters = bond_report(SPECIES["MnO4 -"].fragment()).sites[0].parameters
    found = {item.symmetry: item.value_eV for item in parameters.angular_overlap}
    expected = (4 / 3 * found["sigma"] - 16 / 9 * found["pi"]) * PER_CM_PER_EV
    assert parameters.crystal_field_per_cm["10Dq"] == pytest.approx(expected, rel=1e-4)


def test_few_iterations_never_turn_a_clean_case_into_a_smeared_one():
    report = bond_report(SPECIES["[VO(OH2)5]2+"].fragment(), options=Options(max_iterations=15))
    assert report.method.smearing_eV == 0


def test_counted_f_shell_without_functions_in_the_set_gets_no_d_terms():
    standard = basis_params.load_set("standard")
    lanthanum = standard.elements["La"]
    praseodymium = basis_params.ElementParameters("Pr", lanthanum.valence_electrons, lanthanum.shells)
    own = basis_params.ParameterTable("own", "1", standard.settings, {"F": standard.elements["F"], "Pr": praseodymium})
    octahedron = 2.3 * np.array([[0, 0, 0], [1, 0, 0], [-1, 0, 0], [0, 1, 0], [0, -1, 0], [0, 0, 1], [0, 0, -1.0]])
    spectrum = bond_report(Fragment(("Pr", *["F"] * 6), octahedron, -3, None), own).spectroscopy
    assert spectrum.terms is None
    assert any("f shell" in reason for reason in spectrum.withheld)


def test_one_oxidation_state_for_two_metals_is_refused():
    with pytest.raises(EhmoError, match="2 metals"):
        bond_report(heptoxide("Mn", 0, 1.585, 1.77), options=Options(oxidation_state=7))


def test_unpaired_density_off_the_metal_is_a_doubt(standard):
    # Ferrate(VI) with two electrons in a level that is half oxygen; permanganate has no unpaired density at all.
    report = bond_report(SPECIES["FeO4 2-"].fragment())
    settings = effective_settings(standard.settings, Options())
    b = calculate_bonding(report.fragment, report.coordination, standard, settings, Options())
    on_metal = b.populations.spin[0] / 2
    said = electronic_warnings(report.fragment, report.coordination, report.electrons, b)
    assert any("unpaired density" in warning for warning in said) is bool(on_metal < 0.5)
    moved = replace(b, populations=replace(b.populations, spin=np.array([0.4, 0.4, 0.4, 0.4, 0.4])))
    said = electronic_warnings(report.fragment, report.coordination, report.electrons, moved)
    assert any("only 20 %" in warning for warning in said)


def test_bond_valences_of_several_equal_metals_are_held_against_their_mean_state():
    good = replace(dichromate(), charge=-2, unpaired_electrons=0)
    stretched = replace(good, positions_A=good.positions_A * 1.03)
    told = [warning for warning in bond_report(stretched).warnings if "bond-valence" in warning]
    assert told
    assert "counting gives 6 on the average" in told[0]
    assert not [warning for warning in bond_report(good).warnings if "bond-valence" in warning]
