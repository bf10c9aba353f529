"""The palette for colour-blind readers, in grey print and on its background."""

import dataclasses
from itertools import pairwise

import pytest

from ehmo.conventions import BOND_SYMMETRIES, ELEMENT_SYMBOLS
from ehmo.report.look import DARK, ELEMENT_FAMILIES, LIGHT, LINE_STYLES, element_colour, element_family
from tests.report.colour_vision import MACHADO, contrast, lightness, seen, smallest_difference

LOOKS = pytest.mark.parametrize("look", [LIGHT, DARK], ids=lambda look: look.name)


def roles(look):
    return {
        "bond part": [look.part(symmetry) for symmetry in BOND_SYMMETRIES],
        "origin": list(look.origins),
        "spin": [look.alpha, look.beta],
        "phase": [look.positive, look.negative],
    }


def test_simulation_keeps_greys_and_merges_what_it_should():
    """Law: a grey stays itself; a red and a green of one lightness come together without the third cone."""
    for vision in MACHADO:
        assert seen("#808080", vision) == pytest.approx(seen("#808080", "full colour vision"), abs=1e-5)
    red_green = ("#c8503c", "#6e8c28")
    assert smallest_difference(red_green, "full colour vision") > 60
    assert smallest_difference(red_green, "deuteranopia") < 25
    assert contrast("#000000", "#ffffff") == pytest.approx(21, abs=0.01)


@LOOKS
@pytest.mark.parametrize("vision", MACHADO)
def test_colours_of_one_role_stay_apart(look, vision):
    for role, colours in roles(look).items():
        assert smallest_difference(colours, vision) > 25, role


@LOOKS
def test_colours_of_one_role_differ_in_grey(look):
    for role, colours in roles(look).items():
        grey = sorted(lightness(colour) for colour in colours)
        assert min(b - a for a, b in pairwise(grey)) > 5, role


@LOOKS
def test_contrast_with_the_paper(look):
    """Published: 3 for graphics, 4.5 for text (Web Content Accessibility Guidelines 2.1, 2018; memory)."""
    for background in (look.paper, look.shade):
        assert contrast(look.ink, background) > 7
        assert contrast(look.muted, background) > 4.5
    assert all(contrast(colour, look.paper) > 3 for colours in roles(look).values() for colour in colours)
    assert 1.1 < contrast(look.grid, look.paper) < 2.5


@LOOKS
def test_every_colour_is_six_hex_digits(look):
    values = [value for key, value in dataclasses.asdict(look).items() if key != "name"]
    values += [shade for shades in ELEMENT_FAMILIES.values() for shade in shades]
    assert all(len(value) == 7 and int(value[1:], 16) >= 0 for value in values)


def test_elements_of_a_complex_can_be_told_apart():
    """Metal, oxygen, nitrogen, carbon, halogen and hydrogen meet in one molecule."""
    for metal in ("V", "U", "Mo"):
        colours = [element_colour(symbol) for symbol in (metal, "O", "N", "C", "Cl", "H")]
        assert smallest_difference(colours, "full colour vision") > 25


def test_every_element_has_a_family_and_a_colour():
    for symbol in ELEMENT_SYMBOLS:
        assert element_colour(symbol) in ELEMENT_FAMILIES[element_family(symbol)]
    families = {s: element_family(s) for s in ("He", "B", "C", "N", "S", "Br", "Xe", "Lu", "La", "Zr", "Rf", "Bi")}
    assert list(families.values()) == [
        "group 18", "group 13", "group 14", "group 15", "group 16", "group 17", "group 18", "d metals", "f metals",
        "d metals", "d metals", "group 15",
    ]  # fmt: skip
    # Lightness falls from period to period; carbon alone is darker than silicon, as its bonds must show.
    for family, shades in ELEMENT_FAMILIES.items():
        fall = shades[1:] if family == "group 14" else shades
        assert [lightness(s) for s in fall] == sorted((lightness(s) for s in fall), reverse=True)


def test_every_bond_part_has_its_own_line():
    assert set(LINE_STYLES) == set(BOND_SYMMETRIES)
    assert len(set(LINE_STYLES.values())) == len(LINE_STYLES)
