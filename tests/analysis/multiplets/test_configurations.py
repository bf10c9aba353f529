"""Terms from configurations by symmetry alone, and dipole rules, against textbook tables."""

from __future__ import annotations

import pytest

from ehmo.analysis.multiplets import configuration_terms, dipole_polarisations, highest_spin_terms
from ehmo.analysis.symmetry.groups import point_group
from ehmo.errors import MultipletError
from tests.analysis.multiplets.fields import GROUPS

# Griffith (1961), table A24; Cotton, Chemical Applications of Group Theory (1990), chapter 9 (memory).
TEXTBOOK = [
    ("Oh", "t2g2", "3T1g 1A1g 1Eg 1T2g"),
    ("Oh", "t2g3", "4A2g 2Eg 2T1g 2T2g"),
    ("Oh", "t2g4", "3T1g 1A1g 1Eg 1T2g"),
    ("Oh", "t2g6", "1A1g"),
    ("Oh", "eg2", "3A2g 1A1g 1Eg"),
    ("Oh", "eg3", "2Eg"),
    ("Oh", "t2g1 eg1", "3T1g 3T2g 1T1g 1T2g"),
    ("Oh", "t2g2 eg1", "4T1g 4T2g 2A1g 2A2g 2Eg 2Eg 2T1g 2T1g 2T2g 2T2g"),
    ("Oh", "t2g3 eg2", "6A1g"),
    ("Td", "e2", "3A2 1A1 1E"),
    ("C4v", "b2 1", "2B2"),
    ("C4v", "e2", "3A2 1A1 1B1 1B2"),
    ("C4v", "b2 1 e1", "3E 1E"),
    ("C4v", "b2 1 b1 1", "3A2 1A2"),
    ("C4v", "b2 1 e2", "4B1"),
    ("C3v", "e2", "3A2 1A1 1E"),
    ("D3h", "e'2", "3A2' 1A1' 1E'"),
    ("D3h", "e''1 e'1", "3A1'' 3A2'' 3E'' 1A1'' 1A2'' 1E''"),
    ("D5h", "e1''2", "3A2' 1A1' 1E2'"),
    ("D∞h", "πg2", "3Σg- 1Σg+ 1Δg"),
    ("D∞h", "δg1 πg1", "3Πg 3Φg 1Πg 1Φg"),
    ("C∞v", "π1 σ+1", "3Π 1Π"),
]


def parsed(text, irreps):
    """Configuration from words such as "b2 1 e1"."""
    rest = text.replace(" ", "")
    found = []
    while rest:
        irrep = max((k for k in irreps if rest.startswith(k)), key=len)
        found.append((irrep, int(rest[len(irrep)])))
        rest = rest[len(irrep) + 1 :]
    return found


@pytest.mark.parametrize(("name", "configuration", "expected"), TEXTBOOK)
def test_terms_of_a_configuration(name, configuration, expected):
    group = point_group(name)
    terms = configuration_terms(group, parsed(configuration, group.irreps))
    labels = [f"{mult}{irrep}" for mult, irrep, count in terms for _ in range(count)]
    expected = expected.split()
    if len({label[0] for label in expected}) == 1 and len(labels) > len(expected):
        # Only the highest spin is tabulated here.
        assert list(highest_spin_terms(group, parsed(configuration, group.irreps))) == expected
    else:
        assert sorted(labels) == sorted(expected)


@pytest.mark.parametrize("name", GROUPS)
def test_terms_hold_all_states_of_the_configuration(name):
    group = point_group(name)
    sizes = dict(zip((irrep[:1].upper() + irrep[1:] for irrep in group.irreps), group.dimensions, strict=True))
    for irrep, dimension in zip(group.irreps, group.dimensions.tolist(), strict=True):
        for n in range(2 * dimension + 1):
            terms = configuration_terms(group, [(irrep, n)])
            total = sum(mult * sizes[term] * count for mult, term, count in terms)
            ways = 1
            for k in range(n):
                ways = ways * (2 * dimension - k) // (k + 1)
            assert total == ways


def test_holes_and_electrons_of_one_level_have_the_same_terms():
    group = point_group("Oh")
    for irrep, size in (("t2g", 3), ("eg", 2), ("t1u", 3)):
        for n in range(2 * size + 1):
            assert configuration_terms(group, [(irrep, n)]) == configuration_terms(group, [(irrep, 2 * size - n)])


@pytest.mark.parametrize(
    ("name", "lower", "upper", "expected"),
    [
        # d1 in C4v: 2B2 -> 2E in x, y; 2B2 -> 2B1 and 2A1 forbidden (Ballhausen & Gray 1962; memory).
        ("C4v", "B2", "E", "xy"),
        ("C4v", "B2", "B1", ""),
        ("C4v", "B2", "A1", ""),
        ("C4v", "A1", "A1", "z"),
        ("C4v", "E", "E", "z"),
        # Td: 1A1 -> 1T2 alone is allowed (permanganate; memory).
        ("Td", "A1", "T2", "xyz"),
        ("Td", "A1", "T1", ""),
        ("Td", "T1", "T2", "xyz"),
        # Centrosymmetric: no g -> g.
        ("Oh", "A2g", "T2g", ""),
        ("Oh", "A1g", "T1u", "xyz"),
        ("D4h", "A1g", "A2u", "z"),
        ("C2v", "A1", "B1", "x"),
        ("C2v", "A1", "B2", "y"),
        ("D3h", "A1'", "E'", "xy"),
        ("D3h", "A1'", "A2''", "z"),
        ("D∞h", "Σg+", "Πu", "xy"),
        ("D∞h", "Σg+", "Σu+", "z"),
        ("D∞h", "Σg+", "Σu-", ""),
        ("Cs", "A'", "A'", "xy"),
        ("Cs", "A'", "A''", "z"),
    ],
)
def test_dipole_rules(name, lower, upper, expected):
    assert dipole_polarisations(point_group(name), lower, upper) == expected
    assert dipole_polarisations(point_group(name), upper, lower) == expected


def test_everything_is_allowed_without_symmetry():
    assert dipole_polarisations(None, "A", "A") == "xyz"


def test_unknown_irreps_and_overfull_levels_are_refused():
    group = point_group("C4v")
    with pytest.raises(MultipletError, match=r"C4v has no irrep 't2g'; use one of a1, a2"):
        configuration_terms(group, [("t2g", 2)])
    with pytest.raises(MultipletError, match="e holds at most 4 electrons, not 5"):
        configuration_terms(group, [("e", 5)])
    with pytest.raises(MultipletError, match="b2 holds at most 2 electrons, not -1"):
        configuration_terms(group, [("b2", -1)])
    with pytest.raises(MultipletError, match="C4v has no irrep 'T2g'; use one of A1, A2"):
        dipole_polarisations(group, "A1", "T2g")
