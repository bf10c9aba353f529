"""`ehmo.figures` and records in a notebook."""

from __future__ import annotations

from dataclasses import replace
from html.parser import HTMLParser

import pytest

import ehmo
from ehmo.errors import InputError
from ehmo.records.markup import html_sentences, html_table
from ehmo.report.figures.canvas import figure_bytes
from ehmo.report.figures.catalogue import FIGURE_KINDS
from ehmo.report.figures.interaction import interaction_diagram
from tests.report.figures.reports import report
from tests.report.figures.test_crystal_figure import reo3  # noqa: F401
from tests.report.figures.test_scan_figure import vocl3  # noqa: F401

HOSTILE = "<script>alert(1)</script>\"'&\x1b[31m"


class Tags(HTMLParser):
    """Tags and text of a piece of HTML; every tag must be closed."""

    def __init__(self, html: str) -> None:
        super().__init__()
        self.open: list[str] = []
        self.tags: list[str] = []
        self.text = ""
        self.feed(html)
        self.close()
        assert self.open == []

    def handle_starttag(self, tag, attrs):  # noqa: ARG002 (named by the parser)
        self.open.append(tag)
        self.tags.append(tag)

    def handle_endtag(self, tag):
        assert self.open.pop() == tag

    def handle_data(self, data):
        self.text += data


def test_there_is_a_function_for_every_kind():
    assert set(ehmo.figures.__all__) == {"Drawing", *FIGURE_KINDS}
    assert "figures" in dir(ehmo)


@pytest.mark.parametrize("name", [kind.name for kind in FIGURE_KINDS.values() if kind.source == "molecule"])
def test_drawings_of_a_report(name):
    drawing = getattr(ehmo.figures, name)(report("VOCl3"))
    assert drawing._repr_svg_() == drawing.svg()
    assert drawing.svg().startswith("<?xml")
    assert drawing.figure.get_size_inches()[0] * 25.4 == pytest.approx(84)


def test_a_drawing_is_that_of_the_function_behind_it(tmp_path):
    wanted = figure_bytes(interaction_diagram(report("VOCl3"), 1, width_cm=10), "svg").decode()
    label = report("VOCl3").bond_label(report("VOCl3").coordination.bonds[1])
    assert ehmo.figures.interaction(report("VOCl3"), label, width_mm=100).svg() == wanted
    drawing = ehmo.figures.interaction(report("VOCl3"), 1, width_mm=100)
    drawing.save(tmp_path / "a.svg")
    assert (tmp_path / "a.svg").read_text(encoding="utf-8") == wanted
    with pytest.raises(InputError, match="no figure format"):
        drawing.save(tmp_path / "a.doc")
    with pytest.raises(InputError, match="cannot write"):
        drawing.save(tmp_path / "none" / "a.svg")
    with pytest.raises(InputError, match="bonds are"):
        ehmo.figures.interaction(report("VOCl3"), "V1-O9")
    with pytest.raises(InputError, match="no look"):
        ehmo.figures.ladder(report("VOCl3"), look="pink")


def test_drawings_of_other_records(reo3, vocl3):  # noqa: F811
    assert ehmo.figures.crystal(reo3, (-6, 4)).svg() != ehmo.figures.crystal(reo3).svg()
    assert ehmo.figures.scan(vocl3, vocl3.bond_labels[1]).svg() != ehmo.figures.scan(vocl3).svg()
    assert ehmo.figures.overview([report("VOCl3")]).figure.get_size_inches()[0] * 25.4 == pytest.approx(174)


def test_a_bond_report_shows_bonds_levels_and_doubts():
    found = report("[VO(OH2)5]2+")
    page = Tags(found._repr_html_())
    assert page.tags.count("table") == 2
    assert page.tags.count("caption") == 2
    for words in ("V1-O2", "2.35", "3d levels, ground term 2B2", "b2 dxy", found.assumptions[0]):
        assert words in page.text
    numbers = sum(len(site.ladder.levels) for site in found.sites)
    assert page.tags.count("tr") == 1 + len(found.orders) + 1 + numbers


def test_other_records_show_as_tables(reo3, vocl3):  # noqa: F811
    page = Tags(reo3._repr_html_())
    assert page.tags.count("tr") == 1 + len(reo3.units)
    assert "metal" in page.text
    page = Tags(vocl3._repr_html_())
    assert page.tags.count("tr") == 1 + len(vocl3.points)
    failed = replace(vocl3.points[0], fault=HOSTILE)
    page = Tags(replace(vocl3, points=(failed,))._repr_html_())
    assert "script" not in page.tags


def test_hostile_words_stay_text(reo3):  # noqa: F811
    hostile = replace(reo3, networks=(HOSTILE,), warnings=(HOSTILE,))
    hostile = replace(hostile, units=tuple(replace(unit, metal=HOSTILE) for unit in reo3.units))
    html = hostile._repr_html_()
    assert "script" not in Tags(html).tags
    assert "\x1b" not in html
    made = html_table(HOSTILE, [[HOSTILE, "a"], [HOSTILE, "b"]], (1,)) + html_sentences("x", [HOSTILE])
    assert set(Tags(made).tags) == {"table", "caption", "tr", "th", "td", "details", "summary", "ul", "li"}
    assert html_sentences("x", []) == ""
