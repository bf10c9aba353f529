"""The report as people read it: on a terminal, when printed, in a notebook."""

from __future__ import annotations

import re
from dataclasses import replace

import pytest

from ehmo import bond_report
from ehmo.records.report import BondReport
from ehmo.report.cautions import CAUTIONS
from ehmo.report.text import bond_text
from tests.geometries import SPECIES

WIDEST = 125


@pytest.fixture(scope="module")
def report() -> BondReport:
    return bond_report(SPECIES["[VO(OH2)5]2+"].fragment())


def test_each_bond_has_a_row_with_its_numbers(report):
    lines = bond_text(report).splitlines()
    for bond, orders in report.bonds():
        row = next(line for line in lines if line.split()[:1] == [report.bond_label(bond)])
        for cell in (bond.kind, f"{bond.length_A:.3f}", f"{orders.overlap_population:.2f}", f"{orders.mayer:.2f}"):
            assert cell in row
    oxo = next(line for line in lines if line.split()[:2] == ["V1-O2", "oxo"])
    assert "pi 0.8" in oxo
    assert "one sigma, two pi by calculation" in " ".join(bond_text(report).split())


@pytest.mark.parametrize("words", ["Mulliken charges", "Frontier orbitals", "Assumed", "To doubt", "Cautions"])
def test_sections(report, words):
    assert words in bond_text(report)


def test_cautions_and_warnings_are_given_in_full(report):
    doubtful = replace(report, warnings=("The first doubt.", "The second doubt."))
    text = " ".join(bond_text(doubtful).split())
    for sentence in (*CAUTIONS, *doubtful.warnings, *report.assumptions):
        assert " ".join(sentence.split()) in text


def test_charges_listed_add_up_to_the_charge(report):
    section = bond_text(report).split("Mulliken charges")[1].split("\n\n")[0]
    rows = [re.match(r"\s+(\S+|all others)\s+([+-]\d+\.\d+)", line) for line in section.splitlines()]
    assert sum(float(row[2]) for row in rows if row) == pytest.approx(2, abs=0.05)


def test_frontier_orbitals_fall_and_show_the_single_electron(report):
    section = bond_text(report).split("Frontier orbitals")[1].split("\n\n")[0]
    rows = [line.split() for line in section.splitlines() if re.match(r"\s+\d+\s", line)]
    energies = [next(float(cell) for cell in row if re.fullmatch(r"-?\d+\.\d\d", cell)) for row in rows]
    assert energies == sorted(energies, reverse=True)
    (single,) = [row for row in rows if "b2" in row]
    assert "1" in single
    assert int(single[0]) == report.state.homo + 1
    assert "3dxy" in single


def test_no_line_is_wider_than_a_terminal_window(report):
    for line in bond_text(report).splitlines():
        assert len(line) <= WIDEST, line


@pytest.mark.parametrize("name", SPECIES)
def test_no_line_of_any_species_runs_far_out(name):
    # Bonds with many partial channels take more room than a window of 120 columns, but never much.
    assert max(map(len, bond_text(bond_report(SPECIES[name].fragment())).splitlines())) <= WIDEST + 20


HOSTILE = "\x1b[2Jred\x07\r\nBonds of V1\n  V1-O2  oxo  9.99\u202e"


def test_control_characters_are_shown_and_not_obeyed(report):
    odd = replace(
        report,
        fragment=replace(report.fragment, title=HOSTILE, source=HOSTILE),
        method=replace(report.method, parameter_set=HOSTILE, edition=HOSTILE),
        assumptions=(HOSTILE,),
        warnings=(HOSTILE,),
    )
    text = bond_text(odd)
    assert all(char.isprintable() or char == "\n" for char in text)
    assert r"\x1b[2Jred\x07\r\n" in text
    assert len([line for line in text.splitlines() if line == "Bonds of V1"]) == 1


def test_a_very_long_title_does_not_break_the_layout(report):
    odd = replace(report, fragment=replace(report.fragment, title="x" * 5000))
    assert all(len(line) <= WIDEST for line in bond_text(odd).splitlines())


def test_printed_report_is_a_short_table(report):
    assert str(report) == repr(report)
    lines = str(report).splitlines()
    assert len(lines) < 12
    assert all(len(line) <= WIDEST for line in lines)
    assert any("V1-O2" in line and "oxo" in line for line in lines)


def test_printed_report_shows_hostile_set_names(report):
    odd = replace(report, method=replace(report.method, parameter_set=HOSTILE))
    assert all(char.isprintable() or char == "\n" for char in str(odd))


def test_notebook_table_has_a_row_for_each_bond(report):
    html = report._repr_html_()
    bonds, *ladders = html.split("</table>")
    assert bonds.count("<tr>") == len(report.orders) + 1
    assert len(ladders) == 1 + len(report.sites)
    assert ">V1-O2</td>" in html


def test_notebook_table_escapes_markup(report):
    first, *rest = report.coordination.bonds
    odd = replace(
        report,
        coordination=replace(report.coordination, bonds=(replace(first, kind="<script>alert(1)</script>"), *rest)),
        method=replace(report.method, parameter_set="<img src=x onerror=alert(1)>"),
        fragment=replace(report.fragment, title="<b>"),
    )
    html = odd._repr_html_()
    for tag in ("<script", "<img", "<b>"):
        assert tag not in html
    assert "&lt;script&gt;" in html
