"""Tables for papers: numbers of the report, and hostile text that stays text in each format."""

import csv
import io
import math
import re
from dataclasses import replace

import pytest

from ehmo import Fragment, bond_report
from ehmo.cli import papers
from ehmo.report.bond_table import CSV_COLUMNS, TABLE_FORMATS, bond_table, structure_name, table_rows
from ehmo.report.escaping import latex_text, markdown_text
from ehmo.studies.spread import spread_report
from tests.geometries import SPECIES

HOSTILE = '=cmd()|"x" \\input{/etc/passwd} <script>alert(1)</script> 100% $a_b^c$ & # ~ `x` [l](javascript:x)\n\x1b[31m'


@pytest.fixture(scope="module")
def vocl3():
    return bond_report(SPECIES["VOCl3"].fragment())


@pytest.fixture(scope="module")
def spread():
    return spread_report(SPECIES["VOCl3"].fragment(), draws=3)


def cells(report, form):
    """Body of a Markdown or LaTeX table."""
    text = bond_table([report], form)
    if form == "markdown":
        return [[cell.strip() for cell in line.strip("|").split(" | ")] for line in text.splitlines()[2:-2]]
    body = text.split(r"\midrule")[1].split(r"\bottomrule")[0]
    return [[cell.strip() for cell in line.removesuffix(r" \\").split("&")] for line in body.strip().splitlines()]


def test_csv_gives_each_bond_and_weights_add_up(vocl3):
    rows = list(csv.DictReader(io.StringIO(bond_table([vocl3], "csv"))))
    assert tuple(rows[0]) == CSV_COLUMNS
    assert [row["bond"] for row in rows] == ["V1-O2", "V1-Cl3", "V1-Cl4", "V1-Cl5"]
    for row, orders in zip(rows, vocl3.orders, strict=True):
        weights = sum(float(row[f"{part}_weight"]) for part in ("sigma", "pi", "delta", "phi"))
        assert weights == pytest.approx(orders.wiberg, rel=1e-4)
        assert float(row["mayer"]) == pytest.approx(orders.mayer, rel=1e-5)
        assert row["mayer_sd"] == ""
    assert float(rows[0]["formal_order"]) == 3.0


@pytest.mark.parametrize("form", ["latex", "markdown"])
def test_numbers_are_those_of_the_report(vocl3, form):
    for row, (bond, orders) in zip(cells(vocl3, form), vocl3.bonds(), strict=True):
        numbers = [re.sub(r"[$\\]", "", cell) for cell in row]
        assert numbers[0] == vocl3.bond_label(bond)
        assert numbers[1] == bond.kind
        assert numbers[2] == f"{bond.length_A:.3f}"
        values = (orders.overlap_population, orders.mayer, orders.wiberg)
        assert numbers[3:6] == [f"{value:.2f}" for value in values]
        assert float(numbers[6]) + float(numbers[7]) == pytest.approx(orders.wiberg, abs=0.02)
    assert cells(vocl3, form)[0][-1] == "3"


def test_deviations_stand_beside_the_numbers(spread):
    own = spread.spread.bonds[0]
    assert cells(spread, "markdown")[0][4] == f"{spread.orders[0].mayer:.2f} ± {own.mayer:.2f}"
    assert cells(spread, "latex")[0][4] == rf"${spread.orders[0].mayer:.2f} \pm {own.mayer:.2f}$"
    rows = list(csv.DictReader(io.StringIO(bond_table([spread], "csv"))))
    assert float(rows[0]["mayer_sd"]) == pytest.approx(own.mayer, rel=1e-5)
    # Two pi channels: the deviation of their sum is not told by those of the two.
    row = table_rows([spread])[0]
    assert math.isnan(row.deviations[4])


def test_several_structures_have_a_column_of_their_names(vocl3):
    other = bond_report(SPECIES["MnO4 -"].fragment())
    assert structure_name(other) == "[MnO4]- (MnO4 -)"
    for form in TABLE_FORMATS:
        text = bond_table([vocl3, other], form)
        assert "structure" in text
        assert "MnO4" in text


def hostile(vocl3):
    """The same report from a file of a hostile name."""
    fragment = Fragment(vocl3.fragment.symbols, vocl3.fragment.positions_A, 0, 0, title=HOSTILE, source=HOSTILE)
    return replace(vocl3, fragment=fragment)


def test_hostile_names_stay_text_in_csv(vocl3):
    row = table_rows([vocl3])[0]
    rows = list(csv.reader(io.StringIO(bond_table([hostile(vocl3), vocl3], "csv"))))
    assert len(rows) == 9
    assert all(cell[:1] not in "=+@\t\r" or not cell for line in rows for cell in line)
    assert row.structure.startswith("VOCl3")


@pytest.mark.parametrize("text", ["=1+1", "+1", "-1", "@x", "\t=1", "\r=1"])
def test_cells_that_look_like_formulas_begin_with_an_apostrophe(vocl3, text, monkeypatch):
    from ehmo.report import bond_table as module

    monkeypatch.setattr(module, "structure_name", lambda _: text)
    rows = list(csv.reader(io.StringIO(bond_table([vocl3], "csv"))))
    assert rows[1][0][0] in "'\\"


def test_hostile_names_stay_text_in_latex(vocl3):
    text = bond_table([hostile(vocl3), vocl3], "latex")
    assert r"\input" not in text
    assert "\x1b" not in text
    assert len(text.splitlines()) == len(bond_table([vocl3, vocl3], "latex").splitlines())
    caption = latex_text(HOSTILE)
    assert re.search(r"(?<!\\)[#%&_$]", caption) is None
    # Every backslash begins a command of ours or escapes a single character.
    for command in re.findall(r"\\([a-zA-Z]+|.)", caption):
        assert command in {"textbackslash", "textasciicircum", "textasciitilde", "textless", "textgreater", "textbar",
                           "textquotedbl", *"{}$&#%_"}  # fmt: skip


def test_hostile_names_stay_text_in_markdown(vocl3):
    lines = bond_table([hostile(vocl3), vocl3], "markdown").splitlines()
    assert len(lines) == 2 + 8 + 2
    widths = {len(re.findall(r"(?<!\\)\|", line)) for line in lines[:-2]}
    assert len(widths) == 1
    shown = markdown_text(HOSTILE)
    assert "<" not in shown
    assert re.search(r"(?<!\\)[`*_\[\]|]", shown) is None


def test_formats_of_the_command_are_those_of_the_writers():
    assert papers.TABLE_FORMATS == TABLE_FORMATS
