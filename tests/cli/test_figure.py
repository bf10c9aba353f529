"""``ehmo figure``: formats, sizes, choices and refusals."""

from __future__ import annotations

import xml.etree.ElementTree as ET

import pytest

from ehmo.report.figures.canvas import COLUMN_CM, DOUBLE_COLUMN_CM
from ehmo.report.figures.catalogue import FIGURE_KINDS
from tests.cli.conftest import VOCL3
from tests.crystal.test_report import RUTILE

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


@pytest.mark.parametrize("kind", [kind.name for kind in FIGURE_KINDS.values() if kind.source == "molecule"])
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


def test_metal_by_its_label(ehmo, put, refused, tmp_path):
    put()
    assert ehmo("figure", "ladder", "a.xyz", "-o", "one.svg", "--metal", "v1").status == 0
    assert ehmo("figure", "ladder", "a.xyz", "-o", "two.svg").status == 0
    assert (tmp_path / "one.svg").read_bytes() == (tmp_path / "two.svg").read_bytes()
    assert "metals are V1" in refused("figure", "ladder", "a.xyz", "-o", "x.svg", "--metal", "O2")


def test_spread_and_bands_reach_the_figure(ehmo, put, tmp_path):
    put()
    for name, words in (("plain.svg", ()), ("spread.svg", ("--spread", "3"))):
        assert ehmo("figure", "channels", "a.xyz", "-o", name, *words).status == 0
    assert (tmp_path / "plain.svg").read_bytes() != (tmp_path / "spread.svg").read_bytes()


def test_one_of_several_frames(ehmo, put, refused):
    put(TWO)
    assert "--pick" in refused("figure", "channels", "a.xyz", "-o", "out.svg")
    assert ehmo("figure", "channels", "a.xyz", "-o", "out.svg", "--pick", "2").status == 0


def test_a_scan_from_its_file(ehmo, put, tmp_path):
    put()
    words = ("--from", "1.5", "--to", "1.7", "--steps", "3", "--json", "s.json", "--quiet")
    assert ehmo("scan", "a.xyz", "--bond", "V1-O2", *words).status == 0
    for name, more in (("one.svg", ()), ("other.svg", ("--bond", "V1-Cl3"))):
        ran = ehmo("figure", "scan", "s.json", "-o", name, *more)
        assert (ran.status, ran.err) == (0, "")
    assert (tmp_path / "one.svg").read_bytes() != (tmp_path / "other.svg").read_bytes()


def test_a_crystal(ehmo, put, tmp_path, refused):
    put(RUTILE, "r.cif")
    put()
    ran = ehmo("figure", "crystal", "r.cif", "-o", "r.svg", "--mesh", "2,2,2", "--path", "GXM", "--window=-6,4")
    assert (ran.status, ran.err) == (0, "")
    assert (tmp_path / "r.svg").read_bytes().startswith(b"<?xml")
    assert "no extended structure" in refused("figure", "crystal", "a.xyz", "-o", "x.svg")
    assert "--list" in refused("figure", "ladder", "r.cif", "-o", "x.svg")
    assert "no window" in refused("figure", "crystal", "r.cif", "-o", "x.svg", "--window", "4,1", "--mesh", "1,1,1")


def test_an_overview_of_a_store(ehmo, put, tmp_path, refused):
    put()
    assert ehmo("batch", "a.xyz", "--store", "s.db", "--quiet").status == 0
    ran = ehmo("figure", "overview", "s.db", "-o", "s.svg")
    assert (ran.status, ran.err) == (0, "")
    assert "174 x" in ran.out
    assert ehmo("figure", "overview", "s.db", "-o", "o.svg", "--where", "kind = 'oxo'").status == 0
    assert (tmp_path / "s.svg").read_bytes() != (tmp_path / "o.svg").read_bytes()
    assert "no bonds" in refused("figure", "overview", "s.db", "-o", "n.svg", "--where", "kind = 'nitrido'")
    assert "no store" in refused("figure", "overview", "a.xyz", "-o", "n.svg")


def test_usual_widths_are_those_of_the_columns():
    widths = {kind.width_mm for kind in FIGURE_KINDS.values()}
    assert widths == {10 * COLUMN_CM, 10 * DOUBLE_COLUMN_CM}


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
        (("interaction", "a.xyz", "-o", "out.svg", "--width", "5"), "80 to 400"),
        (("interaction", "a.xyz", "-o", "out.svg", "--width", "nan"), "80 to 400"),
        (("interaction", "a.xyz", "-o", "out.svg", "--spread", "3"), "it is for ladder, channels"),
        (("ladder", "a.xyz", "-o", "out.svg", "--where", "kind = 'oxo'"), "it is for overview"),
        (("scan", "a.xyz", "-o", "out.svg"), "no scan"),
        (("scan", "none.json", "-o", "out.svg"), "cannot be read"),
        (("overview", "none.db", "-o", "out.svg"), "none.db"),
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
