"""Summaries: numpy and SciPy over the same columns are the outside check of the numbers."""

from __future__ import annotations

import copy
import json
import re

import numpy as np
import pandas
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.stats import siegelslopes

from ehmo.store import condition, open_store, summarise
from ehmo.store.distributions import QUANTITIES, beyond_quartiles
from ehmo.store.summary import reason_of
from ehmo.store.trends import order_trend, resistant_line
from tests.store.rows import StoredRow, document, done, failed, key, provenance


def shifted(number: int, *, mayer: float = 0.0, length: float = 0.0, **changes) -> StoredRow:
    """Aqua vanadyl with the numbers of its oxo bond moved."""
    whole = copy.deepcopy(document())
    whole["bonds"][0]["mayer"] += mayer
    whole["bonds"][0]["length_A"] += length
    return StoredRow(key(number), "done", "", whole, provenance(source=f"{number}.xyz", **changes))


@pytest.fixture
def varied(location) -> str:
    """Oxo bonds on a line of order against length, two off it, one of another length; failures of three reasons."""
    steps = np.linspace(-0.05, 0.05, 21)
    rows = [shifted(k, mayer=-2.0 * step, length=step, duration_s=0.5) for k, step in enumerate(steps)]
    rows += [shifted(30, mayer=-0.9), shifted(31, mayer=0.5, length=-0.05), shifted(32, mayer=-1.16, length=0.8)]
    rows += [failed(40 + k, f"{k}.xyz, line {k}: {k} of 9 atoms; complete it", source=f"{k}.xyz") for k in range(3)]
    rows += [failed(50, "a.xyz: no metal; give a complex", started_utc="2026-11-30T00:00:00Z")]
    rows += [failed(51, "took longer than 600 s", parameter_set="mine", parameter_sha256="1" * 64)]
    rows += [done(60, "MnO4 -", started_utc="2026-12-02T00:00:00Z")]
    with open_store(location, create=True) as store:
        store.write(rows)
    return location


def test_counts(varied):
    with open_store(varied, read_only=True) as store:
        found = summarise(store)
    assert (found.done, found.failed, found.where) == (25, 5, None)
    assert (found.first_started_utc, found.last_started_utc) == ("2026-11-30T00:00:00Z", "2026-12-02T00:00:00Z")
    assert found.duration_s == pytest.approx(21 * 0.5 + 9 * 0.01)
    assert found.doubted == 1  # permanganate, whose levels are inverted
    assert [(made.parameter_set, made.rows) for made in found.calculations] == [("standard", 29), ("mine", 1)]


def test_failures_by_reason(varied):
    with open_store(varied, read_only=True) as store:
        found = summarise(store)
    assert [(one.reason, one.count) for one in found.reasons] == [
        ("# of # atoms", 3),
        ("no metal", 1),
        ("took longer than # s", 1),
    ]
    assert found.reasons[0].message == "0.xyz, line 0: 0 of 9 atoms; complete it"
    assert found.other_failures == 0


def test_distributions_are_those_of_numpy(varied):
    with open_store(varied, read_only=True) as store:
        found = summarise(store)
        bonds = pandas.DataFrame(store.table("bonds"))
    assert [(one.metal, one.kind, one.bonds) for one in found.kinds] == [
        ("Mn", "oxo", 4),
        ("V", "aqua", 24 * 5),
        ("V", "oxo", 24),
    ]
    for one in found.kinds:
        some = bonds[(bonds["metal"] == one.metal) & (bonds["kind"] == one.kind)]
        assert set(one.distributions) == set(QUANTITIES)
        for name, five in one.distributions.items():
            numbers = (five.lowest, five.lower_quartile, five.median, five.upper_quartile, five.highest)
            assert five.count == len(some)
            np.testing.assert_allclose(numbers, some[name].describe()[["min", "25%", "50%", "75%", "max"]])


def test_outliers_are_off_the_line_or_of_another_length(varied):
    with open_store(varied, read_only=True) as store:
        found = summarise(store)
    named = {(one.source, one.quantity): one for one in found.outliers}
    assert set(named) == {("30.xyz", "mayer"), ("31.xyz", "mayer"), ("32.xyz", "length_A")}
    assert found.outliers_found == 3
    trend = next(one.trend for one in found.kinds if (one.metal, one.kind) == ("V", "oxo"))
    assert trend.order * trend.log_slope_per_A == pytest.approx(-2.0, abs=0.1)  # slope where the bonds are
    assert trend.b_A == pytest.approx(2.35 / 2.0, abs=0.1)
    off = named["30.xyz", "mayer"]
    assert (off.bond, off.metal, off.kind, off.key) == ("V1-O2", "V", "oxo", key(30))
    assert off.value - off.expected == pytest.approx(-0.9, abs=0.05)
    assert named["32.xyz", "length_A"].expected == pytest.approx(1.591, abs=0.005)
    assert [one.distance for one in found.outliers] == sorted((one.distance for one in found.outliers), reverse=True)


def test_only_what_meets_a_condition(varied):
    with open_store(varied, read_only=True) as store:
        found = summarise(store, condition("kind = 'oxo' and length_A > 1.6"))
        assert [(one.metal, one.bonds) for one in found.kinds] == [("Mn", 4), ("V", 10)]
        assert (found.done, found.failed) == (11, 0)
        mine = summarise(store, condition("parameter_set = 'mine'"))
    assert (mine.done, mine.failed, mine.kinds, mine.outliers) == (0, 1, (), ())


def test_an_empty_store(ehmo, location):
    with open_store(location, create=True) as store:
        found = summarise(store)
    assert (found.done, found.failed, found.kinds, found.first_started_utc) == (0, 0, (), "")
    ran = ehmo("summary", location)
    assert ran.status == 0
    assert "0 structures done, 0 failed; 0 metal-donor bonds" in ran.out


@given(
    st.lists(st.floats(1.4, 2.4), min_size=12, max_size=60, unique=True),
    st.floats(-5, 5),
    st.data(),
)
def test_a_line_is_found_whatever_a_sixth_of_the_points_does(lengths, slope, data):
    x = np.sort(np.array(lengths))
    third = len(x) // 3
    if np.median(x[-third:]) - np.median(x[:third]) < 0.05:
        return
    y = 2.0 + slope * (x - 1.8)
    # Less than half of the points of a third leave its median on the line.
    astray = data.draw(st.sets(st.integers(0, len(x) - 1), max_size=(third - 1) // 2))
    moved = y.copy()
    moved[list(astray)] += 10.0
    found, centre, level = resistant_line(x, y)
    assert found == pytest.approx(slope, abs=1e-6)
    assert level + found * (1.8 - centre) == pytest.approx(2.0, abs=1e-6)
    assert found == pytest.approx(siegelslopes(y, x).slope, abs=1e-6)
    assert abs(resistant_line(x, moved)[0] - slope) < 10.0 / 0.05 * 0.51


def test_a_line_stays_near_siegels_where_points_scatter():
    rng = np.random.default_rng(7)
    x = rng.uniform(1.55, 1.75, 300)
    y = 2.2 - 1.7 * (x - 1.65) + 0.03 * rng.standard_normal(300)
    y[:40] -= 1.0
    slope, centre, level = resistant_line(x, y)
    siegel = siegelslopes(y, x)
    assert slope == pytest.approx(siegel.slope, abs=0.25)
    assert level + slope * (1.65 - centre) == pytest.approx(siegel.intercept + 1.65 * siegel.slope, abs=0.01)


def test_bond_valences_fall_with_the_b_they_are_made_with():
    # s = exp((R0 - R)/B), B = 0.37 and R0 of V(V)-O 1.803: Brown, Altermatt 1985 (memory). One order is astray, one
    # negative.
    lengths = np.linspace(1.55, 2.35, 40)
    orders = np.exp((1.803 - lengths) / 0.37)
    orders[3], orders[30] = 0.3, -0.2
    trend = order_trend(lengths, orders)
    assert trend.b_A == pytest.approx(0.37, abs=0.001)
    np.testing.assert_allclose(trend.at(lengths[5:8]), orders[5:8], rtol=1e-3)
    assert order_trend(lengths, np.full(40, 0.01)) is None
    assert order_trend(lengths, lengths).b_A is None  # no fall


@pytest.mark.parametrize("lengths", [[1.6], [1.6] * 20, [1.6, 1.61]])
def test_lengths_that_tell_no_slope(lengths):
    x = np.array(lengths)
    found = resistant_line(x, np.linspace(1.0, 2.0, len(x)))
    assert found[0] == 0.0


def test_distances_beyond_quartiles():
    values = np.array([*range(11), 40.0, np.nan])
    found = beyond_quartiles(values, 0.1)
    lower, upper = np.quantile(values[:12], (0.25, 0.75))
    assert found[11] == pytest.approx((40.0 - upper) / (upper - lower))
    assert found[5] == found[12] == 0.0
    assert found[0] == pytest.approx(lower / (upper - lower))
    assert (beyond_quartiles(values[:11], 0.1) == 0.0).all()  # too few


@pytest.mark.parametrize(
    ("message", "source", "reason"),
    [
        ("a.xyz: no metal; give a complex", "a.xyz", "no metal"),
        ("a.xyz, frame 3, line 7: 'Zz' is no element; mend", "a.xyz", "'Zz' is no element"),
        ("V1 and O22 are 0.010 A apart; correct", "", "V# and O# are # A apart"),
        ("C:/odd: name.xyz: no metal; mend", "C:/odd: name.xyz", "no metal"),
        ("a.xyz", "a.xyz", "a.xyz"),
        ("", "", ""),
        ("charge -1.5e3 is impossible", "other.xyz", "charge # is impossible"),
    ],
)
def test_reasons(message, source, reason):
    assert reason_of(message, source) == reason


def test_reasons_that_all_differ_do_not_fill_the_memory(tmp_path, monkeypatch):
    monkeypatch.setattr("ehmo.store.summary.MOST_REASONS", 5)
    with open_store(tmp_path / "a.sqlite", create=True) as store:
        store.write([failed(k, f"{chr(97 + k)} is wrong") for k in range(12)] + [failed(20, "a is wrong")])
        found = summarise(store)
    assert [one.count for one in found.reasons] == [2, 1, 1, 1, 1]
    assert found.other_failures == 7


def test_text(ehmo, varied):
    ran = ehmo("summary", varied)
    assert (ran.status, ran.err) == (0, "")
    lines = ran.out.splitlines()
    assert "25 structures done, 5 failed; 148 metal-donor bonds" in lines
    assert "       3  # of # atoms" in lines
    row = next(line for line in lines if re.match(r" +V +oxo ", line)).split()
    assert row[2:4] == ["24", "1.19"]
    assert any(re.match(r" +V1-O2 +oxo +1\.591 +Mayer order +1\.45 +2\.35 +30\.xyz$", line) for line in lines)
    assert any("never replace" in line for line in lines)
    assert all(len(line) <= 110 for line in lines)


def test_json(ehmo, varied):
    ran = ehmo("summary", varied, "--json", "-", "--where", "metal = 'V'")
    found = json.loads(ran.out)
    assert (found["schema"], found["where"]) == ("ehmo store summary 1", "metal = 'V'")
    assert found["kinds"][1]["metal"] == "V"
    assert found["kinds"][1]["mayer"]["count"] == 24
    assert found["outlier_rule"]["interquartile_ranges"] == 3
    assert ehmo("summary", varied, "--json", "s.json", "--where", "metal = 'V'").out.startswith(found["store"])
    with open("s.json") as file:  # noqa: PTH123
        assert json.load(file) == found


def test_hostile_text_is_shown_and_not_obeyed(ehmo, location):
    with open_store(location, create=True) as store:
        store.write(
            [failed(1, "\x1b[2J is no element; \x07", source="\x1b]0;x\x07")]
            + [shifted(k, started_utc="\x1b[31m") for k in range(10, 30)]
            + [StoredRow(key(5), "done", "", shifted(5, mayer=3.0).document, provenance(source="a\nb\x1b[0m"))]
        )
    for words in ((), ("--json", "-")):
        out = ehmo("summary", location, *words).out
        assert all(char.isprintable() or char == "\n" for char in out)
    assert "a\\nb\\x1b[0m" in ehmo("summary", location).out
