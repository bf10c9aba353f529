"""The page in a real browser: silent, offline, answering to mouse and keyboard, on paper, without WebGL."""

from __future__ import annotations

import io
from dataclasses import replace

import numpy as np
import pytest

from ehmo import bond_report
from ehmo.calculate.crystal import CrystalOptions
from ehmo.calculate.crystal_report import crystal_report
from ehmo.orbitals.parameters import load_parameters
from ehmo.report.page.crystal import crystal_page
from ehmo.report.page.shown import shown_channels
from ehmo.report.page.whole import bond_page
from ehmo.structure import crystal_contents
from tests.crystal.test_report import RUTILE
from tests.geometries import SPECIES
from tests.report.page.browser import PATIENCE_MS, launcher
from tests.report.page.test_markup import HOSTILE

pytest.importorskip("skimage", reason="scikit-image is not installed")
pytest.importorskip("plotly", reason="plotly is not installed")

TABLE = load_parameters("standard")


@pytest.fixture(scope="module")
def launch():
    with launcher() as found:
        yield found


@pytest.fixture(scope="module")
def browser(launch):
    return launch()


@pytest.fixture(scope="module")
def report():
    fragment = SPECIES["VOCl3"].fragment()
    return bond_report(replace(fragment, title=HOSTILE, source=f"{HOSTILE}.xyz"), TABLE)


@pytest.fixture(scope="module")
def address(browser, report, tmp_path_factory) -> str:
    # The browser comes first, so that no page is made where there is none to open it.
    path = tmp_path_factory.mktemp("page") / "report.html"
    path.write_text(bond_page(report, TABLE), encoding="utf-8")
    return path.as_uri()


class Watched:
    """A tab with what its console said and what it asked for."""

    def __init__(self, browser, address: str, **options) -> None:
        self.tab = browser.new_context(viewport={"width": 1280, "height": 900}, **options).new_page()
        self.tab.set_default_timeout(PATIENCE_MS)
        self.said: list[str] = []
        self.asked: list[str] = []
        self.tab.on("console", lambda line: self.said.append(line.text) if line.type == "error" else None)
        self.tab.on("pageerror", lambda fault: self.said.append(str(fault)))
        self.tab.on("dialog", lambda dialog: self.said.append(f"dialog {dialog.message}"))
        self.tab.on("request", lambda request: self.asked.append(request.url))
        self.tab.goto(address)

    def drawings(self) -> int:
        """Times the view has been drawn."""
        return int(self.tab.locator("#view").get_attribute("data-drawn") or 0)

    def wait_for_drawing(self, after: int) -> None:
        """Wait until the view has been drawn once more."""
        self.tab.wait_for_selector(f'#view[data-drawn="{after + 1}"]')

    def picture(self) -> np.ndarray:
        """Pixels of the view."""
        from matplotlib.image import imread

        return imread(io.BytesIO(self.tab.locator("#view").screenshot()), format="png")[..., :3]

    def text(self, selector: str) -> str:
        """Text of one element."""
        return self.tab.locator(selector).inner_text()


@pytest.fixture
def opened(browser, address):
    watched = Watched(browser, address)
    watched.tab.wait_for_selector("#view[data-drawn]")
    yield watched
    assert watched.said == []
    outside = [url for url in watched.asked if not url.startswith(("data:", "blob:"))]
    assert outside == [address]
    watched.tab.context.close()


def differing(one: np.ndarray, other: np.ndarray) -> float:
    """Share of pixels that differ clearly."""
    return float((np.abs(one - other).max(axis=2) > 0.1).mean())


def test_channels_and_orbitals_change_the_view(opened, report):
    channels, pictures = shown_channels(report), [opened.picture()]
    assert "pi channel of V1-O2" in opened.text("#shown")
    sigma = next(shown for shown in channels if shown.bond == 0 and shown.channel.type == "sigma")
    for selector, said in (
        (f'label[for="{sigma.key}"]', "sigma channel of V1-O2: metal and donor hybrid"),
        ('[data-show="metal"]', "sigma channel of V1-O2: metal hybrid"),
        ("#carriers-here .orbital >> nth=0", "Orbital "),
        ("#orbitals .plate button >> nth=0", "Orbital "),
    ):
        count = opened.drawings()
        opened.tab.locator(selector).click()
        opened.wait_for_drawing(count)
        assert said in opened.text("#shown")
        pictures.append(opened.picture())
        assert differing(pictures[-1], pictures[-2]) > 0.02
    assert opened.tab.locator(".level.carries").count() > 0


def test_surface_value_and_labels_change_the_view(opened):
    before, count = opened.picture(), opened.drawings()
    opened.tab.locator("#level").focus()
    opened.tab.keyboard.press("ArrowRight")
    opened.wait_for_drawing(count)
    assert opened.text("#level-value") == "0.08"
    smaller = opened.picture()
    assert differing(before, smaller) > 0.01
    opened.tab.locator("#labels").uncheck()
    opened.wait_for_drawing(count + 1)
    assert opened.tab.locator("#view .annotation").count() == 0


def test_keyboard_reaches_and_works_everything(opened):
    tab = opened.tab
    order = []
    for _ in range(60):
        tab.keyboard.press("Tab")
        order.append(
            tab.evaluate(
                "() => { const a = document.activeElement; return a.id || a.className.baseVal || a.className }"
            )
        )
        if order[-1] == "level":
            break
    assert order[0] == "skip"
    # The choice stands before the view, and the view before its controls.
    choice = next(k for k, name in enumerate(order) if name.startswith("channel-"))
    assert choice < order.index("view") < order.index("level")
    tab.locator("#view").focus()
    before, count = opened.picture(), opened.drawings()
    tab.keyboard.press("ArrowRight")
    opened.wait_for_drawing(count)
    turned = opened.picture()
    assert differing(before, turned) > 0.02
    tab.keyboard.press("+")
    opened.wait_for_drawing(count + 1)
    assert differing(turned, opened.picture()) > 0.02
    tab.keyboard.press("Home")
    opened.wait_for_drawing(count + 2)
    assert differing(before, opened.picture()) < 0.01

    radio = tab.locator(".channel-radio:checked")
    first = radio.get_attribute("value")
    radio.focus()
    count = opened.drawings()
    tab.keyboard.press("ArrowDown")
    opened.wait_for_drawing(count)
    assert tab.locator(".channel-radio:checked").get_attribute("value") != first

    level = tab.locator("g.level").first
    level.focus()
    count = opened.drawings()
    tab.keyboard.press("Enter")
    opened.wait_for_drawing(count)
    assert level.get_attribute("aria-pressed") == "true"
    assert opened.text("#shown") == opened.text("#echo-words")


def test_hostile_title_and_source_stay_text(opened):
    assert "<script>alert(1)</script>" in opened.text("header.top")
    assert opened.tab.locator("header.top script, header.top img").count() == 0


def test_downloads_arrive_whole(opened, report):
    links = opened.tab.locator("#downloads a[download]")
    for k in range(links.count()):
        with opened.tab.expect_download() as coming:
            links.nth(k).click()
        assert coming.value.suggested_filename.startswith("VOCl3.")
    with opened.tab.expect_download() as coming:
        opened.tab.locator("[data-file]").first.click()
    from ase.io.cube import read_cube

    with open(coming.value.path(), encoding="ascii") as file:  # noqa: PTH123
        atoms = read_cube(file)["atoms"]
    np.testing.assert_allclose(atoms.positions, report.fragment.positions_A, atol=1e-5)


def test_prints_with_pictures_and_without_controls(opened):
    assert opened.tab.pdf().startswith(b"%PDF")
    opened.tab.emulate_media(media="print")
    assert not opened.tab.locator("#viewer").is_visible()
    assert not opened.tab.locator("nav").is_visible()
    assert opened.tab.locator(".still img").first.is_visible()


def test_still_pictures_without_webgl(launch, address):
    watched = Watched(launch("--disable-3d-apis"), address)
    watched.tab.wait_for_selector("body.still-only")
    assert "WebGL" in watched.text("#why-still")
    still = watched.tab.locator("#view-still")
    first = still.get_attribute("src")
    assert first.startswith("data:image/png;base64,")
    assert still.get_attribute("alt").startswith("Metal and donor")
    watched.tab.locator(".orbital:visible").first.click()
    assert still.get_attribute("src") not in (first, "data:,")
    assert not watched.tab.locator("#level").is_visible()
    assert watched.said == []


def test_readable_without_scripts(browser, address):
    watched = Watched(browser, address, java_script_enabled=False)
    assert watched.tab.locator(".still img").first.is_visible()
    assert not watched.tab.locator("#viewer").is_visible()
    assert not watched.tab.locator(".orbital").first.is_visible()
    assert "%" in watched.text(".levels >> nth=0")


@pytest.mark.parametrize("width", [360, 1280])
def test_nothing_is_wider_than_the_window(browser, address, width):
    watched = Watched(browser, address)
    watched.tab.set_viewport_size({"width": width, "height": 800})
    assert watched.tab.evaluate("() => document.documentElement.scrollWidth") <= width


def test_page_of_a_crystal_is_silent_and_gives_its_method(browser, tmp_path):
    path = tmp_path / "rutile.cif"
    path.write_text(RUTILE, encoding="utf-8")
    report = crystal_report(crystal_contents(path), TABLE, crystal=CrystalOptions(mesh=(2, 2, 2)))
    page = tmp_path / "rutile.html"
    page.write_text(crystal_page(report, TABLE), encoding="utf-8")
    watched = Watched(browser, page.as_uri())
    watched.tab.locator("#copy-method").click()
    watched.tab.wait_for_selector("#copied:not(:empty)")
    assert watched.tab.locator("#bands svg").is_visible()
    assert watched.said == []
    assert watched.asked == [page.as_uri()]
