"""``ehmo bond FILE --page``: one file whole or none, and refusals before anything is calculated."""

from __future__ import annotations

import pytest

from tests.cli.conftest import VOCL3
from tests.crystal.test_report import RUTILE as CLEAN

RUTILE = CLEAN.replace("O1 O 0.3053", "<b>O1 O 0.3053")

pytest.importorskip("skimage", reason="scikit-image is not installed")
pytest.importorskip("plotly", reason="plotly is not installed")


def test_page_is_written_beside_the_text(ehmo, put, tmp_path):
    put()
    ran = ehmo("bond", "a.xyz", "--page", "a.html")
    assert ran.status == 0, ran.err
    assert ran.out == ehmo("bond", "a.xyz").out
    html = (tmp_path / "a.html").read_text(encoding="utf-8")
    assert html.startswith("<!DOCTYPE html>") and html.rstrip().endswith("</html>")
    assert "VOCl" in html
    assert sorted(path.name for path in tmp_path.iterdir()) == ["a.html", "a.xyz"]


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["--page", ""], "--page needs a path"),
        (["--page", "-"], "--page needs a path"),
        (["--page", "a.xyz"], "overwrite the structure file"),
        (["--page", "a.html", "--json", "a.html"], "name one file"),
        (["--page", "nowhere/a.html"], "cannot write"),
    ],
)
def test_refused(refused, put, words, said):
    put()
    assert said in refused("bond", "a.xyz", *words)


SCAN = ("scan", "a.xyz", "--bond", "V1-O2", "--from", "1.5", "--to", "1.6", "--steps", "3", "--quiet")


def test_scan_of_the_same_atoms_is_shown(ehmo, refused, put, tmp_path):
    put()
    assert ehmo(*SCAN, "--json", "scan.json").status == 0
    assert "--scan is for a page" in refused("bond", "a.xyz", "--scan", "scan.json")
    assert ehmo("bond", "a.xyz", "--page", "a.html", "--scan", "scan.json").status == 0
    html = (tmp_path / "a.html").read_text(encoding="utf-8")
    assert 'id="scan"' in html
    assert "Scan of the length V1-O2" in html
    put("2\ncharge=0 unpaired=3\nV 0 0 0\nO 0 0 1.59\n", "b.xyz")
    assert "the scan is of other atoms" in refused("bond", "b.xyz", "--page", "b.html", "--scan", "scan.json")
    assert "overwrite the scan" in refused("bond", "a.xyz", "--page", "scan.json", "--scan", "scan.json")


def test_crosscheck_stands_beside_the_report(ehmo, refused, put, tmp_path):
    # The gas molecule VO, quartet: a Hartree-Fock run of two seconds.
    put("2\ncharge=0 unpaired=3\nV 0 0 0\nO 0 0 1.589\n", "b.xyz")
    assert "needs a path" in refused("crosscheck", "b.xyz", "--page", "")
    ran = ehmo("crosscheck", "b.xyz", "--theory", "hf", "--cache", "off", "--page", "b.html")
    assert ran.status == 0, ran.err
    html = (tmp_path / "b.html").read_text(encoding="utf-8")
    assert 'id="crosscheck"' in html
    assert "Bonds: ehmo beside HF" in html
    assert "a second opinion, not the truth" in html


def test_crystal_has_a_page_without_orbitals(ehmo, refused, put, tmp_path):
    put(RUTILE, "c.cif")
    ran = ehmo("bond", "c.cif", "--mesh", "2,2,2", "--page", "c.html")
    assert ran.status == 0, ran.err
    html = (tmp_path / "c.html").read_text(encoding="utf-8")
    assert "<h1>TiO<sub>2</sub></h1>" in html
    assert "&lt;b&gt;O1" in html
    assert "<b>O1" not in html
    for name in ("words", "bonds", "bands", "charges", "assumptions", "doubts", "cautions", "method", "downloads"):
        assert f'id="{name}"' in html
    assert 'id="page-library"' not in html
    assert "is for molecules" in refused("bond", "c.cif", "--page", "c2.html", "--scan", "c.cif")


def test_several_structures_are_refused_and_one_can_be_picked(ehmo, refused, put, tmp_path):
    put(VOCL3 + VOCL3)
    assert "a page shows one structure, and there are 2" in refused("bond", "a.xyz", "--page", "a.html")
    assert ehmo("bond", "a.xyz", "--pick", "2", "--page", "a.html").status == 0
    assert (tmp_path / "a.html").exists()
