"""Scans: the geometry moved, each point equal to its own report, levels followed, restarts."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from ehmo import Fragment, Options, bond_report
from ehmo.errors import InputError, LimitError
from ehmo.report.scan_document import points_done, scan_csv, scan_text_json
from ehmo.structure import assign_electrons, perceive
from ehmo.studies.scan import angle_plan, bond_plan, displaced, empty_scan, run_scan
from tests.geometries import SPECIES

VANADYL = "[VO(OH2)5]2+"


def started(name: str):
    fragment = SPECIES[name].fragment()
    coordination = perceive(fragment)
    return fragment, coordination, assign_electrons(fragment, coordination)


@pytest.fixture(scope="module")
def vanadyl_scan(standard):
    fragment, coordination, electrons = started(VANADYL)
    plan = bond_plan(fragment, coordination, "V1-O2", 1.5, 2.4, 10)
    return run_scan(fragment, coordination, electrons, plan, standard, Options())


@pytest.mark.parametrize(("name", "words"), [(VANADYL, "V1-O2"), (VANADYL, "V1-O3"), ("VO(OCH3)3", "V1-O17")])
def test_ligand_moves_rigidly_along_its_bond(name, words):
    fragment, coordination, _ = started(name)
    plan = bond_plan(fragment, coordination, words, 1.5, 2.5, 3)
    metal, donor = plan.atoms
    before = fragment.positions_A
    after = displaced(fragment, plan, 2.2).positions_A
    assert np.linalg.norm(after[donor] - after[metal]) == pytest.approx(2.2, abs=1e-12)
    moved, stayed = list(plan.moved), [k for k in range(len(fragment)) if k not in plan.moved]
    np.testing.assert_array_equal(after[stayed], before[stayed])
    np.testing.assert_allclose(
        after[moved] - before[moved], np.tile(after[donor] - before[donor], (len(moved), 1)), atol=1e-12
    )


@pytest.mark.parametrize("value", [70.0, 90.0, 150.0, 180.0])
def test_angle_is_what_was_asked_for_and_lengths_stay(value):
    fragment, coordination, _ = started(VANADYL)
    plan = angle_plan(fragment, coordination, "O2-V1-O3", 80, 180, 3)
    after = displaced(fragment, plan, value).positions_A
    first, second = after[1] - after[0], after[2] - after[0]
    found = np.degrees(np.arccos(first @ second / np.linalg.norm(first) / np.linalg.norm(second)))
    assert found == pytest.approx(value, abs=1e-5)
    before = fragment.positions_A
    for i in plan.moved:
        for j in plan.moved:
            assert np.linalg.norm(after[i] - after[j]) == pytest.approx(
                np.linalg.norm(before[i] - before[j]), abs=1e-12
            )


def test_a_turn_out_of_a_straight_line_is_possible():
    fragment, coordination, _ = started("UO2 2+")
    after = displaced(fragment, angle_plan(fragment, coordination, "O2-U1-O3", 180, 150, 2), 150).positions_A
    first, second = after[1] - after[0], after[2] - after[0]
    assert first @ second / np.linalg.norm(first) / np.linalg.norm(second) == pytest.approx(np.cos(np.radians(150)))


def test_each_point_is_the_report_of_its_geometry(vanadyl_scan):
    fragment, _, _ = started(VANADYL)
    for point in (vanadyl_scan.points[1], vanadyl_scan.points[2]):
        report = bond_report(displaced(fragment, vanadyl_scan.plan, point.value))
        by_label = {report.bond_label(bond): orders for bond, orders in report.bonds()}
        for label, bond in zip(vanadyl_scan.bond_labels, point.bonds, strict=True):
            assert bond.mayer == pytest.approx(by_label[label].mayer, abs=1e-6)
        np.testing.assert_allclose(point.charges, report.populations.charges, atol=1e-6)


def test_levels_of_vanadyl_close_up_as_the_oxo_leaves(vanadyl_scan):
    # e falls towards b2 as the pi bond stretches (Ballhausen & Gray 1962; memory); b1 hardly moves.
    gaps = {name: [] for name in ("dxz", "dx2-y2")}
    for point in vanadyl_scan.points[:6]:
        energies = {level.function: level.energy_eV for level in point.levels}
        for name in gaps:
            gaps[name].append(energies[name] - energies["dxy"])
    assert (np.diff(gaps["dxz"]) < -0.05).all()
    assert np.ptp(gaps["dx2-y2"]) < 0.05


def test_levels_are_followed_by_character_through_the_crossing(vanadyl_scan):
    # dxy and dxz change places near 2.25 A: the orbital that began as b2 stays b2.
    first = vanadyl_scan.points[0]
    b2 = [k for k, irrep in enumerate(first.irreps) if irrep == "b2"][-1]
    for point in vanadyl_scan.points:
        assert sorted(point.followed) == list(range(len(point.followed)))
        assert point.irreps[point.followed[b2]] == "b2"
    places = [int(point.followed[b2]) for point in vanadyl_scan.points]
    assert places[0] != places[-1]
    assert any("changes its order" in said for said in vanadyl_scan.crossings)
    assert any("filling changes" in said for said in vanadyl_scan.crossings)


def test_energies_and_minimum_are_withheld_for_a_set_that_is_not_calibrated(vanadyl_scan):
    assert any("not calibrated" in said for said in vanadyl_scan.withheld)


def test_a_scan_that_was_stopped_goes_on_where_it_was(vanadyl_scan, standard):
    fragment, coordination, electrons = started(VANADYL)
    half = replace(vanadyl_scan, points=vanadyl_scan.points[:4])
    start = empty_scan(fragment, coordination, electrons, vanadyl_scan.plan, standard, Options())
    done = points_done(scan_text_json(half), "a.json", start)
    fresh = []
    again = run_scan(
        fragment, coordination, electrons, vanadyl_scan.plan, standard, Options(), done=done, on_point=fresh.append
    )
    assert len(fresh) == len(vanadyl_scan.points) - 4
    for before, after in zip(vanadyl_scan.points, again.points, strict=True):
        assert after.bonds[0].mayer == pytest.approx(before.bonds[0].mayer, abs=1e-6)
        assert after.ground_term == before.ground_term


def test_a_file_of_another_scan_is_refused(vanadyl_scan, standard):
    fragment, coordination, electrons = started("VOCl3")
    plan = bond_plan(fragment, coordination, "V1-O2", 1.5, 1.9, 3)
    start = empty_scan(fragment, coordination, electrons, plan, standard, Options())
    with pytest.raises(InputError, match="another one"):
        points_done(scan_text_json(vanadyl_scan), "a.json", start)
    with pytest.raises(InputError, match="no scan"):
        points_done("{}", "a.json", start)


def test_a_point_that_fails_says_why_and_the_scan_goes_on(standard):
    # The oxo ligand is driven into the metal.
    fragment, coordination, electrons = started("VOCl3")
    plan = bond_plan(fragment, coordination, "V1-O2", 0.5, 1.6, 3)
    fragment_, plan_ = fragment, replace(plan, values=(0.3, 1.5, 1.6))
    scan = run_scan(fragment_, coordination, electrons, plan_, standard, Options())
    assert [bool(point.fault) for point in scan.points] == [True, False, False]
    assert "apart" in scan.points[0].fault
    assert "0.3" in scan_csv(scan).splitlines()[1]


def test_csv_has_one_full_row_per_point(vanadyl_scan):
    heading, *rows = [line.split(",") for line in scan_csv(vanadyl_scan).splitlines()]
    assert len(rows) == len(vanadyl_scan.points)
    assert {len(row) for row in rows} == {len(heading)}
    assert heading[0] == "length_A"
    assert float(rows[0][heading.index("V1-O2 mayer")]) == pytest.approx(
        vanadyl_scan.points[0].bonds[0].mayer, rel=1e-5
    )


@pytest.mark.parametrize(
    ("words", "first", "last", "steps", "error"),
    [
        ("V1-O9x", 1.5, 2.0, 5, "no atom"),
        ("O2-O3", 1.5, 2.0, 5, "no bond"),
        ("V1", 1.5, 2.0, 5, "names 1 atoms"),
        ("V1-O2", 1.5, 1.5, 5, "two different ends"),
        ("V1-O2", 1.5, 2.0, 1, "two different ends"),
        ("V1-O2", float("nan"), 2.0, 5, "no scan"),
        ("V1-O2", -1.0, 2.0, 5, "no scan"),
        ("V1-O2", 1.5, 2.0, 100_000, "more than the limit"),
    ],
)
def test_what_is_no_scan_is_refused(words, first, last, steps, error):
    fragment, coordination, _ = started(VANADYL)
    with pytest.raises((InputError, LimitError), match=error) as caught:
        bond_plan(fragment, coordination, words, first, last, steps)
    assert caught.value.mend


def test_chelating_donor_moves_alone_and_says_so():
    # A bidentate carboxylate: the other donor would be torn along.
    positions = np.array(
        [[0, 0, 0], [0, 0, 1.6], [1.1, 1.7, -0.3], [-1.1, 1.7, -0.3], [0, 2.35, -0.4], [0, 3.4, -0.5], [0, -2, -0.5]]
    )
    fragment = Fragment(("V", "O", "O", "O", "C", "H", "Cl"), positions, 0, 1)
    coordination = perceive(fragment)
    donor = next(bond.donor for bond in coordination.bonds if bond.donor == 2)
    plan = bond_plan(fragment, coordination, f"V1-O{donor + 1}", 1.9, 2.3, 3)
    assert plan.moved == (donor,)
    assert "moves alone" in plan.notes[0]
