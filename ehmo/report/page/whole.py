"""The page: one HTML file with words, bonds, views, tables and downloads."""

from __future__ import annotations

import base64
import zlib
from importlib import resources
from typing import Any

from basis_params import ParameterTable
from ehmo import __version__
from ehmo.errors import InputError
from ehmo.records.report import BondReport
from ehmo.records.wording import electrons_in_words
from ehmo.report.method import method_paragraph
from ehmo.report.page.bonds import bond_entries
from ehmo.report.page.diagram import diagram_figure
from ehmo.report.page.downloads import cube_orbitals, file_links, packed_cubes
from ehmo.report.page.formulas import formula_markup, formula_plain
from ehmo.report.page.frame import colours, own_file
from ehmo.report.page.markup import Content, Markup, content_hash, element, embedded_json, markup
from ehmo.report.page.sections import (
    bond_table,
    charges_section,
    ladder_section,
    method_section,
    orbitals_section,
    section,
    spectrum_section,
    spread_section,
    trust_sections,
    typographic,
    words_section,
)
from ehmo.report.page.shown import LEVELS, USUAL_LEVEL, shown_channels, shown_orbitals
from ehmo.report.page.view import page_view

_LIBRARY_PACKING = 5  # higher levels save little and take long


def bond_page(report: BondReport, table: ParameterTable) -> str:
    """Page of a bond report.

    Parameters
    ----------
    report : BondReport
    table : ParameterTable
        The parameter set it was made with.

    Returns
    -------
    html : str
        A whole document that asks for nothing else, and whose policy forbids it to.

    Raises
    ------
    InputError
        If the libraries of the extra ``page`` are not installed.
    """
    library = plotting_library()
    channels = shown_channels(report)
    orbitals = shown_orbitals(report, channels)
    view = page_view(report, table, channels, orbitals)
    method = method_paragraph(report, table)
    cubes = packed_cubes(report, table, cube_orbitals(report, channels))
    sections = [
        words_section(report),
        section(
            "bonds",
            "Bonds",
            element(
                "p", "Choose a channel to see its two hybrids and the levels that carry it.", class_="note needs-script"
            ),
            element(
                "div",
                element("div", bond_entries(report, channels, view.pictures), class_="entries"),
                _viewer(),
                class_="bench",
            ),
            element("details", element("summary", "Table of the bonds"), bond_table(report)),
        ),
        section("diagram", "Interaction diagram", diagram_figure(report, orbitals)),
        orbitals_section(report, orbitals, view.pictures),
        charges_section(report),
        ladder_section(report),
        spectrum_section(report),
        spread_section(report),
        trust_sections(report),
        method_section(method),
        _downloads(report, list(cubes)),
    ]
    data = {**view.data, "files": cubes}
    plain = element("script", embedded_json(str(method)), type="text/plain", id="method-plain")
    return _document(report, markup([_top(report), element("main", sections), plain]), data, library)


def plotting_library() -> str:
    """Script of the plotting library, from its own package.

    Raises
    ------
    InputError
        If a library of the extra ``page`` is missing.
    """
    try:
        import skimage.measure  # noqa: F401  (fail before the calculation of surfaces, with the same words)

        text = resources.files("plotly").joinpath("package_data", "plotly.min.js").read_text("utf-8")
    except (ImportError, FileNotFoundError) as fault:
        missing = getattr(fault, "name", None) or "plotly"
        raise InputError(
            f"--page needs {missing}, which is not installed", mend="install it with: pip install 'ehmo[page]'"
        ) from None
    # A document has no carriage returns, and the hash is over what the browser reads.
    return text.replace("\r\n", "\n").replace("\r", "\n")


def _document(report: BondReport, body: Markup, data: dict[str, Any], library: str) -> str:
    style = f"{colours()}\n{own_file('page.css')}"
    script = own_file("page.js")
    # Styles are not restricted to hashes: the plotting library sets them on its elements. They can load nothing.
    policy = "; ".join(
        (
            "default-src 'none'",
            f"script-src {content_hash(script)} {content_hash(library)}",
            "style-src 'unsafe-inline'",
            "img-src data: blob:",
            "base-uri 'none'",
            "form-action 'none'",
        )
    )
    packed = base64.b64encode(zlib.compress(library.encode("utf-8"), _LIBRARY_PACKING)).decode("ascii")
    head = element(
        "head",
        element("meta", charset="utf-8"),
        element("meta", http_equiv="Content-Security-Policy", content=policy),
        element("meta", name="viewport", content="width=device-width, initial-scale=1"),
        element("meta", name="referrer", content="no-referrer"),
        element("meta", name="generator", content=f"ehmo {__version__}"),
        element("title", f"{formula_plain(report)}: bond report"),
        element("style", Markup(style)),
    )
    whole = element(
        "body",
        element("a", "To the bonds", href="#bonds", class_="skip"),
        body,
        element("footer", f"ehmo {__version__}; this page holds all its parts and loads nothing."),
        element("script", embedded_json(data), type="application/json", id="page-data"),
        element("script", Markup(packed), type="text/plain", id="page-library"),
        element("script", Markup(script)),
    )
    return f"<!DOCTYPE html>\n{element('html', head, whole, lang='en')}\n"


def _top(report: BondReport) -> Markup:
    fragment = report.fragment
    links = (
        ("words", "In words"), ("bonds", "Bonds"), ("diagram", "Interaction diagram"), ("orbitals", "Orbitals"),
        ("charges", "Charges"), ("ladder", "Ladder"), ("spectrum", "Spectrum"), ("spread", "Spread"),
        ("doubts", "To doubt"), ("method", "Method"), ("downloads", "Downloads"),
    )  # fmt: skip
    present = {"ladder": ladder_section(report), "spectrum": spectrum_section(report), "spread": report.spread}
    shown = [(name, words) for name, words in links if name not in present or present[name] is not None]
    origin: list[Content] = [f"From {fragment.source or 'a fragment'}"]
    if fragment.title:
        origin.append(f", titled \N{LEFT DOUBLE QUOTATION MARK}{fragment.title}\N{RIGHT DOUBLE QUOTATION MARK}")
    return element(
        "header",
        element("p", "Metal-donor bonds by extended Hückel theory", class_="kind"),
        element("h1", formula_markup(report)),
        element("p", typographic(electrons_in_words(fragment)), class_="state"),
        element("p", origin, class_="origin"),
        element(
            "nav",
            element("ul", [element("li", element("a", words, href=f"#{name}")) for name, words in shown]),
            aria_label="Sections",
        ),
        class_="top",
    )


def _viewer() -> Markup:
    """View in three dimensions with its controls."""
    parts = (("both", "Both hybrids"), ("metal", "Metal"), ("donor", "Donor"))
    hybrids = element(
        "span",
        [element("button", words, type="button", data_show=name, aria_pressed="false") for name, words in parts],
        class_="group needs-webgl",
        role="group",
        aria_label="Hybrids shown",
    )
    value = element(
        "label",
        "Surface at ",
        element("input", type="range", id="level", min="0", max=len(LEVELS) - 1, step="1", value=USUAL_LEVEL,
                aria_describedby="level-value"),
        element(
            "span",
            element("span", f"{LEVELS[USUAL_LEVEL]:.2f}", id="level-value"),
            " bohr",
            element("sup", "\N{MINUS SIGN}3/2"),
        ),
        class_="needs-webgl",
    )  # fmt: skip
    labels = element(
        "label", element("input", type="checkbox", id="labels", checked=True), "Labels", class_="needs-webgl"
    )
    reset = element("button", "Reset view", type="button", id="reset", class_="needs-webgl")
    key = element(
        "span",
        element("span", element("i", class_="plus"), "positive"),
        element("span", element("i", class_="minus"), "negative phase"),
        class_="key",
    )
    keys = "Drag to turn. With the keyboard: arrow keys turn, + and \N{MINUS SIGN} zoom, Home resets."
    return element(
        "div",
        element("p", "", id="shown", class_="shown", role="status"),
        element(
            "div",
            element(
                "div",
                id="view",
                tabindex="0",
                role="img",
                aria_label="Molecule in three dimensions",
                aria_describedby="keys",
            ),
            element("img", id="view-still", src="data:,", alt=""),
            class_="stage",
        ),
        element("div", hybrids, value, labels, reset, key, class_="controls"),
        element("p", keys, id="keys", class_="note needs-webgl"),
        element("p", "", id="why-still", class_="note"),
        element("div", id="carriers-here"),
        class_="viewer needs-script",
        id="viewer",
    )


def _downloads(report: BondReport, cubes: list[str]) -> Markup:
    buttons = [
        element(
            "li", element("button", name, type="button", data_file=name), ": values on a grid", class_="needs-script"
        )
        for name in cubes
    ]
    return section("downloads", "Downloads", element("ul", file_links(report), buttons, class_="files"))
