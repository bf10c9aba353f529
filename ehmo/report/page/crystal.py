"""The page of an extended structure: words, bonds, bands, tables and downloads; no view of orbitals."""

from __future__ import annotations

from basis_params import ParameterTable
from ehmo.records.crystal_report import CrystalReport
from ehmo.report.bands_document import crystal_json
from ehmo.report.bands_text import (
    BOND_NUMBERS,
    CHARGE_NUMBERS,
    block_rows,
    crystal_bond_rows,
    crystal_charge_rows,
    kind_sentences,
    mesh_in_words,
    pi_bonds_in_words,
    state_in_words,
)
from ehmo.report.figures.crystal import band_figure
from ehmo.report.method import crystal_paragraph
from ehmo.report.page.downloads import links_to
from ehmo.report.page.drawings import figure_block
from ehmo.report.page.formulas import crystal_formula, hill_markup
from ehmo.report.page.frame import document
from ehmo.report.page.markup import Content, element
from ehmo.report.page.sections import (
    method_section,
    numbers_table,
    paragraphs,
    section,
    trust_sections,
)
from ehmo.report.page.whole import Named, page_body, page_top

_FIGURE_CM = 15.0


def crystal_page(report: CrystalReport, table: ParameterTable) -> str:
    """Page of a report on an extended structure.

    Parameters
    ----------
    report : CrystalReport
    table : ParameterTable
        The parameter set it was made with.

    Returns
    -------
    html : str
        A whole document that asks for nothing else, and whose policy forbids it to.
    """
    method = crystal_paragraph(report, table)
    words: list[Content] = [paragraphs(kind_sentences(report))]
    said = pi_bonds_in_words(report)
    if said:
        words += [
            element("p", "Bonds with pi channels, strongest first:"),
            element("div", paragraphs(said), class_="finding"),
        ]
    if report.warnings:
        count = f"{len(report.warnings)} {'point' if len(report.warnings) == 1 else 'points'} to doubt"
        words.append(element("p", "Before you rely on it: ", element("a", count, href="#doubts"), "."))
    alt = "Bands along the path, density of states and overlap population against energy; the tables say it in brief."
    zero = "Energies count from the highest filled level, or from the Fermi level of a metal."
    figure = figure_block(band_figure(report, width_cm=_FIGURE_CM), "bands", alt, zero)
    captions = (
        "Metal-donor bonds of the asymmetric unit (labels of the file)",
        "Bands, topmost first; overlap population with two electrons in each band, positive is bonding",
        "Mulliken charges; positive is electron poor, and no charge is an oxidation state",
    )
    mesh = mesh_in_words(report)
    blocks = numbers_table(block_rows(report), captions[1], range(5))
    sections: list[Named] = [
        ("words", "In words", section("words", "In words", words)),
        (
            "bonds",
            "Bonds",
            section("bonds", "Bonds", numbers_table(crystal_bond_rows(report), captions[0], BOND_NUMBERS)),
        ),
        ("bands", "Bands", section("bands", "Bands", figure, blocks, paragraphs([mesh], "note") if mesh else None)),
        (
            "charges",
            "Charges",
            section("charges", "Charges", numbers_table(crystal_charge_rows(report), captions[2], CHARGE_NUMBERS)),
        ),
        ("doubts", "To doubt", trust_sections(report.assumptions, report.warnings)),
        ("method", "Method", method_section(method)),
        ("downloads", "Downloads", section("downloads", "Downloads", element("ul", _links(report), class_="files"))),
    ]
    top = page_top(
        "An extended structure by extended Hückel theory",
        hill_markup(crystal_formula(report)),
        state_in_words(report).replace("\n", "; "),
        (report.source or "a crystal", report.title),
        sections,
    )
    return document(f"{crystal_formula(report)}: crystal report", page_body(top, sections, method))


def _links(report: CrystalReport) -> Content:
    text = crystal_json([report])
    return links_to(
        [
            (
                "JSON",
                "every level, density and overlap population",
                f"{crystal_formula(report)}.json",
                text,
                "application/json",
            )
        ]
    )
