"""The overview of many bonds: every bond drawn, those off their trend named."""

import numpy as np
import pytest

from ehmo.errors import InputError
from ehmo.report.figures.canvas import figure_bytes
from ehmo.report.figures.overview import MOST_NAMED, PlottedBond, bonds_of, off_trend, overview_figure
from ehmo.report.look import DARK, LIGHT
from ehmo.store.trends import order_trend
from tests.report.figures.boxes import outside, overlapping, words
from tests.report.figures.reports import SIMPLE_TO_CROWDED, report

HOSTILE = "<script>alert(1)</script>--> $\\frac{1}{0}$ \x1b[31m =cmd()" + "/long" * 40 + ".cif"


def strewn(metals=("V", "Mo", "W"), off=(), count=40):
    """Bonds on straight lines with a little noise, and some of them moved off."""
    random = np.random.default_rng(7)
    bonds = []
    for metal in metals:
        for kind, length, order in (("oxo", 1.65, 2.2), ("aqua", 2.1, 0.4), ("halide", 2.3, 0.7)):
            for k in range(count):
                at = length + 0.05 * random.standard_normal()
                mayer = order - 2 * (at - length) + 0.02 * random.standard_normal()
                mayer += dict(off).get((metal, kind, k), 0.0)
                bonds.append(PlottedBond(metal, kind, at, mayer, f"{k}.cif", "M1-X2"))
    return bonds


def points(figure):
    return sorted(
        (float(x), float(y))
        for axes in figure.axes
        for line in axes.lines
        if line.get_gid() == "bonds"
        for x, y in zip(line.get_xdata(), line.get_ydata(), strict=True)
    )


def test_every_bond_of_some_reports_is_drawn():
    bonds = bonds_of(report(name) for name in SIMPLE_TO_CROWDED)
    figure = overview_figure(bonds)
    assert points(figure) == sorted((bond.length_A, bond.mayer) for bond in bonds)
    assert overlapping(figure) == []
    assert outside(figure) == []
    assert bonds_of([report("VOCl3")])[0].label == "V1-O2"


@pytest.mark.parametrize(("look", "width"), [(LIGHT, 8.4), (DARK, 17.4)])
def test_no_two_words_overlap(look, width):
    off = [(("V", "oxo", k), 0.6 + 0.02 * k) for k in range(5)] + [(("W", "aqua", k), 0.7) for k in range(5)]
    metals = ("V", "Mo", "W", "Cr", "Re", "Os", "U", "Fe", "Mn", "Ti", "Tc", "Ru", "Nb", "Ta")
    figure = overview_figure(strewn(metals, off, 25), look=look, width_cm=width)
    assert overlapping(figure) == []
    assert outside(figure) == []
    assert any("of other metals not drawn" in text for text, _ in words(figure))


def test_bonds_off_their_trend_are_found_and_no_others():
    off = {("V", "oxo", 3): 0.8, ("W", "halide", 8): -0.6, ("Mo", "aqua", 1): 0.5}
    found = off_trend(strewn(off=off.items()))
    assert [(one.bond.metal, one.bond.kind, one.bond.source) for one in found] == [
        (metal, kind, f"{k}.cif") for metal, kind, k in off
    ]
    assert [one.distance for one in found] == pytest.approx(list(off.values()), abs=0.08)


def test_lines_and_outliers_are_those_of_the_summary():
    bonds = [bond for bond in strewn(("V",)) if bond.kind == "oxo"]
    line = order_trend(np.array([b.length_A for b in bonds]), np.array([b.mayer for b in bonds]))
    figure = overview_figure(bonds)
    drawn = next(one for one in figure.axes[1].lines if one.get_gid() == "trend")
    assert drawn.get_ydata() == pytest.approx(line.at(drawn.get_xdata()))


def test_few_bonds_have_no_trend():
    off = {("V", "oxo", 3): 0.8}
    assert off_trend(strewn(off=off.items(), count=11)) == []
    assert len(off_trend(strewn(off=off.items(), count=12))) == 1


def test_names_stand_under_the_panels_and_their_number_in_them():
    off = [(("V", "oxo", k), 1.0 + 0.05 * k) for k in range(7)] + [(("Mo", "oxo", k), 1.0 + 0.05 * k) for k in range(7)]
    figure = overview_figure(strewn(off=off))
    numbers = [text.get_text() for text in figure.axes[0].texts if text.get_gid() == "number"]
    named = [text.get_text() for text in figure.axes[0].texts if text.get_gid() == "named"]
    assert sorted(map(int, numbers)) == list(range(1, MOST_NAMED + 1))
    assert len(named) == 2 * MOST_NAMED
    assert any("6.cif M1-X2, oxo" in text for text in named)


def test_hostile_names_are_inert_and_shortened():
    bonds = strewn(off=[(("V", "oxo", 3), 0.9)])
    bonds = [b if abs(b.mayer - 2.2) < 0.7 or b.kind != "oxo" else PlottedBond(b.metal, b.kind, b.length_A,
             b.mayer, HOSTILE, "V1-O2") for b in bonds]  # fmt: skip
    figure = overview_figure(bonds)
    assert outside(figure) == []
    assert any("..." in text for text, _ in words(figure))
    svg = figure_bytes(figure, "svg").decode()
    assert "\x1b" not in svg
    assert "<script" not in svg


def test_many_bonds_make_no_large_file():
    figure = overview_figure(strewn(("V",), count=4000))
    assert len(figure_bytes(figure, "svg")) < 600_000


def test_no_bonds_are_refused():
    with pytest.raises(InputError, match="no bonds"):
        overview_figure([])
    with pytest.raises(InputError, match="no bonds"):
        overview_figure([PlottedBond("V", "oxo", float("nan"), 1.0, "a", "b")])
