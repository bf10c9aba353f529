"""``ehmo figure``: formats, sizes, choices and refusals."""

from __future__ import annotations

import xml.etree.ElementTree as ET

import pytest

from tests.cli.conftest import VOCL3

STARTS = {"svg": b"<?xml", "pdf": b"%PDF", "png": b"\x89PNG"}
TWO = VOCL3 + VOCL3


@pytest.mark.parametrize("form", STARTS)
def test_format_by_the_end_of_the_name(ehmo, put, tmp_path, form):
    put()
    ran = ehmo("figure", "interaction", "a.xyz", "-o", f"out.{form}")
    assert (ran.status, ran.err) == (0, "")
    assert (tmp_path / f"out.{form}").read_bytes().startswith(STARTS[form])
    assert ran.out.startswith(f"out.{form}: ")
    assert "84 x" in ran.out


@pytest.mark.parametrize("kind", ["interaction", "ladder", "channels"])
def test_kinds_of_a_molecule(ehmo, put, tmp_path, kind):
    put()
    sizes = []
    for width in ("84", "174"):
        assert ehmo("figure", kind, "a.xyz", "-o", "out.svg", "--width", width, "--look", "dark").status == 0
        sizes.append(float(ET.fromstring((tmp_path / "out.svg").read_text()).get("width").removesuffix("pt")))
    assert sizes == pytest.approx([84 / 25.4 * 72, 174 / 25.4 * 72], rel=1e-6)


def test_bond_by_its_label_either_way_round(ehmo, put, tmp_path):
    put()
    for words, name in (("V1-Cl3", "one.svg"), ("cl3-v1", "other.svg"), ("V1-O2", "oxo.svg")):
        assert ehmo("figure", "interaction", "a.xyz", "-o", name, "--bond", words).status == 0
    one, other, oxo = ((tmp_path / name).read_bytes() for name in ("one.svg", "other.svg", "oxo.svg"))
    assert one == other != oxo


def test_spread_and_bands_reach_the_figure(ehmo, put, tmp_path):
    put()
    for name, words in (("plain.svg", ()), ("spread.svg", ("--spread", "3"))):
        assert ehmo("figure", "channels", "a.xyz", "-o", name, *words).status == 0
    assert (tmp_path / "plain.svg").read_bytes() != (tmp_path / "spread.svg").read_bytes()


def test_one_of_several_frames(ehmo, put, refused):
    put(TWO)
    assert "--pick" in refused("figure", "channels", "a.xyz", "-o", "out.svg")
    assert ehmo("figure", "channels", "a.xyz", "-o", "out.svg", "--pick", "2").status == 0


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("interaction", "a.xyz"), "-o"),
        (("interaction", "a.xyz", "-o", ""), "-o"),
        (("interaction", "a.xyz", "-o", "out.jpg"), ".svg"),
        (("interaction", "a.xyz", "-o", "out"), ".svg"),
        (("interaction", "a.xyz", "-o", "none/out.svg"), "folder"),
        (("interaction", "a.xyz", "-o", "out.svg", "--bond", "V1-O9"), "bonds are V1-O2"),
        (("channels", "a.xyz", "-o", "out.svg", "--bond", "V1-O2"), "--bond"),
        (("interaction", "a.xyz", "-o", "out.svg", "--width", "5"), "60 to 400"),
        (("interaction", "a.xyz", "-o", "out.svg", "--width", "nan"), "60 to 400"),
        (("portrait", "a.xyz", "-o", "out.svg"), "choose from"),
        (("ladder", "a.xyz", "-o", "out.svg", "--bands", "blue"), "no bands"),
    ],
)
def test_refusals(put, refused, words, said):
    put()
    assert said in refused("figure", *words)


def test_the_input_is_never_overwritten(put, refused, tmp_path):
    put(name="a.svg")
    assert "overwrite" in refused("figure", "channels", "a.svg", "-o", "a.svg")
