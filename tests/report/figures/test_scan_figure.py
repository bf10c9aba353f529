"""The scan figure: lines true to the record, written and read back alike."""

from dataclasses import replace

import numpy as np
import pytest

from ehmo import Options
from ehmo.errors import InputError
from ehmo.report.figures.canvas import figure_bytes
from ehmo.report.figures.scan import scan_figure
from ehmo.report.look import DARK, LIGHT
from ehmo.report.scan_document import scan_document, scan_text_json
from ehmo.report.scan_reading import read_scan, scan_from_document
from ehmo.structure import assign_electrons, perceive
from ehmo.studies.scan import bond_plan, empty_scan, run_scan
from tests.energy.fragments import STANDARD, with_terms
from tests.geometries import SPECIES
from tests.report.figures.boxes import outside, overlapping, words

# Invented terms, for these tests only.
CALIBRATED = with_terms(("V", "O", 2500.0, 4.2, 1.45, 2.0))


def scan(name, words, first, last, steps, table):
    fragment = SPECIES[name].fragment()
    coordination = perceive(fragment)
    plan = bond_plan(fragment, coordination, words, first, last, steps)
    return run_scan(fragment, coordination, assign_electrons(fragment, coordination), plan, table, Options())


@pytest.fixture(scope="module")
def vocl3():
    return scan("VOCl3", "V1-O2", 1.45, 1.75, 7, CALIBRATED)


@pytest.fixture(scope="module")
def vanadyl():
    return scan("[VO(OH2)5]2+", "V1-O2", 1.5, 2.2, 6, STANDARD)


def lines(axes):
    return [line for line in axes.lines if line.get_gid() == "line"]


@pytest.mark.parametrize(("look", "width"), [(LIGHT, 8.4), (DARK, 17.4)])
def test_no_two_words_overlap(vocl3, vanadyl, look, width):
    for one in (vocl3, vanadyl):
        figure = scan_figure(one, look=look, width_cm=width)
        assert overlapping(figure) == []
        assert outside(figure) == []


def test_channels_and_order_are_those_of_the_points(vocl3):
    axes = scan_figure(vocl3).axes[1]
    own = [point.bonds[vocl3.scanned_bond] for point in vocl3.points]
    wanted = [[bond.mayer for bond in own], [bond.sigma for bond in own], [bond.pi for bond in own]]
    for line, values in zip(lines(axes), wanted, strict=False):
        np.testing.assert_allclose(line.get_xdata(), [point.value for point in vocl3.points])
        np.testing.assert_allclose(line.get_ydata(), values)


def test_levels_are_those_of_the_ladder_followed_by_irrep(vanadyl):
    axes = scan_figure(vanadyl).axes[2]
    drawn = sorted(line.get_ydata().tolist() for line in lines(axes))
    # In C4v every function of the d shell but xz and yz has an irrep of its own.
    functions = {level.function for level in vanadyl.points[0].levels}
    wanted = sorted(
        [next(level.energy_eV for level in point.levels if level.function == name) for point in vanadyl.points]
        for name in functions
    )
    np.testing.assert_allclose(drawn, wanted, atol=1e-3)


def test_levels_of_one_irrep_do_not_cross(vocl3):
    """The two e sets of C3v change their leading functions between two points, and repel each other."""
    first, last = (
        [level.function for level in point.levels if level.irrep == "e"]
        for point in (vocl3.points[0], vocl3.points[-1])
    )
    assert first != last
    drawn = np.sort([line.get_ydata() for line in lines(scan_figure(vocl3).axes[2])], axis=0)
    found = [[level.energy_eV for level in point.levels if level.irrep == "e"] for point in vocl3.points]
    rows = [line.get_ydata().tolist() for line in lines(scan_figure(vocl3).axes[2])]
    assert drawn.shape == (5, len(vocl3.points))
    for row in np.transpose(found).tolist():
        assert row in rows


def test_other_orbitals_are_followed_by_character(vanadyl):
    axes = scan_figure(vanadyl).axes[2]
    drawn = [line.get_ydata() for line in axes.lines if line.get_gid() == "orbital"]
    every = np.array([point.energies_eV[point.followed] for point in vanadyl.points]).T
    assert len(drawn) >= 5
    for row in drawn:
        seen = np.isfinite(row)
        assert (np.abs(every[:, seen] - row[seen]).max(axis=1) < 1e-12).any()


def test_energy_stands_where_the_set_is_calibrated_and_nowhere_else(vocl3, vanadyl):
    assert len(scan_figure(vanadyl).axes) == 3
    axes = scan_figure(vocl3).axes[3]
    np.testing.assert_allclose(lines(axes)[0].get_ydata(), [point.energy_eV for point in vocl3.points])
    minimum = next(line for line in axes.lines if line.get_marker() == "D")
    assert minimum.get_xdata()[0] == vocl3.minimum.length_A
    assert minimum.get_ydata()[0] == vocl3.minimum.energy_eV


def test_points_that_failed_leave_a_gap_and_are_not_drawn(vocl3):
    failed = replace(vocl3.points[2], fault="no convergence")
    holed = replace(vocl3, points=(*vocl3.points[:2], failed, *vocl3.points[3:]))
    assert len(lines(scan_figure(holed).axes[1])[0].get_xdata()) == len(vocl3.points) - 1
    with pytest.raises(InputError, match="fewer than two points"):
        scan_figure(replace(vocl3, points=vocl3.points[:1]))
    with pytest.raises(InputError, match="no bond number 7"):
        scan_figure(vocl3, 7)


def test_a_scan_comes_back_from_its_document(vocl3, tmp_path):
    again = scan_from_document(scan_document(vocl3))
    assert scan_text_json(again) == scan_text_json(vocl3)
    path = tmp_path / "scan.json"
    path.write_text(scan_text_json(vocl3))
    assert figure_bytes(scan_figure(read_scan(path)), "svg") == figure_bytes(scan_figure(vocl3), "svg")


@pytest.mark.parametrize("text", ["", "[]", "{}", '{"schema": "ehmo scan 1"}', "[" * 100_000, '{"schema": "other 1"}'])
def test_files_that_are_no_scan_are_refused(tmp_path, text):
    path = tmp_path / "scan.json"
    path.write_text(text)
    with pytest.raises(InputError, match="no scan"):
        read_scan(path)


def test_files_that_cannot_be_used_are_refused(tmp_path, vocl3):
    with pytest.raises(InputError, match="cannot be read"):
        read_scan(tmp_path / "none.json")
    path = tmp_path / "scan.json"
    path.write_bytes(b"\xff\xfe\x00")
    with pytest.raises(InputError, match="no text"):
        read_scan(path)
    path.write_text(scan_text_json(vocl3))
    with pytest.raises(InputError, match="--max-bytes"):
        read_scan(path, max_bytes=100)
    fragment = SPECIES["VOCl3"].fragment()
    coordination = perceive(fragment)
    start = empty_scan(
        fragment, coordination, assign_electrons(fragment, coordination), vocl3.plan, STANDARD, Options()
    )
    path.write_text(scan_text_json(start))
    with pytest.raises(InputError, match="no points"):
        read_scan(path)


def test_hostile_labels_are_drawn_letter_by_letter(vocl3):
    hostile = replace(vocl3, labels=("$\\frac{1}{0}$\x1b[31m", *vocl3.labels[1:]), bond_labels=("<b>", "$x", "2", "3"))
    said = [text for text, _ in words(scan_figure(hostile))]
    assert any("\\x1b" in text for text in said)
    assert "\x1b" not in figure_bytes(scan_figure(hostile), "svg").decode()
