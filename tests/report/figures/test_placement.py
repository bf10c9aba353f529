"""Labels and levels without overlap: laws of the placement."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from ehmo.report.figures.energy_axis import EMPTY_EV, energy_axis
from ehmo.report.figures.placement import side_by_side, spread_out

ENERGIES = st.lists(st.floats(-60, 20), min_size=1, max_size=60)


@settings(max_examples=60, deadline=None)
@given(st.lists(st.floats(0, 10), min_size=1, max_size=40), st.floats(0.05, 0.25))
def test_labels_keep_order_and_distance(wanted, size):
    wanted = sorted(wanted)
    centres = spread_out(wanted, [size] * len(wanted), 0.0, 10.0)
    assert (np.diff(centres) >= size - 1e-9).all()
    assert centres[0] >= size / 2 - 1e-9
    assert centres[-1] <= 10 - size / 2 + 1e-9


def test_labels_with_room_stay_where_they_are():
    np.testing.assert_allclose(spread_out([1.0, 2.0, 4.0], [0.5, 0.5, 0.5], 0.0, 5.0), [1.0, 2.0, 4.0])


def test_two_labels_at_one_place_move_apart_alike():
    np.testing.assert_allclose(spread_out([2.0, 2.0], [0.5, 0.7], 0.0, 5.0), [1.7, 2.3])


def test_labels_that_do_not_fit_are_refused():
    with pytest.raises(ValueError, match="do not fit"):
        spread_out([1.0, 2.0], [3.0, 3.0], 0.0, 5.0)


@settings(max_examples=60, deadline=None)
@given(st.lists(st.tuples(st.floats(0, 5), st.integers(1, 3)), min_size=1, max_size=25))
def test_levels_side_by_side_do_not_touch(levels):
    heights, widths = [h for h, _ in levels], [0.4 * n for _, n in levels]
    centres = side_by_side(heights, widths, 0.3, 0.1, 50.0)
    assert np.isfinite(centres).all()
    for a in range(len(levels)):
        for b in range(a):
            if abs(heights[a] - heights[b]) < 0.3:
                assert abs(centres[a] - centres[b]) >= (widths[a] + widths[b]) / 2 - 1e-6


def test_a_level_without_room_is_named():
    assert np.isnan(side_by_side([1.0, 1.0, 1.0], [1.0] * 3, 0.3, 0.1, 0.6)).sum() == 2


@settings(max_examples=60, deadline=None)
@given(ENERGIES)
def test_energy_axis_rises_and_holds_every_level(energies):
    axis = energy_axis(energies, 1.0, 11.0)
    ends = axis.ends_cm()
    assert ends[0, 0] == pytest.approx(1.0)
    assert ends[-1, 1] == pytest.approx(11.0)
    assert (np.diff(ends.ravel()) > 0).all()
    heights = [axis.height_cm(energy) for energy in sorted(energies)]
    assert (np.diff(heights) >= 0).all()
    assert all(axis.holds(energy) for energy in energies)
    assert all(axis.holds(tick) for tick in axis.ticks_eV())


def test_energy_axis_is_to_scale_within_a_stretch():
    """Law: distances between neighbours closer than the break keep their ratio; a wide gap is shortened."""
    axis = energy_axis([-30.0, -12.0, -11.0, -9.0], 0.0, 10.0)
    heights = [axis.height_cm(e) for e in (-30.0, -12.0, -11.0, -9.0)]
    assert (heights[3] - heights[2]) / (heights[2] - heights[1]) == pytest.approx(2.0)
    assert (heights[1] - heights[0]) / axis.cm_per_eV < EMPTY_EV
