"""The page as a document: its policy, structure, data and downloads; browsers come in another file."""

from __future__ import annotations

import base64
import json
import re
import zlib
from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

from ehmo import bond_report
from ehmo.errors import InputError
from ehmo.orbitals.parameters import load_parameters
from ehmo.report.cautions import CAUTIONS
from ehmo.report.document import bond_document
from ehmo.report.page import frame
from ehmo.report.page.sections import typographic
from ehmo.report.page.shown import LEVELS, MOST_CARRIERS, orbital_key, shown_channels, shown_orbitals
from ehmo.report.page.surfaces import STEP_A
from ehmo.report.page.whole import bond_page
from tests.geometries import SPECIES
from tests.report.page.packing import unpacked
from tests.report.page.test_markup import HOSTILE, Seen

pytest.importorskip("skimage", reason="scikit-image is not installed")
pytest.importorskip("plotly", reason="plotly is not installed")

LARGEST_BYTES = 7_000_000
TABLE = load_parameters("standard")


@pytest.fixture(scope="module")
def report():
    fragment = SPECIES["[VO(OH2)5]2+"].fragment()
    return bond_report(replace(fragment, title=HOSTILE, source=f"{HOSTILE}.xyz"), TABLE)


@pytest.fixture(scope="module")
def page(report) -> str:
    return bond_page(report, TABLE)


@pytest.fixture(scope="module")
def seen(page) -> Seen:
    return Seen(page)


def scripts(page: str) -> dict[str, str]:
    """Content of each script element by its id; the script that runs has none."""
    found = re.findall(r"<script((?: [^>]*)?)>(.*?)</script>", page, re.DOTALL)
    return {(re.findall(r'id="([^"]+)"', words) or [""])[0]: text for words, text in found}


@pytest.fixture(scope="module")
def data(page) -> dict:
    return json.loads(scripts(page)["page-data"])


def test_policy_forbids_all_but_the_two_scripts(page, seen):
    (policy,) = [a["content"] for t, a in seen.elements if a.get("http-equiv") == "Content-Security-Policy"]
    rules = dict(part.strip().split(" ", 1) for part in policy.split(";"))
    assert rules["default-src"] == rules["base-uri"] == rules["form-action"] == "'none'"
    assert rules["img-src"] == "data: blob:"
    hashes = rules["script-src"].split()
    assert len(hashes) == 2 and all(h.startswith("'sha256-") for h in hashes)
    found = scripts(page)
    library = zlib.decompress(base64.b64decode(found["page-library"])).decode()
    assert {frame.content_hash(found[""]), frame.content_hash(library)} == set(hashes)
    # The policy stands before anything that it should hold back.
    assert page.index("Content-Security-Policy") < min(page.index("<style"), page.index("<script"))


def test_nothing_is_asked_of_the_network(seen):
    for tag, attributes in seen.elements:
        assert tag not in {"link", "iframe", "object", "embed", "form", "base", "audio", "video"}
        for name, value in attributes.items():
            assert not name.startswith("on")
            if name in {"src", "href", "xlink:href"}:
                assert value.startswith(("data:", "#")), (tag, value[:60])
            elif name not in {"xmlns", "xmlns:xlink", "content"}:
                assert "url(" not in (value or "").replace("url(#", "")


def test_hostile_title_and_source_are_text(page, seen):
    tags = [tag for tag, _ in seen.elements]
    assert tags.count("script") == 4
    assert page.count("alert(1)") == seen.text.count("alert(1)") > 0
    assert not any(attributes.get("src") == "x" for _, attributes in seen.elements)


def test_small_enough(page):
    assert len(page.encode()) < LARGEST_BYTES


def test_headings_captions_and_pictures_have_words(seen):
    levels = [int(tag[1]) for tag, _ in seen.elements if re.fullmatch(r"h[1-6]", tag)]
    assert levels[0] == 1 and levels.count(1) == 1
    assert all(after - before <= 1 for before, after in pairwise(levels))
    tags = [tag for tag, _ in seen.elements]
    assert tags.count("table") == tags.count("caption") >= 5
    assert all("alt" in attributes for tag, attributes in seen.elements if tag == "img")
    names = [attributes["id"] for tag, attributes in seen.elements if "id" in attributes]
    assert len(names) == len(set(names))
    links = {attributes["href"][1:] for tag, attributes in seen.elements if attributes.get("href", "").startswith("#")}
    assert links <= set(names)
    assert next(a["lang"] for tag, a in seen.elements if tag == "html") == "en"


def test_all_sections_are_there_with_their_sentences(report, seen):
    sections = {attributes["id"] for tag, attributes in seen.elements if tag == "section"}
    assert sections == {
        *("words", "bonds", "diagram", "orbitals", "charges", "ladder", "spectrum", "assumptions", "doubts"),
        *("cautions", "method", "downloads"),
    }
    for sentence in (*report.assumptions, *CAUTIONS):
        assert typographic(sentence) in seen.text
    assert "triple: one sigma, two pi by counting" in seen.text


def test_every_channel_is_a_choice_with_its_carriers(report, seen, data):
    channels = shown_channels(report)
    radios = [attributes["value"] for tag, attributes in seen.elements if attributes.get("type") == "radio"]
    assert radios == [shown.key for shown in channels]
    assert set(radios) | {orbital_key(k) for k in shown_orbitals(report, channels)} == set(data["surfaces"])
    for shown in channels:
        listed = {carrier.level.orbitals for carrier in shown.carriers}
        assert {k for level in listed for k in level} <= set(shown_orbitals(report, channels))
        assert len([c for c in shown.carriers if not c.opposed]) <= MOST_CARRIERS
        assert sum(c.share for c in shown.carriers) + shown.rest == pytest.approx(1.0)
        assert abs(shown.rest) < 0.25


def test_oxo_pi_channels_are_carried_by_the_bonding_e_level_and_opposed_in_the_empty_one(report):
    pi = [s for s in shown_channels(report) if s.bond == 0 and s.channel.type == "pi"]
    assert len(pi) == 2
    for shown in pi:
        first, *_, last = shown.carriers
        assert (first.level.irrep, first.level.part, first.level.alpha + first.level.beta) == ("e", "pi", 4.0)
        assert first.share > 0.9
        assert (last.level.irrep, last.level.part, last.opposed) == ("e", "pi*", True)
        assert last.level.alpha + last.level.beta == 0


def test_surfaces_stand_where_the_orbital_has_the_level(report, data):
    """Points of the surfaces of the highest filled orbital against its amplitude there."""
    from ehmo.orbitals.grid import grid_values
    from ehmo.records.grid import Grid

    orbital = report.state.homo
    surfaces = unpacked(data["surfaces"][orbital_key(orbital)], STEP_A)
    assert len(surfaces) == 2 * len(LEVELS)
    positions = report.fragment.positions_A
    centre = (positions.min(axis=0) + positions.max(axis=0)) / 2
    axes = report.coordination.frames[0].axes
    column = report.state.coefficients[:, [orbital]]
    step = 1e-3
    for place, level in enumerate(LEVELS):
        for sign, surface in zip((1, -1), surfaces[2 * place : 2 * place + 2], strict=True):
            misses = []
            for point in (surface[0] @ axes + centre)[::23]:
                near = grid_values(column, report.basis, positions, TABLE, Grid(point, np.full(3, step), (2, 2, 2)))[0]
                slopes = np.array([near[1, 0, 0], near[0, 1, 0], near[0, 0, 1]]) - near[0, 0, 0]
                misses.append(abs(near[0, 0, 0] - sign * level) / np.linalg.norm(slopes / step))
            # The points of the grid are 0.24 A apart; a stick is 0.14 A thick.
            assert np.quantile(misses, 0.95) < 0.07


def test_downloads_are_the_report(report, seen, data):
    files = {a["download"]: base64.b64decode(a["href"].partition(",")[2]) for t, a in seen.elements if "download" in a}
    assert sorted(name.rsplit(".", 1)[1] for name in files) == ["csv", "json", "xyz"]
    by_ending = {name.rsplit(".", 1)[1]: content.decode() for name, content in files.items()}
    assert json.loads(by_ending["json"]) == json.loads(json.dumps(bond_document(report)))
    assert ",V1-O2,oxo,,1.591," in by_ending["csv"].splitlines()[1]
    assert by_ending["xyz"].splitlines()[1] == "charge=2 unpaired=1"
    assert len(data["files"]) >= 2
    for text in data["files"].values():
        assert zlib.decompress(base64.b64decode(text)).startswith(b"VO(H2O)5 orbital ")


def test_missing_library_is_named(monkeypatch):
    def absent(_package: str) -> None:
        raise ModuleNotFoundError("no plotly", name="plotly")

    monkeypatch.setattr(frame.resources, "files", absent)
    with pytest.raises(InputError, match=r"needs plotly, which is not installed; .*ehmo\[page\]"):
        frame.plotting_library()
