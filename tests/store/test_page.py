"""The page of a store: it loads nothing, runs nothing, and draws and names what the store holds."""

from __future__ import annotations

import base64
import hashlib
import re
from html.parser import HTMLParser

import numpy as np
import pytest

from ehmo.records.store_summary import Outlier, Trend
from ehmo.report.page.scatter import KindPoints, Limits, scatter_drawing, ticks
from ehmo.report.page.store import store_page
from ehmo.store import StoredRow, open_store, summarise
from ehmo.store.distributions import bond_points
from tests.store.rows import done, failed, key, provenance
from tests.store.test_summary import shifted

HOSTILE = '<script>alert(1)</script><img src=x onerror="a()">\x1b[2J'


class Elements(HTMLParser):
    """Elements of a page with their attributes, and its text."""

    def __init__(self, html: str) -> None:
        super().__init__()
        self.found: list[tuple[str, dict[str, str | None]]] = []
        self.text = ""
        self.feed(html)
        self.close()

    def handle_starttag(self, tag, attrs):
        self.found.append((tag, dict(attrs)))

    def handle_data(self, data):
        self.text += data

    def of(self, tag: str, **wanted: str) -> list[dict[str, str | None]]:
        return [
            attributes
            for name, attributes in self.found
            if name == tag and all(attributes.get(key.rstrip("_")) == value for key, value in wanted.items())
        ]


@pytest.fixture
def html(ehmo, tmp_path) -> str:
    with open_store(tmp_path / "a.sqlite", create=True) as store:
        store.write([shifted(k, mayer=-2.0 * step, length=step) for k, step in enumerate(np.linspace(-0.05, 0.05, 21))])
        odd = shifted(30, mayer=-0.9).document
        store.write([StoredRow(key(30), "done", "", odd, provenance(source=HOSTILE, entry=HOSTILE))])
        store.write([done(40, "MnO4 -"), failed(50, f"{HOSTILE}; mend", source="x")])
    assert ehmo("summary", "a.sqlite", "--page", "a.html").status == 0
    return (tmp_path / "a.html").read_text()


def test_nothing_is_loaded_and_nothing_runs(html):
    page = Elements(html)
    assert not {name for name, _ in page.found} & {"script", "img", "link", "iframe", "object", "form", "image", "use"}
    for name, attributes in page.found:
        assert not [
            one for one in attributes if one.startswith("on") or one in ("src", "style", "action", "xlink:href")
        ]
        assert name != "a" or re.fullmatch(r"#[\w-]+", attributes["href"])
    (policy,) = [one["content"] for one in page.of("meta", **{"http-equiv": "Content-Security-Policy"})]
    (style,) = re.findall(r"<style>(.*?)</style>", html, re.DOTALL)
    digest = base64.b64encode(hashlib.sha256(style.encode()).digest()).decode()
    assert policy == f"default-src 'none'; style-src 'sha256-{digest}'; base-uri 'none'; form-action 'none'"
    assert "url(" not in style
    assert "@import" not in style


def test_text_of_files_stays_text(html):
    page = Elements(html)
    assert page.text.count("<script>alert(1)</script>") >= 3  # outlier with source and entry, reason, message
    assert "\x1b" not in html
    assert "\\x1b[2J" in page.text


def test_links_lead_somewhere(html):
    page = Elements(html)
    places = {attributes["id"] for _, attributes in page.found if "id" in attributes}
    assert {one["href"].removeprefix("#") for one in page.of("a")} <= places
    assert "outlier-1" in places


def test_numbers_are_those_of_the_summary(html):
    text = Elements(html).text
    assert "23 structures done, 1 failed; 136 metal-donor bonds" in text
    assert "V, 132 bonds" in text
    assert "Mn, 4 bonds" in text
    assert "1: length, or Mayer order less that of the line" in text


def test_marks_and_rings_stand_where_the_numbers_say(html):
    page = Elements(html)
    (ring,) = page.of("circle", class_="ring")
    with open_store("a.sqlite", read_only=True) as store:
        (outlier,) = summarise(store).outliers
        points = list(bond_points(store))
    kinds = [KindPoints(kind, 0, lengths, orders, None) for _, kind, lengths, orders in points]
    limits = Limits.around(kinds)
    assert float(ring["cx"]) == pytest.approx(limits.x(outlier.length_A), abs=0.06)
    assert float(ring["cy"]) == pytest.approx(limits.y(outlier.mayer), abs=0.06)
    oxo = [path["d"] for path in page.of("path") if (path["class"] or "").endswith("mark-pi")]
    starts = [tuple(map(float, start)) for path in oxo for start in re.findall(r"M([\d.]+) ([\d.]+)", path)]
    assert any(abs(x - float(ring["cx"])) < 1 and abs(y - float(ring["cy"])) < 1 for x, y in starts)


def test_points_on_one_another_are_drawn_once_and_none_is_lost():
    rng = np.random.default_rng(3)
    lengths, orders = rng.uniform(1.5, 2.5, 50_000), rng.uniform(0.2, 2.5, 50_000)
    kind = KindPoints("oxo", 0, lengths, orders, Trend(-1.0, 2.0, 1.0))
    limits = Limits.around([kind])
    svg = scatter_drawing("V", [kind], limits, {})
    starts = np.array([tuple(map(float, one)) for one in re.findall(r"M([\d.]+) ([\d.]+)", svg)])
    assert len(np.unique(starts, axis=0)) == len(starts) < 50_000
    places = {(x, y) for x, y in np.round(starts / 1.5).astype(int).tolist()}
    wanted = np.round(np.stack([limits.x(lengths), limits.y(orders)], axis=1) / 1.5).astype(int)
    assert places == {(x, y) for x, y in wanted.tolist()}
    assert len(re.findall("trend", svg)) == 1


def test_numbers_of_crowded_outliers_do_not_overlap():
    x = 1.6 + 0.001 * np.arange(12)
    kind = KindPoints("oxo", 0, np.append(x, 2.4), np.append(np.full(12, 2.0), 0.3), None)
    numbered = {
        k: Outlier(key(k), "a.xyz", "", "V1-O2", "V", "oxo", x[k], 2.0, "mayer", 2.0, 1.0, 9.0) for k in range(12)
    }
    page = Elements(scatter_drawing("V", [kind], Limits.around([kind]), numbered))
    places = [(float(one["x"]), float(one["y"])) for one in page.of("text", class_="numbered")]
    assert len(places) == 12
    for k, (x1, y1) in enumerate(places):
        assert 46 < x1 < 440
        assert 0 < y1 < 300
        assert all(abs(x1 - x2) > 17 or abs(y1 - y2) > 12 for x2, y2 in places[:k])


def test_an_empty_store_and_many_metals(tmp_path):
    with open_store(tmp_path / "a.sqlite", create=True) as store:
        empty = store_page(summarise(store), bond_points(store))
    assert "No structure is done" in empty
    points = [(f"M{k}", f"kind{k}", np.array([1.6, 1.7]), np.array([2.0, 1.9])) for k in range(30)]
    with open_store(tmp_path / "a.sqlite") as store:
        page = Elements(store_page(summarise(store), points))
    assert len(page.of("figure")) == 24
    assert "6 further metals with fewer bonds not drawn" in page.text
    assert len(page.of("svg", class_="sample")) == 5  # four kinds and the rest


@pytest.mark.parametrize(("first", "last"), [(1.48, 2.31), (0.0, 2.7), (-0.3, 0.1), (1.6, 1.7001)])
def test_ticks_are_round_and_within(first, last):
    found = ticks(first, last)
    assert 3 <= len(found) <= 9
    assert all(first <= one <= last for one in found)
    assert np.ptp(np.diff(found)) < 1e-9


def test_a_page_that_cannot_be_written(refused, tmp_path):
    with open_store(tmp_path / "a.sqlite", create=True) as store:
        store.write([done(1)])
    assert "cannot write the file" in refused("summary", "a.sqlite", "--page", "absent/a.html")
    assert "--page needs a path" in refused("summary", "a.sqlite", "--page", "")
    assert "that is the store itself" in refused("summary", "a.sqlite", "--page", "a.sqlite")
