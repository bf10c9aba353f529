"""Energies along a scan: given where calibrated, withheld with the reason elsewhere; minimum, modes, relaxation."""

from dataclasses import replace

import numpy as np
import pytest

from ehmo import Fragment, Options
from ehmo.calculate.energy import energy_model
from ehmo.errors import InputError
from ehmo.report.scan_document import points_done, scan_csv, scan_document, scan_text_json
from ehmo.report.scan_text import scan_text
from ehmo.structure import assign_electrons, perceive
from ehmo.studies.displacement import stretched
from ehmo.studies.scan import angle_plan, bond_plan, displaced, empty_scan, run_scan
from ehmo.studies.scan.energies import quartic_minimum
from ehmo.studies.stretching import bond_curvature, equilibrium_change
from ehmo.units import NEWTON_PER_M_PER_EV_A2
from tests.energy.fragments import STANDARD, energy, with_terms
from tests.geometries import SPECIES

# Invented terms, for these tests only.
V_O = ("V", "O", 2500.0, 4.2, 1.45, 2.0)
TABLE = with_terms(V_O)
WHOLE = with_terms(V_O, ("V", "Cl", 2500.0, 3.4, 1.9, 2.6))


def started(name):
    fragment = SPECIES[name].fragment()
    coordination = perceive(fragment)
    return fragment, coordination, assign_electrons(fragment, coordination)


def scan(name, words, first, last, steps, table=TABLE, options=None, relax=False, **more):
    fragment, coordination, electrons = started(name)
    plan = bond_plan(fragment, coordination, words, first, last, steps, relax=relax)
    return run_scan(fragment, coordination, electrons, plan, table, options or Options(), **more)


@pytest.fixture(scope="module")
def found():
    return scan("VOCl3", "V1-O2", 1.55, 1.85, 13)


def test_energy_of_a_point_is_that_of_its_geometry(found):
    fragment, _, _ = started("VOCl3")
    for point in found.points[::4]:
        place = displaced(fragment, found.plan, point.value)
        assert point.energy_eV == pytest.approx(energy(place, table=TABLE).total_eV, abs=1e-7)


def test_minimum_and_force_constant_are_those_of_the_gradient(found):
    fragment, coordination, _ = started("VOCl3")
    bond = next(bond for bond in coordination.bonds if bond.may_be_multiple)
    model = energy_model(TABLE)
    change = equilibrium_change(fragment, coordination, [bond], model)
    assert found.minimum.length_A == pytest.approx(bond.length_A + change, abs=2e-4)
    settled = stretched(fragment, coordination, [bond], np.array([change]))
    curvature = bond_curvature(settled, coordination, bond, model) * NEWTON_PER_M_PER_EV_A2
    assert found.minimum.force_constant_N_per_m == pytest.approx(curvature, rel=0.01)
    assert found.minimum.fit_rms_eV < 1e-4


def test_modes_of_the_scanned_bond_carry_their_masses(found):
    (mode,) = found.minimum.modes
    assert mode.share == pytest.approx(1)
    assert mode.reduced_mass_u == pytest.approx(1 / (1 / 15.999 + 1 / 50.9415), rel=1e-6)  # law
    heavy = scan("VOCl3", "V1-O2", 1.6, 1.8, 7, isotopes={"O2": 18})
    assert heavy.minimum.isotopes == (("O2", 18),)
    ratio = heavy.minimum.modes[0].wavenumber_per_cm / mode.wavenumber_per_cm
    assert ratio == pytest.approx(np.sqrt((1 / 17.99916 + 1 / 50.9415) / (1 / 15.999 + 1 / 50.9415)), rel=1e-3)  # law


def test_degenerate_modes_are_one_entry():
    table = with_terms(("Mn", "O", 1400.0, 4.2, 1.45, 2.1))
    symmetric = scan("MnO4 -", "Mn1-O2", 1.55, 1.75, 9, table)
    shares = sorted(mode.share for mode in symmetric.minimum.modes)
    # Law: one bond is a quarter of a1 and three quarters of t2 (nearly: it alone is stretched to its minimum).
    assert shares == pytest.approx([0.25, 0.75], abs=0.05)


def test_text_csv_and_json_carry_the_energies(found):
    text = scan_text(found, "a.xyz")
    for words in (
        "Energy above the lowest point",
        "Minimum of V1-O2",
        "N/m",
        "stretching mode/cm-1",
        "with every angle",
    ):
        assert words in text
    assert "Withheld" not in text
    heading, first, *_ = [line.split(",") for line in scan_csv(found).splitlines()]
    assert float(first[heading.index("energy_eV")]) == pytest.approx(found.points[0].energy_eV, rel=1e-5)
    document = scan_document(found)
    assert document["minimum"]["modes"][0]["stretches"] == [{"bond": "V1-O2", "part": 1.0}]
    assert document["points"][0]["energy_eV"] == found.points[0].energy_eV


def test_outside_the_range_energies_are_withheld_point_by_point():
    wide = scan("VOCl3", "V1-O2", 1.3, 1.9, 13)
    known = [point.energy_eV is not None for point in wide.points]
    assert known == [1.45 <= point.value <= 2.0 for point in wide.points]
    assert any("calibrated for V-O from 1.45 to 2 Å" in said for said in wide.withheld)
    assert wide.minimum is not None


@pytest.mark.parametrize(
    ("first", "last", "steps", "reason"),
    [(1.72, 1.95, 9, "end of the range"), (1.6, 1.8, 3, "fewer than 5")],
)
def test_no_minimum_says_why(first, last, steps, reason):
    without = scan("VOCl3", "V1-O2", first, last, steps)
    assert without.minimum is None
    assert any(reason in said for said in without.withheld)


@pytest.mark.parametrize(
    ("options", "table", "reason"),
    [
        (Options(), STANDARD, "not calibrated for V-O"),
        (Options(K=1.9), TABLE, "with its own constants"),
        (Options(charge_model="fixed"), TABLE, "with its own constants"),
    ],
)
def test_uncalibrated_models_give_no_energy(options, table, reason):
    without = scan("VOCl3", "V1-O2", 1.6, 1.7, 2, table, options)
    assert all(point.energy_eV is None for point in without.points)
    assert any(reason in said for said in without.withheld)
    assert "energy/eV" not in scan_text(without, "a.xyz")


def test_an_angle_gives_no_energy():
    fragment, coordination, electrons = started("VOCl3")
    plan = angle_plan(fragment, coordination, "O2-V1-Cl3", 100, 110, 3)
    without = run_scan(fragment, coordination, electrons, plan, TABLE, Options())
    assert any("not for angles" in said for said in without.withheld)


def test_energy_is_smooth_on_a_fine_grid():
    """Law: on a grid of 1e-4 A the energy follows a cubic to 1e-6 eV where the state stays."""
    for name, words, start in (
        ("VOCl3", "V1-O2", 1.6),
        ("[VO(OH2)5]2+", "V1-O2", 1.58),
        ("[VO(OH2)5]2+", "V1-O2", 1.9),
    ):
        fine = scan(name, words, start, start + 0.004, 41)
        assert not fine.crossings
        lengths = np.array([point.value for point in fine.points]) - start
        energies = np.array([point.energy_eV for point in fine.points])
        rest = energies - np.polynomial.Polynomial.fit(lengths, energies, 3)(lengths)
        assert np.abs(rest).max() < 1e-6


def test_relaxation_holds_the_length_and_quiets_the_rest():
    relaxed_scan = scan("VOCl3", "V1-O2", 1.6, 1.8, 5, WHOLE, relax=True)
    rigid = scan("VOCl3", "V1-O2", 1.6, 1.8, 5, WHOLE)
    fragment, _, _ = started("VOCl3")
    for point, held in zip(relaxed_scan.points, rigid.points, strict=True):
        assert not point.fault
        assert point.energy_eV <= held.energy_eV + 1e-9
        assert np.linalg.norm(point.positions_A[1] - point.positions_A[0]) == pytest.approx(point.value, abs=1e-5)
        gradient = energy(replace(fragment, positions_A=point.positions_A), table=WHOLE, gradient=True)
        # The rest feels no force: only along the held bond is there one.
        assert np.abs(gradient.gradient_eV_per_A[2:]).max() < 0.02
    assert "relaxed at each point" in relaxed_scan.plan.notes[0]
    assert scan_document(relaxed_scan)["points"][0]["positions_A"] is not None


def test_relaxation_by_a_set_without_terms_is_refused():
    with pytest.raises(InputError, match="no two-body terms of the bonds V-Cl"):
        scan("VOCl3", "V1-O2", 1.6, 1.8, 5, relax=True)


def test_a_relaxed_scan_goes_on_where_it_stopped():
    whole = scan("VOCl3", "V1-O2", 1.6, 1.8, 5, WHOLE, relax=True)
    fragment, coordination, electrons = started("VOCl3")
    half = scan_text_json(replace(whole, points=whole.points[:3]))
    start = empty_scan(fragment, coordination, electrons, whole.plan, WHOLE, Options())
    done = points_done(half, "a.json", start)
    fresh = []
    again = run_scan(fragment, coordination, electrons, whole.plan, WHOLE, Options(), done=done, on_point=fresh.append)
    assert len(fresh) == 2
    assert again.minimum.length_A == pytest.approx(whole.minimum.length_A, abs=1e-6)
    np.testing.assert_allclose(again.points[0].positions_A, whole.points[0].positions_A)
    rigid = empty_scan(fragment, coordination, electrons, replace(whole.plan, relaxed=False), WHOLE, Options())
    with pytest.raises(InputError, match="differs in relaxed"):
        points_done(half, "a.json", rigid)
    other = empty_scan(fragment, coordination, electrons, whole.plan, WHOLE, Options(K=1.8))
    with pytest.raises(InputError, match="differs in constants"):
        points_done(half, "a.json", other)


def test_running_into_another_atom_is_told_per_point():
    # A chloride that is driven past the metal's other side, through the oxo ligand's place.
    fragment = Fragment(("V", "O", "Cl", "O"), [[0, 0, 0], [0, 0, 1.6], [0, 2.2, -0.5], [0, 4.6, -1.05]], -1, 1)
    coordination = perceive(fragment)
    plan = bond_plan(fragment, coordination, "V1-Cl3", 2.2, 5.2, 7)
    electrons = assign_electrons(fragment, coordination, -1, 1)
    through = run_scan(fragment, coordination, electrons, plan, TABLE, Options())
    faults = {round(point.value, 1): point.fault for point in through.points}
    assert "Cl3 runs upon O4" in faults[4.7]
    assert not faults[2.2]


def test_charges_that_stop_converging_are_told_per_point():
    few = scan("VOCl3", "V1-O2", 1.6, 1.8, 3, options=Options(max_iterations=2))
    assert all("charges still change" in point.fault for point in few.points)
    assert few.minimum is None


def test_a_change_of_filling_next_to_the_minimum_is_no_minimum():
    found = scan("VOCl3", "V1-O2", 1.6, 1.8, 9)
    from ehmo.studies.scan.energies import minimum

    fragment, coordination, _ = started("VOCl3")
    lowest = min(range(9), key=lambda k: found.points[k].energy_eV)
    points = list(found.points)
    points[lowest] = replace(points[lowest], smearing_eV=0.02)
    none, reason = minimum(points, fragment, coordination, found.plan, TABLE, Options(), {})
    assert none is None
    assert "filling changes" in reason


def test_quartic_gives_back_a_quartic():
    x = np.linspace(1.5, 1.8, 7)
    length, lowest, curvature, rms = quartic_minimum(x, 3 + 20 * (x - 1.62) ** 2 - 30 * (x - 1.62) ** 3)
    assert (length, lowest, curvature) == pytest.approx((1.62, 3, 40))  # law
    assert rms < 1e-10
    assert np.isnan(quartic_minimum(x, x)[2])
