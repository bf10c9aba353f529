"""What every kind of figure keeps to: bytes, fonts, colours, hostile text, the reader's own settings."""

import re
import xml.etree.ElementTree as ET
from dataclasses import replace

import matplotlib as mpl
import pytest

from ehmo import Fragment, bond_report
from ehmo.report.figures.canvas import figure_bytes
from ehmo.report.figures.catalogue import FIGURE_KINDS
from ehmo.report.look import DARK, LIGHT
from tests.geometries import SPECIES
from tests.report.figures.boxes import overlapping
from tests.report.figures.reports import report

PLAIN_TAGS = {
    *("svg", "metadata", "RDF", "Work", "type", "format", "creator", "Agent", "title", "defs", "style", "g", "path"),
    *("use", "clipPath", "rect"),
}
MOLECULAR = [kind for kind in FIGURE_KINDS.values() if kind.source == "molecule"]
HOSTILE = "<script>alert(1)</script>--><svg onload=x> $\\frac{1}{0}$ \x1b[31m =cmd()"
NAMES = [kind.name for kind in MOLECULAR]


@pytest.mark.parametrize("kind", MOLECULAR, ids=NAMES)
def test_the_same_record_gives_the_same_bytes(kind):
    again = bond_report(SPECIES["[VO(OH2)5]2+"].fragment())
    for form in ("svg", "pdf", "png"):
        first = figure_bytes(kind.draw(report("[VO(OH2)5]2+"), look=LIGHT, width_cm=8.4), form)
        assert first == figure_bytes(kind.draw(again, look=LIGHT, width_cm=8.4), form)


@pytest.mark.parametrize("kind", MOLECULAR, ids=NAMES)
def test_settings_of_the_reader_change_nothing(kind):
    wanted = figure_bytes(kind.draw(report("VOCl3"), look=LIGHT, width_cm=8.4), "svg")
    with mpl.rc_context({"font.size": 30, "text.usetex": True, "lines.linewidth": 9, "svg.hashsalt": None}):
        assert figure_bytes(kind.draw(report("VOCl3"), look=LIGHT, width_cm=8.4), "svg") == wanted


@pytest.mark.parametrize("kind", MOLECULAR, ids=NAMES)
def test_text_is_outlined_in_svg_and_its_fonts_are_embedded_in_pdf(kind):
    figure = kind.draw(report("[VO(OH2)5]2+"), look=LIGHT, width_cm=8.4)
    svg = figure_bytes(figure, "svg").decode()
    assert "<text" not in svg
    assert "font-family" not in svg
    pdf = figure_bytes(figure, "pdf")
    fonts = re.findall(rb"/BaseFont /(\S+)", pdf)
    assert fonts
    assert pdf.count(b"/FontFile2") >= len([font for font in set(fonts) if b"DejaVu" in font]) > 0
    assert b"CreationDate" not in pdf


@pytest.mark.parametrize("kind", MOLECULAR, ids=NAMES)
@pytest.mark.parametrize("look", [LIGHT, DARK], ids=["light", "dark"])
def test_the_look_gives_the_paper(kind, look):
    figure = kind.draw(report("VOCl3"), look=look, width_cm=8.4)
    assert mpl.colors.to_hex(figure.get_facecolor()) == look.paper
    colours = set(re.findall(r"#[0-9a-f]{6}", figure_bytes(figure, "svg").decode()))
    other = LIGHT if look is DARK else DARK
    assert look.ink in colours
    assert {other.ink, other.paper} & colours <= {look.paper}


@pytest.mark.parametrize("kind", MOLECULAR, ids=NAMES)
def test_hostile_text_is_inert(kind):
    plain = report("VOCl3")
    fragment = Fragment(plain.fragment.symbols, plain.fragment.positions_A, 0, 0, title=HOSTILE, source=HOSTILE)
    hostile = replace(plain, fragment=fragment)
    figure = kind.draw(hostile, look=LIGHT, width_cm=8.4)
    assert overlapping(figure) == []
    svg = figure_bytes(figure, "svg").decode()
    tags = {element.tag.rpartition("}")[2] for element in ET.fromstring(svg).iter()}
    assert tags <= PLAIN_TAGS
    for word in ("<script", "onload", "\x1b", "frac"):
        assert word not in svg


def test_text_in_the_comments_of_svg_ends_no_comment():
    """Labels are set letter by letter and named in comments; none of them can close one."""
    from ehmo.report.figures.canvas import new_figure, paper_axes, settings
    from ehmo.report.figures.markup import write

    with settings(LIGHT):
        figure = new_figure(8.4, 5, layout=None)
        write(paper_axes(figure), 1, 1, HOSTILE)
    svg = figure_bytes(figure, "svg").decode()
    tags = {element.tag.rpartition("}")[2] for element in ET.fromstring(svg).iter()}
    assert "script" not in tags
    assert len([tag for tag in tags if tag == "svg"]) == 1
    assert "\x1b" not in svg
