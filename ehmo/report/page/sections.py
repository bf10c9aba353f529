"""Sections of a page that hold words and tables."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence

from ehmo.records.report import BondReport
from ehmo.records.wording import BOND_NUMBERS, bond_rows, channels_in_words
from ehmo.report.cautions import CAUTIONS
from ehmo.report.figures.ladder import ladder_figure
from ehmo.report.figures.spectrum import spectrum_figure
from ehmo.report.ladder_text import (
    BAND_NUMBERS,
    LADDER_NUMBERS,
    TERM_NUMBERS,
    band_rows,
    bands_heading,
    constants_in_words,
    ladder_heading,
    ladder_rows,
    magnetism_sentences,
    parameter_sentences,
    spectrum_in_words,
    term_rows,
    withheld_reasons,
)
from ehmo.report.method import MethodParagraph
from ehmo.report.page.drawings import FIGURE_CM, figure_block
from ehmo.report.page.formulas import symbols_markup
from ehmo.report.page.markup import Content, Markup, element, markup, table
from ehmo.report.page.shown import orbital_key
from ehmo.report.page.view import PICTURE_PX
from ehmo.report.spread_text import draws_in_words, effect_rows
from ehmo.report.text import (
    ORBITAL_NUMBERS,
    axes_in_words,
    charge_rows,
    multiple_bonds_in_words,
    orbital_rows,
    site_in_words,
)

_NEGATIVE = re.compile(r"(?<![\w.])-(?=\d)")
_INVERSE = re.compile(r"\bcm-1\b")


def section(identity: str, title: Content, *content: Content) -> Markup:
    """Section with its heading."""
    return element(
        "section",
        element("h2", title, id=f"{identity}-title"),
        content,
        id=identity,
        aria_labelledby=f"{identity}-title",
    )


def typographic(text: str) -> str:
    """Text with true minus signs before numbers, and the inverse centimetre.

    Examples
    --------
    >>> typographic("-1.5 eV, 13000 cm-1, O2-V1")
    '−1.5 eV, 13000 cm⁻¹, O2-V1'
    """
    return _INVERSE.sub("cm⁻¹", _NEGATIVE.sub("\N{MINUS SIGN}", text))


def numbers_table(rows: Sequence[Sequence[str]], caption: Content, numeric: Iterable[int]) -> Markup:
    """Table of a report's cells."""
    head, *body = rows
    cells = [[symbols_markup(typographic(cell)) for cell in row] for row in body]
    return table([[typographic(cell) for cell in head], *cells], caption, numeric)


def paragraphs(sentences: Iterable[str], style: str | None = None) -> Markup:
    """One paragraph for each sentence."""
    return markup([element("p", typographic(sentence), class_=style) for sentence in sentences])


def listed(sentences: Iterable[str], style: str | None = None) -> Markup:
    """One entry for each sentence."""
    return element("ul", [element("li", typographic(sentence)) for sentence in sentences], class_=style)


def words_section(report: BondReport) -> Markup:
    """Summary in words: metals, multiple bonds, the other bonds, spectrum, and how much there is to doubt."""
    said, notes = multiple_bonds_in_words(report)
    parts: list[Content] = [paragraphs(site_in_words(report, site) for site in report.distinct_sites())]
    parts.append(element("div", paragraphs(_joined(said)), class_="finding") if said else None)
    others = other_bonds_in_words(report)
    parts.append(paragraphs(others) if others else None)
    spectrum = spectrum_in_words(report)
    parts.append(element("p", symbols_markup(typographic(spectrum))) if spectrum else None)
    count = len(report.warnings)
    if count:
        link = element("a", f"{count} {'point' if count == 1 else 'points'} to doubt", href="#doubts")
        parts.append(element("p", "Before you rely on it: ", link, "."))
    parts.append(element("details", element("summary", "How to read this"), paragraphs(notes)) if notes else None)
    return section("words", "In words", parts)


def _joined(sentences: Iterable[str]) -> list[str]:
    """Sentences that say the same of several bonds made one."""
    bonds: dict[str, list[str]] = {}
    for sentence in sentences:
        bond, _, rest = sentence.partition(": ")
        bonds.setdefault(rest, []).append(bond)
    return [f"{', '.join(labels)}: {rest}" for rest, labels in bonds.items()]


def other_bonds_in_words(report: BondReport) -> list[str]:
    """One sentence for each kind of bond that is single by counting."""
    groups: dict[tuple[int, str], list[int]] = {}
    for place in report.distinct_bonds():
        bond, formal = report.coordination.bonds[place], report.formal_orders[place]
        if not bond.may_be_multiple and (formal is None or formal.order == 1):
            groups.setdefault((bond.metal, str(bond.kind)), []).append(place)
    sentences = []
    for (metal, kind), places in groups.items():
        lengths = [report.coordination.bonds[k].length_A for k in places]
        mayer = [report.orders[k].mayer for k in places]
        words = dict.fromkeys(channels_in_words(report.orders[k].channels) for k in places)
        many = f"{len(places)} {kind} bonds of" if len(places) > 1 else f"One {kind} bond of"
        sentences.append(
            f"{many} {report.fragment.labels[metal]}: {_range(lengths, 3)} Å, Mayer {_range(mayer, 2)}, "
            f"{' or '.join(words)} by calculation"
        )
    return sentences


def _range(values: Sequence[float], digits: int) -> str:
    low, high = f"{min(values):.{digits}f}", f"{max(values):.{digits}f}"
    return low if low == high else f"{low} to {high}"


def bond_table(report: BondReport) -> Markup:
    """The bonds as a table."""
    places = report.distinct_bonds()
    rows = bond_rows(
        [report.coordination.bonds[k] for k in places],
        [report.orders[k] for k in places],
        [report.formal_orders[k] for k in places],
        report.fragment.labels,
        None if report.spread is None else [report.spread.bonds[k] for k in places],
    )
    return numbers_table(rows, "Bonds: orders, and weights of the channels", BOND_NUMBERS)


def charges_section(report: BondReport) -> Markup:
    """Mulliken charges."""
    caption = "Mulliken charges; positive is electron poor, and no charge is an oxidation state"
    return section("charges", "Charges", numbers_table(charge_rows(report), caption, (1, 2)))


def orbitals_section(report: BondReport, shown: Sequence[int], pictures: Mapping[str, str]) -> Markup:
    """Every orbital that can be shown, with its picture, and their table."""
    rows = orbital_rows(report, list(reversed(shown)))
    head, *body = rows
    plates = [_plate(k, row, pictures) for k, row in zip(reversed(shown), body, strict=True)]
    caption = (
        "Orbitals, topmost first; overlap population with all donors for two electrons, positive is bonding; "
        "irreps of the idealised sphere"
    )
    return section(
        "orbitals",
        "Orbitals",
        paragraphs(axes_in_words(report), "note"),
        element("div", plates, class_="plates"),
        element(
            "details",
            element("summary", "Table of these orbitals"),
            numbers_table([head, *body], caption, ORBITAL_NUMBERS),
        ),
    )


def _plate(orbital: int, row: Sequence[str], pictures: Mapping[str, str]) -> Markup:
    """Picture of an orbital with what its row in the table says first."""
    key, number = orbital_key(orbital), orbital + 1
    still = element(
        "img",
        src=pictures[key],
        alt=f"Orbital {number}: {row[8]}",
        width=PICTURE_PX,
        height=PICTURE_PX,
        id=f"still-{key}",
    )
    electrons = "empty" if row[3] == "0" else f"{row[3]} e"
    name = [element("b", row[0]), " ", symbols_markup(row[1])]
    show = element(
        "button", "Show", type="button", class_="needs-script", data_orbital=orbital, aria_pressed="false",
        aria_label=f"Show orbital {number}",
    )  # fmt: skip
    lines = [name, element("br"), typographic(f"{row[2]} eV"), element("br"), electrons]
    return element("figure", still, element("figcaption", lines), show, class_="plate")


def ladder_section(report: BondReport) -> Markup | None:
    """Levels of each metal with the ligand-field parameters they give, and what is withheld."""
    parts: list[Content] = []
    for site in report.distinct_sites():
        if site.ladder is not None:
            parts.append(numbers_table(ladder_rows(report, site), ladder_heading(report, site), LADDER_NUMBERS))
            label = report.fragment.labels[site.metal]
            figure = ladder_figure(report, site.metal, width_cm=FIGURE_CM)
            words = f"Ladder of {label} with its electrons, metal shares and terms; the tables say the same."
            parts.append(figure_block(figure, f"ladder-{site.metal}", words, f"Levels of {label} and terms"))
            if site.parameters is not None:
                parts.append(listed(parameter_sentences(site.parameters)))
    reasons = withheld_reasons(report)
    if reasons:
        parts += [element("h3", "Withheld"), listed(reasons)]
    return section("ladder", "Ladder", parts) if parts else None


def spectrum_section(report: BondReport) -> Markup | None:
    """Terms, bands and magnetism."""
    spectrum = report.spectroscopy
    parts: list[Content] = []
    if spectrum.constants is not None:
        parts.append(paragraphs([constants_in_words(spectrum.constants)], "note"))
    if spectrum.terms is not None:
        rows, rest = term_rows(spectrum.terms)
        more = f"; {rest} higher ones are in the JSON" if rest else ""
        parts.append(
            numbers_table(
                rows,
                symbols_markup(f"Terms in {spectrum.terms.group}, ground term {spectrum.ground_term}{more}"),
                TERM_NUMBERS,
            )
        )
    if spectrum.bands:
        spread = None if report.spread is None else report.spread.bands_per_cm
        rows, rest = band_rows(spectrum.bands, spread)
        more = f"; {rest} more are in the JSON" if rest else ""
        parts.append(numbers_table(rows, f"{bands_heading(spectrum.bands)}{more}", BAND_NUMBERS))
        words = "Computed bands as sticks with their envelope; the table says the same."
        parts.append(
            figure_block(
                spectrum_figure(report, width_cm=FIGURE_CM), "bands", words, "Computed bands and their envelope"
            )
        )
    if spectrum.magnetism is not None:
        parts += [element("h3", "Magnetism"), listed(magnetism_sentences(spectrum, spectrum.magnetism))]
    return section("spectrum", "Terms, bands, magnetism", parts) if parts else None


def spread_section(report: BondReport) -> Markup | None:
    """Draws behind the standard deviations and what moves the orders."""
    if report.spread is None:
        return None
    rows, sizes = effect_rows(report)
    parts: list[Content] = [paragraphs([f"± is one standard deviation: {draws_in_words(report.spread)}."])]
    if rows:
        head = ["bond", *(f"{k}. parameter" for k in range(1, len(rows[0])))]
        caption = "Change of the Mayer orders with one standard deviation of one parameter"
        parts += [numbers_table([head, *rows], caption, ()), paragraphs([sizes], "note")]
    return section("spread", "Spread", parts)


def trust_sections(assumptions: Sequence[str], warnings: Sequence[str]) -> Markup:
    """Assumptions, doubts and cautions."""
    doubts = warnings or ("Nothing in particular, beyond the cautions below.",)
    return markup(
        [
            section("assumptions", "Assumed", listed(assumptions)),
            section("doubts", "To doubt", listed(doubts, "doubts")),
            section("cautions", "Cautions", listed(CAUTIONS)),
        ]
    )


def method_section(paragraph: MethodParagraph) -> Markup:
    """Method paragraph with its citations, to be copied."""
    return section(
        "method",
        "Method",
        element(
            "div",
            element("p", paragraph.text),
            element("ol", [element("li", line) for line in paragraph.citations], class_="citations"),
            id="method-text",
        ),
        element("button", "Copy method and citations", type="button", id="copy-method", class_="needs-script"),
        element("span", "", id="copied", role="status"),
    )
