"""The ladder figure: true to its record, and legible."""

from dataclasses import replace

import numpy as np
import pytest
from matplotlib.colors import to_hex

from ehmo.errors import InputError
from ehmo.report.figures.ladder import MOST_TERMS, ladder_figure
from ehmo.report.look import DARK, LIGHT
from ehmo.units import PER_CM_PER_EV
from tests.report.figures.boxes import outside, overlapping, words
from tests.report.figures.reports import SIMPLE_TO_CROWDED, report

NICKEL = ("[Ni(OH2)6]2+", (8500.0, 13800.0, 25300.0))
"""Bands of the hexaaqua ion, round figures (common practice)."""


def height_to_energy(axes):
    """Energy [10^3 cm^-1] of a height, from the ticks of the left axis."""
    ticks = [text for text in axes.texts if text.get_gid() == "tick" and text.get_ha() == "right"]
    heights = [text.get_position()[1] for text in ticks]
    values = [float(text.get_text().replace("\N{MINUS SIGN}", "-")) for text in ticks]
    slope, offset = np.polyfit(heights, values, 1)
    np.testing.assert_allclose(slope * np.array(heights) + offset, values, atol=1e-6)
    return lambda y: slope * np.asarray(y) + offset


def flat(axes, colour, width):
    """Heights of the horizontal lines of a colour and width."""
    return [
        line.get_ydata()[0]
        for line in axes.lines
        if len(line.get_ydata()) == 2
        and line.get_ydata()[0] == line.get_ydata()[1]
        and to_hex(line.get_color()) == colour
        and line.get_linewidth() == width
    ]


@pytest.mark.parametrize(
    ("name", "width"), [*((name, 8.4) for name in SIMPLE_TO_CROWDED), ("[FeO(OH2)5]2+", 17.4), ("VOCl3", 8.0)]
)
def test_no_two_words_overlap(name, width):
    figure = ladder_figure(report(name), width_cm=width)
    assert overlapping(figure) == []
    assert outside(figure) == []
    assert figure.get_size_inches()[0] * 2.54 == pytest.approx(width)


@pytest.mark.parametrize("named", [NICKEL, ("[VO(OH2)5]2+", (13000.0, 16000.0))])
def test_no_two_words_overlap_with_observed_bands(named):
    for draws in (0, 4):
        figure = ladder_figure(report(*named, draws))
        assert overlapping(figure) == []
        assert outside(figure) == []


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "[PuO2(OH2)5]2+", "MnO4 -"])
@pytest.mark.parametrize("look", [LIGHT, DARK])
def test_levels_are_at_the_energies_of_the_record(name, look):
    """Law: heights on paper are energies above the lowest level, to scale, on both axes."""
    axes = ladder_figure(report(name), look=look).axes[0]
    levels = report(name).sites[0].ladder.levels
    wanted = [(level.energy_eV - levels[0].energy_eV) * PER_CM_PER_EV / 1000 for level in levels]
    np.testing.assert_allclose(sorted(height_to_energy(axes)(flat(axes, look.metal, 1.8))), wanted, atol=1e-6)
    for text in axes.texts:
        if text.get_gid() == "tick" and text.get_ha() == "left":
            value = float(text.get_text().replace("\N{MINUS SIGN}", "-"))
            assert height_to_energy(axes)(text.get_position()[1]) == pytest.approx(value * PER_CM_PER_EV / 1000)


def test_terms_are_those_of_the_spin_of_the_fragment_and_others():
    found = report("[FeO(OH2)5]2+").spectroscopy
    ground = next(t for t in found.terms.terms if t.label == found.ground_term)
    axes = ladder_figure(report("[FeO(OH2)5]2+")).axes[0]
    energies = height_to_energy(axes)
    strong, thin = (energies(flat(axes, *style)) for style in ((LIGHT.ink, 1.6), (LIGHT.muted, 0.7)))
    top = max(*strong, *thin)
    for drawn, own in ((strong, True), (thin, False)):
        wanted = [
            (t.energy_per_cm - ground.energy_per_cm) / 1000
            for t in found.terms.terms
            if (t.multiplicity == ground.multiplicity) == own
        ]
        np.testing.assert_allclose(sorted(drawn), [value for value in sorted(wanted) if value <= top + 1e-9], atol=1e-6)
    assert len([text for text in axes.texts if text.get_gid() == "label term"]) <= MOST_TERMS


def test_observed_bands_stand_at_their_energies_beside_their_terms():
    axes = ladder_figure(report(*NICKEL)).axes[0]
    energies = height_to_energy(axes)
    diamonds = [line for line in axes.lines if line.get_marker() == "D"]
    assert sorted(1000 * energies([line.get_ydata()[0] for line in diamonds])) == pytest.approx(NICKEL[1])
    said = [text for text, _ in words(ladder_figure(report(*NICKEL)))]
    assert {"8,500", "13,800", "25,300"} <= set(said)


def test_spread_is_drawn_to_either_side():
    spread = report("[VO(OH2)5]2+", (), 4)
    axes = ladder_figure(spread).axes[0]
    energies = height_to_energy(axes)
    bars = [np.ptp(energies(area.get_paths()[0].vertices[:, 1])) for area in axes.collections]
    wanted = [2 * own.above_lowest_per_cm / 1000 for own in spread.level_spreads(spread.sites[0])[1:]]
    whole = [k for k, width in enumerate(wanted) if bars[k] == pytest.approx(width, rel=1e-6)]
    assert len(bars) == len(wanted) == 4
    assert len(whole) >= 2  # the others run over the end of the axis
    assert all(bar <= width + 1e-9 for bar, width in zip(bars, wanted, strict=True))


def test_a_metal_without_ladder_is_refused_with_its_reason():
    plain = report("VOCl3")
    bare = replace(plain, sites=(replace(plain.sites[0], ladder=None, ladder_withheld="too few levels"),))
    with pytest.raises(InputError, match="too few levels"):
        ladder_figure(bare)
    with pytest.raises(InputError, match="no such metal"):
        ladder_figure(plain, 3)
