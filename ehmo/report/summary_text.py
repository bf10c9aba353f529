"""The summary of a store as text for a terminal."""

from __future__ import annotations

import textwrap

from ehmo.errors import visible
from ehmo.records.store_summary import KindSummary, Outlier, StoreSummary
from ehmo.records.table import aligned
from ehmo.report.cautions import CAUTIONS
from ehmo.store.distributions import FENCE, LEAST_BONDS

WIDTH = 100
REASONS_SHOWN = 10
OUTLIERS_SHOWN = 20
LONGEST_NAME = 60

_QUANTITY_WORDS = {"mayer": "Mayer order", "length_A": "length"}


def summary_text(summary: StoreSummary) -> str:
    """Summary as text.

    Parameters
    ----------
    summary : StoreSummary

    Returns
    -------
    text : str
        Control characters of sources and messages shown.
    """
    sections = [
        _heading(summary),
        _failures(summary),
        _orders(summary),
        _outliers(summary),
        ["Cautions", *(line for caution in CAUTIONS for line in _wrapped(caution))],
    ]
    return "\n\n".join("\n".join(section) for section in sections if section) + "\n"


def _heading(summary: StoreSummary) -> list[str]:
    bonds = sum(kind.bonds for kind in summary.kinds)
    lines = [visible(summary.store)]
    if summary.where is not None:
        lines += textwrap.wrap(f"Where {visible(summary.where)}", WIDTH, subsequent_indent="  ")
    lines.append(
        f"{counted(summary.done, 'structure')} done, {summary.failed:,} failed; {counted(bonds, 'metal-donor bond')}"
    )
    if summary.doubted:
        lines.append(f"{counted(summary.doubted, 'structure')} done with something to doubt (column warnings)")
    lines += [
        f"Set {visible(made.parameter_set)} ({visible(made.parameter_sha256[:12])}), "
        f"ehmo {visible(made.program_version)}, results edition {made.results_edition}: {counted(made.rows, 'row')}"
        for made in summary.calculations
    ]
    if summary.done + summary.failed:
        lines.append(
            f"Started {visible(summary.first_started_utc)} to {visible(summary.last_started_utc)}, "
            f"{summary.duration_s:,.1f} s in all"
        )
    return lines


def _failures(summary: StoreSummary) -> list[str]:
    if not summary.failed:
        return []
    lines = ["Failures by reason, with the first of each"]
    for reason in summary.reasons[:REASONS_SHOWN]:
        lines += textwrap.wrap(
            f"{reason.count:6,}  {visible(reason.reason)}", WIDTH, initial_indent="  ", subsequent_indent=" " * 10
        )
        lines += textwrap.wrap(
            visible(reason.message), WIDTH, initial_indent=" " * 10, subsequent_indent=" " * 10, max_lines=2
        )
    left = sum(reason.count for reason in summary.reasons[REASONS_SHOWN:]) + summary.other_failures
    if left:
        lines.append(f"  {left:6,}  for other reasons (--json lists them)")
    return lines


def _orders(summary: StoreSummary) -> list[str]:
    if not summary.kinds:
        return []
    heading = (
        "metal",
        "donor",
        "bonds",
        "lowest",
        "quartile",
        "median",
        "quartile",
        "highest",
        "length/Å",
        "b/Å",
    )
    rows = [heading, *map(_order_row, summary.kinds)]
    return [
        "Mayer bond orders by metal and kind of donor, median length, and b of their fall as exp(-length/b)",
        *aligned(rows, range(2, len(heading)), indent="  "),
    ]


def _order_row(kind: KindSummary) -> tuple[str, ...]:
    mayer, length = kind.distributions.get("mayer"), kind.distributions.get("length_A")
    numbers = (
        ("",) * 5
        if mayer is None
        else tuple(
            f"{number:.2f}"
            for number in (mayer.lowest, mayer.lower_quartile, mayer.median, mayer.upper_quartile, mayer.highest)
        )
    )
    return (
        visible(kind.metal),
        visible(kind.kind),
        f"{kind.bonds:,}",
        *numbers,
        "" if length is None else f"{length.median:.3f}",
        "" if kind.trend is None or kind.trend.b_A is None else f"{kind.trend.b_A:.2f}",
    )


def _outliers(summary: StoreSummary) -> list[str]:
    if not summary.kinds:
        return []
    rule = outlier_rule()
    if not summary.outliers:
        return _wrapped(f"Outliers: none ({rule})", "")
    rows: list[tuple[str, ...]] = [("bond", "donor", "length/Å", "far out", "value", "expected", "structure")]
    rows += [_outlier_row(one) for one in summary.outliers[:OUTLIERS_SHOWN]]
    lines = [*_wrapped(f"Outliers: {summary.outliers_found:,} ({rule})", ""), *aligned(rows, (2, 4, 5), indent="  ")]
    if summary.outliers_found > OUTLIERS_SHOWN:
        lines.append(f"  and {summary.outliers_found - OUTLIERS_SHOWN:,} nearer ones (--json lists them)")
    return lines


def outlier_rule() -> str:
    """What makes a bond an outlier."""
    return (
        f"length, or Mayer order less that of the line, more than {FENCE:g} interquartile ranges beyond the quartiles "
        f"of its metal and kind, where that has {LEAST_BONDS} bonds"
    )


def _outlier_row(one: Outlier) -> tuple[str, ...]:
    digits = 3 if one.quantity == "length_A" else 2
    name = visible(f"{one.source}, {one.entry}" if one.entry else one.source)
    return (
        visible(one.bond),
        visible(one.kind),
        f"{one.length_A:.3f}",
        _QUANTITY_WORDS[one.quantity],
        f"{one.value:.{digits}f}",
        f"{one.expected:.{digits}f}",
        name if len(name) <= LONGEST_NAME else f"...{name[3 - LONGEST_NAME :]}",
    )


def counted(count: int, thing: str) -> str:
    """Count with its thing in words, thousands set apart."""
    return f"{count:,} {thing}{'s' if count != 1 else ''}"


def _wrapped(text: str, indent: str = "  ") -> list[str]:
    return textwrap.wrap(text, WIDTH, initial_indent=indent, subsequent_indent=indent + "  ")
