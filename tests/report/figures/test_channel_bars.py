"""Channel bars: true to their record, and legible."""

import numpy as np
import pytest
from matplotlib.colors import to_hex

from ehmo import Fragment, bond_report
from ehmo.report.figures.channels import LISTED_CHANNEL, channel_bars
from ehmo.report.look import DARK, LIGHT
from tests.geometries import SPECIES
from tests.report.figures.boxes import outside, overlapping, words
from tests.report.figures.reports import SIMPLE_TO_CROWDED, report

WITH_SPREAD = ("VOCl3", "[VO(OH2)5]2+", "W(CCH3)(OCH3)3")


def bars(axes):
    """Left and right end of each bar, and its colour, from the top."""
    found = [area for area in axes.collections if area.get_gid() == "bar"]
    ends = [area.get_paths()[0].vertices[:, 0] for area in found]
    return [(x.min(), x.max(), to_hex(area.get_facecolor()[0])) for x, area in zip(ends, found, strict=True)]


def unit(axes):
    """Centimetres per unit of weight, from the ticks."""
    x = {text.get_text(): text.get_position()[0] for text in axes.texts if text.get_gid() == "tick"}
    assert x["0.6"] - x["0"] == pytest.approx(0.6 * (x["1"] - x["0"]))
    return x["1"] - x["0"]


@pytest.mark.parametrize("name", SIMPLE_TO_CROWDED)
def test_no_two_words_overlap(name):
    figure = channel_bars(report(name, (), 3 if name in WITH_SPREAD else 0))
    assert overlapping(figure) == []
    assert outside(figure) == []


@pytest.mark.parametrize("look", [LIGHT, DARK])
def test_bars_are_as_long_as_their_weights(look):
    """Law: every channel of every distinct bond, to scale, in the colour of its part."""
    found = report("VOCl3")
    axes = channel_bars(found, look=look).axes[0]
    wanted = [
        (channel.weight, look.part(channel.type))
        for place in (0, 1)
        for channel in found.orders[place].channels
        if channel.weight >= LISTED_CHANNEL
    ]
    drawn = [((right - left) / unit(axes), colour) for left, right, colour in bars(axes)]
    assert [colour for _, colour in drawn] == [colour for _, colour in wanted]
    np.testing.assert_allclose([w for w, _ in drawn], [w for w, _ in wanted], atol=1e-9)


def test_lines_are_one_standard_deviation_to_either_side():
    found = report("VOCl3", (), 3)
    axes = channel_bars(found).axes[0]
    lines = [line.get_xdata() for line in axes.lines if line.get_gid() == "deviation"]
    wanted = [
        own
        for place in (0, 1)
        for own, channel in zip(found.spread.bonds[place].channel_weights, found.orders[place].channels, strict=False)
        if channel.weight >= LISTED_CHANNEL
    ]
    np.testing.assert_allclose([np.ptp(x) / 2 / unit(axes) for x in lines], wanted, atol=1e-9)
    np.testing.assert_allclose([np.mean(x) for x in lines], [right for _, right, _ in bars(axes)], atol=1e-9)


def test_bonds_that_are_alike_share_a_row_and_are_counted():
    said = [text for text, _ in words(channel_bars(report("VOCl3")))]
    assert "V1–O2" in said
    assert [text for text in said if "Cl" in text and "(3 alike)" in text]
    assert f"oxo, {report('VOCl3').coordination.bonds[0].length_A:.3f} Å" in said
    assert len([text for text in said if "–Cl" in text]) == 1


def test_more_bonds_than_a_page_holds_are_counted():
    one = SPECIES["VOCl3"]
    positions = np.concatenate([(1 + 0.003 * k) * one.positions_A + np.array([30.0 * k, 0, 0]) for k in range(12)])
    many = bond_report(Fragment(one.symbols * 12, positions, 0, 0))
    figure = channel_bars(many)
    assert figure.get_size_inches()[1] * 2.54 <= 23.001
    assert overlapping(figure) == []
    said = [text for text, _ in words(figure)]
    shown = sum("–O" in text for text in said) + 3 * sum("alike" in text for text in said)
    assert f"{48 - shown} further bonds not drawn" in " ".join(said)
