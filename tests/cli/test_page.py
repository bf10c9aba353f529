"""``ehmo bond FILE --page``: one file whole or none, and refusals before anything is calculated."""

from __future__ import annotations

import pytest

from tests.cli.conftest import VOCL3

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


def test_several_structures_are_refused_and_one_can_be_picked(ehmo, refused, put, tmp_path):
    put(VOCL3 + VOCL3)
    assert "a page shows one structure, and there are 2" in refused("bond", "a.xyz", "--page", "a.html")
    assert ehmo("bond", "a.xyz", "--pick", "2", "--page", "a.html").status == 0
    assert (tmp_path / "a.html").exists()
