"""The page: one HTML file with words, bonds, views, tables and downloads."""

from __future__ import annotations

from collections.abc import Sequence

from basis_params import ParameterTable
from ehmo.records.crosscheck import Crosscheck
from ehmo.records.report import BondReport
from ehmo.records.scan import Scan
from ehmo.records.wording import electrons_in_words
from ehmo.report.method import MethodParagraph, method_paragraph
from ehmo.report.page.bonds import bond_entries, first_channel
from ehmo.report.page.diagram import diagram_figure
from ehmo.report.page.downloads import cube_orbitals, file_links, packed_cubes
from ehmo.report.page.formulas import formula_markup, formula_plain
from ehmo.report.page.frame import document, plotting_library
from ehmo.report.page.markup import Content, Markup, element, embedded_json, markup
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
from ehmo.report.page.shown import shown_channels, shown_orbitals
from ehmo.report.page.studies import crosscheck_section, scan_section
from ehmo.report.page.view import page_view
from ehmo.report.page.viewer import viewer

Named = tuple[str, str, Markup | None]
"""Section with its name in the page and its words in the list of sections; None where there is nothing to say."""


def bond_page(
    report: BondReport, table: ParameterTable, *, crosscheck: Crosscheck | None = None, scan: Scan | None = None
) -> str:
    """Page of a bond report.

    Parameters
    ----------
    report : BondReport
    table : ParameterTable
        The parameter set it was made with.
    crosscheck : Crosscheck, optional
        The same report beside a minimal-basis run.
    scan : Scan, optional
        Of the same atoms.

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
    first = first_channel(report, channels)
    diagram = diagram_figure(report, orbitals, None if first is None else first.bond)
    bench = element(
        "div",
        element("div", bond_entries(report, channels, view.pictures), class_="entries"),
        viewer(),
        class_="bench",
    )
    hint = "Choose a channel to see its two hybrids and the levels that carry it."
    folded = element("details", element("summary", "Table of the bonds"), bond_table(report))
    bonds = section("bonds", "Bonds", element("p", hint, class_="note needs-script"), bench, folded)
    sections: list[Named] = [
        ("words", "In words", words_section(report)),
        ("bonds", "Bonds", bonds),
        ("diagram", "Interaction diagram", section("diagram", "Interaction diagram", diagram)),
        ("orbitals", "Orbitals", orbitals_section(report, orbitals, view.pictures)),
        ("charges", "Charges", charges_section(report)),
        ("ladder", "Ladder", ladder_section(report)),
        ("spectrum", "Spectrum", spectrum_section(report)),
        ("scan", "Scan", None if scan is None else scan_section(scan)),
        ("crosscheck", "Cross-check", None if crosscheck is None else crosscheck_section(crosscheck)),
        ("spread", "Spread", spread_section(report)),
        ("doubts", "To doubt", trust_sections(report.assumptions, report.warnings)),
        ("method", "Method", method_section(method)),
        ("downloads", "Downloads", _downloads(report, list(cubes))),
    ]
    fragment = report.fragment
    top = page_top(
        "Metal-donor bonds by extended Hückel theory",
        formula_markup(report),
        electrons_in_words(fragment),
        (fragment.source or "a fragment", fragment.title),
        sections,
    )
    data = {**view.data, "files": cubes}
    return document(f"{formula_plain(report)}: bond report", page_body(top, sections, method), data, library)


def page_body(top: Markup, sections: Sequence[Named], method: MethodParagraph) -> Markup:
    """Heading, sections, and the method as plain text for the button that copies it."""
    plain = element("script", embedded_json(str(method)), type="application/json", id="method-plain")
    return markup([top, element("main", [part for _, _, part in sections]), plain])


def page_top(kind: str, name: Content, state: str, origin: tuple[str, str], sections: Sequence[Named]) -> Markup:
    """Heading of a page with the list of its sections.

    Parameters
    ----------
    kind : str
        What is reported.
    name : Content
        Formula.
    state : str
        Charge and spin, or what a crystal is.
    origin : tuple of (str, str)
        File and title, as found.
    sections : sequence of Named

    Returns
    -------
    html : Markup
    """
    source, title = origin
    said: list[Content] = [f"From {source}"]
    if title:
        said.append(f", titled \N{LEFT DOUBLE QUOTATION MARK}{title}\N{RIGHT DOUBLE QUOTATION MARK}")
    links = [
        element("li", element("a", words, href=f"#{identity}"))
        for identity, words, part in sections
        if part is not None
    ]
    return element(
        "header",
        element("p", kind, class_="kind"),
        element("h1", name),
        element("p", typographic(state), class_="state"),
        element("p", said, class_="origin"),
        element("nav", element("ul", links), aria_label="Sections"),
        class_="top",
    )


def _downloads(report: BondReport, cubes: list[str]) -> Markup:
    buttons = [
        element(
            "li", element("button", name, type="button", data_file=name), ": values on a grid", class_="needs-script"
        )
        for name in cubes
    ]
    return section("downloads", "Downloads", element("ul", file_links(report), buttons, class_="files"))
