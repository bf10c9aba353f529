"""The page of a store: one HTML file without scripts."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from typing import Final

from ehmo import __version__
from ehmo.records.arrays import FloatArray
from ehmo.records.store_summary import Distribution, KindSummary, Outlier, StoreSummary, Trend
from ehmo.report.cautions import CAUTIONS
from ehmo.report.page.frame import colours, own_file
from ehmo.report.page.markup import Content, Markup, content_hash, element, markup, table
from ehmo.report.page.scatter import MARKS, KindPoints, Limits, mark_sample, scatter_drawing
from ehmo.report.summary_text import counted, outlier_rule

MOST_METALS: Final = 24
MOST_NUMBERED: Final = 40
MOST_REASONS: Final = 50
"""Metals drawn, outliers numbered and reasons listed; the page says what it leaves out."""

Points = tuple[str, str, FloatArray, FloatArray]


def store_page(summary: StoreSummary, points: Iterable[Points]) -> str:
    """Page of a store.

    Parameters
    ----------
    summary : StoreSummary
    points : iterable of (metal, kind, lengths, orders)
        Bonds to draw, as `ehmo.store.distributions.bond_points` gives them.

    Returns
    -------
    html : str
        A whole document that asks for nothing else, and whose policy forbids it to.
    """
    numbered = dict(enumerate(summary.outliers[:MOST_NUMBERED], start=1))
    parts = {
        "orders": ("Orders by metal and donor", _orders(summary)),
        "lengths": ("Order against length", _drawings(summary, list(points), numbered)),
        "outliers": ("Outliers", _outliers(summary, numbered)),
        "failures": ("Failures", _failures(summary)),
        "calculations": ("Calculations", _calculations(summary)),
        "cautions": ("Cautions", element("ul", [element("li", caution) for caution in CAUTIONS])),
    }
    shown = {name: part for name, part in parts.items() if part[1] is not None}
    sections = [
        element("section", element("h2", title, id=f"{name}-head"), content, id=name, aria_labelledby=f"{name}-head")
        for name, (title, content) in shown.items()
    ]
    links = {name: title for name, (title, _) in shown.items()}
    return _document(summary, markup([_top(summary, links), element("main", sections)]))


def _document(summary: StoreSummary, body: Markup) -> str:
    style = f"{colours()}\n{own_file('page.css')}\n{own_file('store.css')}"
    policy = f"default-src 'none'; style-src {content_hash(style)}; base-uri 'none'; form-action 'none'"
    head = element(
        "head",
        element("meta", charset="utf-8"),
        element("meta", http_equiv="Content-Security-Policy", content=policy),
        element("meta", name="viewport", content="width=device-width, initial-scale=1"),
        element("meta", name="referrer", content="no-referrer"),
        element("meta", name="generator", content=f"ehmo {__version__}"),
        element("title", f"{summary.store}: bonds of a store"),
        element("style", Markup(style)),
    )
    whole = element(
        "body",
        element("a", "To the orders", href="#orders", class_="skip"),
        body,
        element("footer", f"ehmo {__version__}; this page holds all its parts and loads nothing."),
    )
    return f"<!DOCTYPE html>\n{element('html', head, whole, lang='en')}\n"


def _top(summary: StoreSummary, links: Mapping[str, str]) -> Markup:
    bonds = sum(kind.bonds for kind in summary.kinds)
    return element(
        "header",
        element("p", "Metal-donor bonds by extended Hückel theory", class_="kind"),
        element("h1", summary.store),
        element(
            "p",
            f"{counted(summary.done, 'structure')} done, {summary.failed:,} failed; "
            f"{counted(bonds, 'metal-donor bond')}",
            class_="state",
        ),
        element("p", f"Where {summary.where}", class_="origin") if summary.where is not None else None,
        element("p", f"{counted(summary.doubted, 'structure')} with something to doubt", class_="origin")
        if summary.doubted
        else None,
        element(
            "nav",
            element("ul", [element("li", element("a", words, href=f"#{name}")) for name, words in links.items()]),
            aria_label="Sections",
        ),
        class_="top",
    )


def _orders(summary: StoreSummary) -> Content:
    if not summary.kinds:
        return element("p", "No structure is done, so there are no bonds.")
    rows: list[list[Content]] = [
        ["Metal", "Donor", "Bonds", "Lowest", "Quartile", "Median", "Quartile", "Highest", "Length/Å", "b/Å"],
        *map(_order_row, summary.kinds),
    ]
    caption = "Mayer bond orders, median length, and b of their fall as exp(\N{MINUS SIGN}length/b)"
    return table(rows, caption, range(2, 10))


def _order_row(kind: KindSummary) -> list[Content]:
    mayer, length = kind.distributions.get("mayer"), kind.distributions.get("length_A")
    fall = None if kind.trend is None else kind.trend.b_A
    return [
        kind.metal,
        kind.kind,
        f"{kind.bonds:,}",
        *([""] * 5 if mayer is None else [_number(value, 2) for value in _five(mayer)]),
        "" if length is None else _number(length.median, 3),
        "" if fall is None else _number(fall, 2),
    ]


def _five(found: Distribution) -> tuple[float, ...]:
    return found.lowest, found.lower_quartile, found.median, found.upper_quartile, found.highest


def _number(value: float, digits: int) -> str:
    return f"{value:.{digits}f}".replace("-", "\N{MINUS SIGN}")


def _drawings(summary: StoreSummary, points: Sequence[Points], numbered: Mapping[int, Outlier]) -> Content:
    points = [one for one in points if len(one[2])]
    if not points:
        return None
    sizes, metals = Counter[str](), Counter[str]()
    for metal, kind, lengths, _ in points:
        sizes[kind] += len(lengths)
        metals[metal] += len(lengths)
    marks = {kind: min(place, len(MARKS) - 1) for place, (kind, _) in enumerate(sizes.most_common())}
    trends = {(one.metal, one.kind): one.trend for one in summary.kinds}
    drawn = [metal for metal, _ in metals.most_common(MOST_METALS)]
    kinds = {metal: [_points(one, marks, trends) for one in points if one[0] == metal] for metal in drawn}
    limits = Limits.around([kind for some in kinds.values() for kind in some])
    panels = []
    for metal, some in kinds.items():
        own = {number: one for number, one in numbered.items() if one.metal == metal}
        head = element("h3", f"{metal}, {counted(metals[metal], 'bond')}")
        panels.append(element("figure", head, scatter_drawing(metal, some, limits, own), class_="panel"))
    left = len(metals) - len(drawn)
    return [
        element(
            "p",
            "Ringed bonds are the outliers of the table below. Dashed: the line of a metal and kind, "
            "over whatever compounds the store holds.",
        ),
        element("ul", list(_key(marks)), class_="kinds"),
        element("div", panels, class_="panels"),
        element("p", f"{counted(left, 'further metal')} with fewer bonds not drawn.", class_="note") if left else None,
    ]


def _points(one: Points, marks: Mapping[str, int], trends: Mapping[tuple[str, str], Trend | None]) -> KindPoints:
    metal, kind, lengths, orders = one
    return KindPoints(kind, marks[kind], lengths, orders, trends.get((metal, kind)))


def _key(marks: Mapping[str, int]) -> Iterable[Markup]:
    """Kinds with a mark of their own, then the rest together."""
    last = len(MARKS) - 1
    for kind, mark in marks.items():
        if mark < last:
            yield element("li", mark_sample(mark), kind)
    rest = [kind for kind, mark in marks.items() if mark == last]
    if rest:
        yield element("li", mark_sample(last), ", ".join(rest))


def _outliers(summary: StoreSummary, numbered: Mapping[int, Outlier]) -> Content:
    if not summary.kinds:
        return None
    rule = element("p", f"{summary.outliers_found:,}: {outlier_rule()}." if numbered else f"None: {outlier_rule()}.")
    if not numbered:
        return rule
    heads = ("", "Bond", "Donor", "Length/Å", "Far out", "Value", "Expected", "Structure")
    head = element("tr", [element("th", name, scope="col") for name in heads])
    body = [element("tr", list(_outlier_cells(n, one)), id=f"outlier-{n}") for n, one in numbered.items()]
    left = summary.outliers_found - len(numbered)
    return [
        rule,
        element("div", element("table", element("thead", head), element("tbody", body)), class_="table"),
        element("p", f"{left:,} nearer ones are in the JSON of ehmo summary.", class_="note") if left else None,
    ]


def _outlier_cells(number: int, one: Outlier) -> Iterable[Markup]:
    digits = 3 if one.quantity == "length_A" else 2
    yield element("th", str(number), scope="row", class_="number")
    yield element("td", one.bond)
    yield element("td", one.kind)
    yield element("td", _number(one.length_A, 3), class_="number")
    yield element("td", "length" if one.quantity == "length_A" else "Mayer order")
    yield element("td", _number(one.value, digits), class_="number")
    yield element("td", _number(one.expected, digits), class_="number")
    yield element("td", f"{one.source}, {one.entry}" if one.entry else one.source, class_="name")


def _failures(summary: StoreSummary) -> Content:
    if not summary.failed:
        return None
    rows: list[list[Content]] = [["Structures", "Reason", "First of them"]]
    rows += [[f"{one.count:,}", one.reason, one.message] for one in summary.reasons[:MOST_REASONS]]
    left = sum(one.count for one in summary.reasons[MOST_REASONS:]) + summary.other_failures
    return [
        table(rows, "Failures by reason; # stands for numbers", (0,), row_heads=False),
        element("p", f"{left:,} for other reasons.", class_="note") if left else None,
    ]


def _calculations(summary: StoreSummary) -> Content:
    if not summary.calculations:
        return None
    rows: list[list[Content]] = [["Parameter set", "Hash", "Program", "Results edition", "Rows"]]
    rows += [
        [
            made.parameter_set,
            made.parameter_sha256[:12],
            f"ehmo {made.program_version}",
            str(made.results_edition),
            f"{made.rows:,}",
        ]
        for made in summary.calculations
    ]
    when = f"Started {summary.first_started_utc} to {summary.last_started_utc}; {summary.duration_s:,.1f} s in all."
    return [table(rows, "What made the rows", (3, 4)), element("p", when)]
