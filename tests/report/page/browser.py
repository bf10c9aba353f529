"""A Chromium without a window for the tests of the page."""

from __future__ import annotations

import contextlib
import shutil
from collections.abc import Callable, Iterator

import pytest

QUIET = (
    *("--no-sandbox", "--no-first-run", "--disable-quic", "--disable-sync", "--disable-background-networking"),
    *("--disable-component-update", "--use-angle=swiftshader", "--enable-unsafe-swiftshader"),
)
"""No traffic of the browser's own, and WebGL in software."""

PATIENCE_MS = 120_000
"""Software WebGL on a busy machine is slow; nothing here waits that long otherwise."""


@contextlib.contextmanager
def launcher() -> Iterator[Callable]:
    """Function that starts a browser with further arguments; the test is skipped where there is none."""
    api = pytest.importorskip("playwright.sync_api", reason="playwright is not installed")
    path = shutil.which("chromium") or shutil.which("chromium-browser") or shutil.which("google-chrome")
    if path is None:
        pytest.skip("no Chromium on this machine")
    with api.sync_playwright() as play:
        started = []

        def launch(*arguments: str):
            started.append(play.chromium.launch(executable_path=path, args=[*QUIET, *arguments]))
            return started[-1]

        try:
            yield launch
        finally:
            for browser in started:
                browser.close()
