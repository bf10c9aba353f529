"""Sections of a page on studies beside the report: a scan, and the cross-check."""

from __future__ import annotations

from ehmo.records.crosscheck import Crosscheck
from ehmo.records.scan import Scan
from ehmo.report.crosscheck_text import (
    READING,
    THEORY_NAMES,
    channel_comparison_rows,
    charge_comparison_rows,
    comparison_rows,
    run_in_words,
    verdict_sentences,
)
from ehmo.report.figures.scan import scan_figure
from ehmo.report.page.drawings import FIGURE_CM, figure_block
from ehmo.report.page.markup import Content, Markup, element
from ehmo.report.page.sections import listed, numbers_table, paragraphs, section


def crosscheck_section(found: Crosscheck) -> Markup:
    """Verdict on each bond, and both sides in tables."""
    name = THEORY_NAMES[found.run.theory]
    return section(
        "crosscheck",
        "Cross-check",
        paragraphs([run_in_words(found)], "note"),
        element("div", paragraphs(verdict_sentences(found)), class_="finding"),
        numbers_table(comparison_rows(found), f"Bonds: ehmo beside {name}", range(2, 9)),
        numbers_table(channel_comparison_rows(found), f"Channels and their weights: ehmo beside {name}", ()),
        numbers_table(charge_comparison_rows(found), "Mulliken charges of metals and donors", range(1, 5)),
        listed([*found.run.doubts, *READING]),
    )


def scan_section(scan: Scan) -> Markup:
    """Figure of a scan, and what it says in words."""
    named = "-".join(scan.labels[atom] for atom in scan.plan.atoms)
    words = f"Scan of the {scan.plan.coordinate} {named}: channels, levels and energy against it."
    parts: list[Content] = [
        figure_block(scan_figure(scan, width_cm=FIGURE_CM), "scan", words, f"{words} {len(scan.points)} points."),
    ]
    for heading, sentences in (
        ("Crossings", scan.crossings),
        ("Withheld", scan.withheld),
        ("Assumed", scan.plan.notes),
    ):
        if sentences:
            parts += [element("h3", heading), listed(sentences)]
    return section("scan", "Scan", parts)
