"""Overlap population against energy: bars and running sum true to the record."""

import numpy as np
import pytest

from ehmo.analysis.interaction import bond_interaction
from ehmo.errors import InputError
from ehmo.report.figures.interaction import default_bond
from ehmo.report.figures.population import SHOWN, overlap_population
from tests.report.figures.boxes import outside, overlapping, words
from tests.report.figures.reports import SIMPLE_TO_CROWDED, report


def unit_and_zero(axes):
    """Place of zero and length of one electron, from the ticks across [cm]."""
    ticks = [text for text in axes.texts if text.get_gid() == "tick across"]
    values = [float(text.get_text().replace("\N{MINUS SIGN}", "-")) for text in ticks]
    unit, zero = np.polyfit(values, [text.get_position()[0] for text in ticks], 1)
    return unit, zero


@pytest.mark.parametrize("name", SIMPLE_TO_CROWDED)
def test_no_two_words_overlap(name):
    figure = overlap_population(report(name))
    assert overlapping(figure) == []
    assert outside(figure) == []


@pytest.mark.parametrize("name", ["VOCl3", "MnO4 -", "[FeO(OH2)5]2+", "[UO2(OH2)5]2+", "fac-[MoO3F3]3-"])
def test_the_sum_ends_at_the_overlap_population_of_the_bond(name):
    """Law: orbitals times their electrons add up to the overlap population."""
    found = report(name)
    figure = overlap_population(found)
    line = next(line for line in figure.axes[0].lines if line.get_gid() == "sum")
    unit, zero = unit_and_zero(figure.axes[0])
    wanted = found.orders[default_bond(found)].overlap_population
    assert (line.get_xdata()[-1] - zero) / unit == pytest.approx(wanted, abs=2e-3)
    assert f"{(line.get_xdata()[-1] - zero) / unit:.2f}" in [text for text, _ in words(figure)]
    assert (np.diff(line.get_ydata()) >= 0).all()


def test_bars_are_the_overlap_populations_of_full_levels():
    found = report("VOCl3")
    interaction = bond_interaction(found, 0)
    axes = overlap_population(found, 0).axes[0]
    unit, zero = unit_and_zero(axes)
    ends = [area.get_paths()[0].vertices[:, 0] for area in axes.collections if area.get_gid() == "bar"]
    drawn = sorted((x[np.abs(x - zero).argmax()] - zero) / unit for x in ends)
    every = sorted(len(level.orbitals) * level.overlap_population for level in interaction.sets)
    assert len(drawn) > 5
    for value in drawn:
        assert abs(value) >= SHOWN
        assert np.abs(np.array(every) - value).min() < 1e-6


def test_empty_levels_are_hollow():
    axes = overlap_population(report("VOCl3")).axes[0]
    bars = [area for area in axes.collections if area.get_gid() == "bar"]
    hollow = [not np.allclose(bar.get_facecolor(), bar.get_edgecolor()) for bar in bars]
    heights = [bar.get_paths()[0].vertices[:, 1].mean() for bar in bars]
    assert any(hollow)
    assert not all(hollow)
    assert min(y for y, empty in zip(heights, hollow, strict=True) if empty) > max(
        y for y, empty in zip(heights, hollow, strict=True) if not empty
    )


def test_a_missing_bond_is_refused():
    with pytest.raises(InputError, match="no bond number 9"):
        overlap_population(report("VOCl3"), 9)
