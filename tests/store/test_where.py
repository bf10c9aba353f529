"""Conditions: what they select, that values stay values, and where a fault is."""

import operator
import re

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from ehmo.errors import InputError
from ehmo.store import condition, open_store
from tests.store.rows import done, failed, key


@pytest.fixture
def store(location):
    with open_store(location, create=True) as opened:
        opened.write(
            [
                done(1, tags=("first run", "it's")),
                done(2, "MnO4 -", tags=()),
                done(3, "VOCl3", source="folder/50%_of it.xyz"),
                failed(4, "no metal; give a complex"),
            ]
        )
        yield opened


def selected(store, text) -> list[int]:
    numbers = {key(number): number for number in range(1, 5)}
    return [numbers[row.key] for row in store.rows(condition(text))]


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("status = 'failed'", [4]),
        ("status == 'done' and charge = 2", [1]),
        ("charge != 2", [2, 3]),  # a failed row has no charge: neither equal nor different
        ("charge <> 2 or status = 'failed'", [2, 3, 4]),
        ("not (charge = 2 or charge = -1)", [3]),
        ("NOT charge = 2 AND NOT charge = -1", [3]),
        ("charge in (2, -1, 5e0)", [1, 2]),
        ("charge not in (2, -1)", [3]),
        ("charge is null", [4]),
        ("charge is not null and charge >= 0 and charge <= 2", [1, 3]),
        ("message like 'NO METAL%'", [4]),
        ("message not like '%metal%' and status = 'done'", [1, 2, 3]),
        (r"source like '%50\%\_of%'", [3]),
        ("tags like '%\"it''s\"%'", [1]),
        ('tags like "%""first run""%"', [1]),
        ("metals = 'Mn' or d_count = 1", [1, 2]),
        ("metal = 'V' and kind = 'oxo' and mayer > 1.5", [1, 3]),
        ("kind = 'oxo' and length_A > 1.6", [2]),
        ("kind = 'chlorido'", []),
        ("duration_s < .5 and results_edition = 1", [1, 2, 3, 4]),
        ("charge < 99999999999999999999 and charge > -1e300", [1, 2, 3]),
        ("source = '''; DROP TABLE structures; --'", []),
        ("source = 'a\x00b' or source = '\udcff'", []),
    ],
)
def test_structures_that_meet_a_condition(store, text, expected):
    assert selected(store, text) == expected


def test_a_condition_on_bonds_selects_bonds_in_a_table(store):
    found = list(store.cells("bonds", condition("metal = 'V' and mayer > 1.5"), ["bond", "mayer"]))
    assert {name for name, _ in found} == {"V1-O2"}
    assert len(found) == 2
    assert all(mayer > 1.5 for _, mayer in found)


@pytest.mark.parametrize(
    ("text", "place", "words"),
    [
        ("", 1, "ends too early"),
        ("mayer >", 8, "a value is expected"),
        ("maier > 1", 1, "no column 'maier'; perhaps mayer"),
        ("mayer > 1 and", 14, "ends too early"),
        ("mayer > 1 charge = 2", 11, "not expected here"),
        ("mayer > '1'", 9, "mayer is a number"),
        ("metal = V", 9, "a value is expected"),
        ("metal = 5", 9, "metal is text"),
        ("mayer like '1%'", 12, "mayer is a number"),
        ("metal like 'V\\'", 12, "ends in a backslash"),
        ("metal = 'V", 9, "not closed"),
        ("metal in ()", 11, "a value is expected"),
        ("metal in ('V'", 14, "')' is expected"),
        ("metal not = 'V'", 11, "a comparison is expected"),
        ("metal is 'V'", 10, "null is expected"),
        ("(mayer > 1", 11, "')' is expected"),
        ("mayer > 1; DROP TABLE bonds", 10, "';' is not understood"),
        ("id = 1", 1, "no column 'id'"),
        ("bonds.mayer > 1", 6, "'.' is not understood"),
        ("mayer > 1.2.3", 9, "'1' is not understood"),
        ("(" * 60 + "mayer > 1" + ")" * 60, 52, "within one another"),
        ("not " * 60 + "mayer > 1", 205, "within one another"),
        (" or ".join(["mayer > 1"] * 401), 5201, "more than 400 tests"),
    ],
)
def test_a_fault_is_named_with_its_place(text, place, words):
    with pytest.raises(InputError, match=re.escape(words)) as refused:
        condition(text)
    assert str(refused.value).startswith(f"--where, character {place}: ")


def test_values_are_bound_and_never_part_of_the_text():
    made = condition("source = 'Robert''); DROP TABLE bonds;--' and mayer < 1.5")
    assert made.clause == '(structures."source" = :value0 AND bonds."mayer" < :value1)'
    assert made.values == {"value0": "Robert'); DROP TABLE bonds;--", "value1": 1.5}


def test_as_many_tests_as_are_allowed_run(store):
    assert selected(store, " or ".join(["charge = 2"] * 400)) == [1]
    assert selected(store, f"charge in ({', '.join(map(str, range(2, 5000)))})") == [1]


COMPARISONS = {"=": operator.eq, "!=": operator.ne, "<": operator.lt, "<=": operator.le, ">": operator.gt}


@st.composite
def conditions(draw, depth=3):
    """Text of a condition on charge and d_count, and the function it stands for (two-valued: no nulls)."""
    if depth == 0 or draw(st.booleans()):
        name, sign = draw(st.sampled_from(["charge", "d_count"])), draw(st.sampled_from(list(COMPARISONS)))
        value = draw(st.integers(-2, 3))
        return f"{name} {sign} {value}", lambda row: COMPARISONS[sign](row[name], value)
    left, of_left = draw(conditions(depth=depth - 1))
    if draw(st.booleans()):
        return f"not ({left})", lambda row: not of_left(row)
    right, of_right = draw(conditions(depth=depth - 1))
    if draw(st.booleans()):
        return f"({left} and {right})", lambda row: of_left(row) and of_right(row)
    return f"({left} or {right})", lambda row: of_left(row) or of_right(row)


@pytest.fixture(scope="module")
def three(tmp_path_factory):
    with open_store(tmp_path_factory.mktemp("where") / "three.sqlite", create=True) as opened:
        opened.write([done(1), done(2, "MnO4 -"), done(3, "VOCl3")])
        yield opened


@given(conditions())
@settings(max_examples=100, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
def test_logic_is_that_of_python(three, made):
    text, function = made
    names = ["key", "charge", "d_count"]
    everything = [dict(zip(names, cells, strict=True)) for cells in three.cells("structures", names=names)]
    expected = [row["key"] for row in everything if function(row)]
    assert [row.key for row in three.rows(condition(text))] == expected


@given(st.text(max_size=40))
@settings(max_examples=300, deadline=None)
def test_any_text_is_a_condition_or_refused(text):
    try:
        condition(text)
    except InputError as refused:
        assert str(refused).startswith("--where, character ")
