"""The bonds of some reports as a table for a paper: LaTeX, Markdown or CSV."""

from __future__ import annotations

import csv
import io
import math
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass
from fractions import Fraction
from pathlib import PurePath
from typing import Final

from ehmo import __version__
from ehmo.conventions import BOND_SYMMETRIES
from ehmo.errors import visible
from ehmo.records.bonding import BondOrders
from ehmo.records.crystal_report import CrystalReport
from ehmo.records.report import BondReport, Method
from ehmo.records.spread import BondSpread
from ehmo.records.wording import signed
from ehmo.report.escaping import latex_text, markdown_text
from ehmo.report.formula import complex_formula
from ehmo.report.scan_document import inert

TABLE_FORMATS: Final = ("latex", "markdown", "csv")

_ORDERS = 3  # overlap population, Mayer, Wiberg
_SEEN = 0.005  # weight from which a delta or phi channel gets a column


@dataclass(frozen=True, slots=True)
class TableRow:
    """One distinct bond.

    Attributes
    ----------
    structure, bond, kind : str
        Structure, label and kind of donor (hostile text: each format escapes it).
    count : int
        Equivalent bonds at the metal, this one included; 0 where that is not said.
    length_A : float
    values, deviations : tuple of float
        Overlap population [e], Mayer and Wiberg order, and the sums of the channel weights by symmetry; and their
        standard deviations, NaN where there are none.
    formal : Fraction or None
        Bond order by textbook counting; None where it is not told.
    """

    structure: str
    bond: str
    kind: str
    count: int
    length_A: float
    values: tuple[float, ...]
    deviations: tuple[float, ...]
    formal: Fraction | None


def table_rows(reports: Iterable[BondReport | CrystalReport]) -> list[TableRow]:
    """Rows of the distinct bonds of some reports.

    Parameters
    ----------
    reports : iterable of BondReport or CrystalReport

    Returns
    -------
    rows : list of TableRow
    """
    rows: list[TableRow] = []
    for report in reports:
        rows += _crystal_rows(report) if isinstance(report, CrystalReport) else _molecule_rows(report)
    return rows


def _molecule_rows(report: BondReport) -> list[TableRow]:
    crystal, rows = report.fragment.crystal, []
    name = structure_name(report)
    for place in report.distinct_bonds():
        bond, orders, formal = report.coordination.bonds[place], report.orders[place], report.formal_orders[place]
        own = None if report.spread is None else report.spread.bonds[place]
        count = 0 if crystal is None else crystal.bonds_per_metal(bond.metal, bond.donor)
        rows.append(
            TableRow(
                name,
                report.bond_label(bond),
                str(bond.kind),
                count,
                bond.length_A,
                _values(orders),
                _deviations(orders, own),
                None if formal is None else formal.order,
            )
        )
    return rows


def _crystal_rows(report: CrystalReport) -> list[TableRow]:
    name = report.networks[0] if report.networks else report.formula
    return [
        TableRow(
            name,
            f"{unit.metal}-{unit.donor}",
            str(unit.kind),
            unit.per_metal,
            unit.length_A,
            _values(orders),
            (math.nan,) * (_ORDERS + len(BOND_SYMMETRIES)),
            None,
        )
        for unit, orders in report.bonds()
    ]


def structure_name(report: BondReport) -> str:
    """Formula with its charge, and the file where it comes from one."""
    formula, charge = complex_formula(report), report.fragment.charge
    name = formula if not charge else f"[{formula}]{_charge(charge)}"
    source = PurePath(report.fragment.source).name
    return f"{name} ({source})" if source else name


def _charge(charge: int) -> str:
    size = "" if abs(charge) == 1 else str(abs(charge))
    return f"{size}{signed(charge)[0]}"


def _values(orders: BondOrders) -> tuple[float, ...]:
    kinds = orders.channel_shares.argmax(axis=1)
    weights = (float(orders.channel_weights[kinds == k].sum()) for k in range(len(BOND_SYMMETRIES)))
    return (orders.overlap_population, orders.mayer, orders.wiberg, *weights)


def _deviations(orders: BondOrders, own: BondSpread | None) -> tuple[float, ...]:
    """Standard deviations; those of sums of channels are not told by those of the channels."""
    if own is None:
        return (math.nan,) * (_ORDERS + len(BOND_SYMMETRIES))
    kinds = orders.channel_shares.argmax(axis=1)
    single = []
    for k in range(len(BOND_SYMMETRIES)):
        members = [sd for sd, kind in zip(own.channel_weights, kinds, strict=False) if kind == k]
        single.append(members[0] if len(members) == 1 else math.nan)
    return (own.overlap_population, own.mayer, own.wiberg, *single)


def bond_table(reports: Sequence[BondReport | CrystalReport], form: str) -> str:
    """Table of the bonds of some reports.

    Parameters
    ----------
    reports : sequence of BondReport or CrystalReport
        At least one.
    form : {"latex", "markdown", "csv"}

    Returns
    -------
    text : str
        A whole LaTeX table (booktabs), a Markdown table, or CSV with a heading. Text from files is escaped for the
        format, and in CSV a cell that a spreadsheet might take for a formula begins with an apostrophe.
    """
    writers: dict[str, Callable[[list[TableRow], Method], str]] = {"latex": _latex, "markdown": _markdown, "csv": _csv}
    return writers[form](table_rows(reports), reports[0].method)


def _used(rows: Sequence[TableRow]) -> list[int]:
    """Places in `TableRow.values` that some bond has; orders, sigma and pi always."""
    places = range(_ORDERS + len(BOND_SYMMETRIES))
    return [k for k in places if k < _ORDERS + 2 or any(row.values[k] >= _SEEN for row in rows)]


def _headings(rows: Sequence[TableRow], words: Sequence[str]) -> list[str]:
    several, counted = _several(rows), any(row.count for row in rows)
    found = [words[0]] if several else []
    found += [words[1], words[2]]
    found += ["n"] if counted else []
    return [*found, words[3], *(words[4 + k] for k in _used(rows)), *(["formal"] if _counted(rows) else [])]


def _counted(rows: Sequence[TableRow]) -> bool:
    """Whether textbook counting told the order of some bond."""
    return any(row.formal is not None for row in rows)


def _several(rows: Sequence[TableRow]) -> bool:
    return len({row.structure for row in rows}) > 1


def _cells(
    rows: Sequence[TableRow], row: TableRow, text: Callable[[str], str], pair: Callable[[str, str], str]
) -> list[str]:
    """Cells of a row; `text` escapes, `pair` sets a number with its deviation."""
    found = [text(row.structure)] if _several(rows) else []
    found += [text(row.bond), text(row.kind)]
    found += [str(row.count)] if any(one.count for one in rows) else []
    found.append(f"{row.length_A:.3f}")
    for k in _used(rows):
        deviation = row.deviations[k]
        found.append(pair(f"{row.values[k]:z.2f}", "" if math.isnan(deviation) else f"{deviation:.2f}"))
    formal = "?" if row.formal is None else str(row.formal)
    return [*found, *([formal] if _counted(rows) else [])]


def _method_words(method: Method) -> str:
    return f"ehmo {__version__}, parameter set {visible(method.parameter_set)}, {method.charge_model} charges"


def _latex(rows: list[TableRow], method: Method) -> str:
    def pair(value: str, deviation: str) -> str:
        return f"${value} \\pm {deviation}$" if deviation else f"${value}$"

    symbols = [rf"$\{name}$" for name in BOND_SYMMETRIES]
    words = ["structure", "bond", "donor", r"length/\AA{}", "overlap pop.", "Mayer", "Wiberg", *symbols]
    heading = _headings(rows, words)
    text_columns = 2 + _several(rows)
    names = list(dict.fromkeys(row.structure for row in rows))
    caption = f"Metal-donor bonds of {names[0]}" if len(names) == 1 else "Metal-donor bonds"
    lines = [
        r"% needs \usepackage{booktabs}",
        r"\begin{table}",
        rf"\caption{{{latex_text(caption)}. Overlap populations (e), bond orders and weights of the channels; "
        rf"{latex_text(_method_words(method))}.}}",
        rf"\begin{{tabular}}{{{'l' * text_columns}{'r' * (len(heading) - text_columns)}}}",
        r"\toprule",
        " & ".join(heading) + r" \\",
        r"\midrule",
        *(" & ".join(_cells(rows, row, latex_text, pair)) + r" \\" for row in rows),
        r"\bottomrule",
        r"\end{tabular}",
        r"\end{table}",
    ]
    return "\n".join(lines) + "\n"


def _markdown(rows: list[TableRow], method: Method) -> str:
    def pair(value: str, deviation: str) -> str:
        return f"{value} ± {deviation}" if deviation else value

    words = ["structure", "bond", "donor", "length/Å", "overlap pop./e", "Mayer", "Wiberg", *"σπδφ"]
    heading = _headings(rows, words)
    text_columns = 2 + _several(rows)
    lines = [
        "| " + " | ".join(heading) + " |",
        "| " + " | ".join([":---"] * text_columns + ["---:"] * (len(heading) - text_columns)) + " |",
        *("| " + " | ".join(_cells(rows, row, markdown_text, pair)) + " |" for row in rows),
        "",
        f"{markdown_text(_method_words(method))}.",
    ]
    return "\n".join(lines) + "\n"


CSV_COLUMNS: Final = (
    *("structure", "bond", "kind", "equal_at_metal", "length_A", "overlap_population", "mayer", "wiberg"),
    *(f"{symmetry}_weight" for symmetry in BOND_SYMMETRIES),
    "formal_order",
    *("overlap_population_sd", "mayer_sd", "wiberg_sd"),
)
"""Heading of the CSV table; standard deviations are empty without a spread."""


def _csv(rows: list[TableRow], _: Method) -> str:
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(CSV_COLUMNS)
    for row in rows:
        numbers = [f"{round(value, 9):.6g}" for value in (row.length_A, *row.values)]
        deviations = ["" if math.isnan(value) else f"{value:.6g}" for value in row.deviations[:3]]
        formal = "" if row.formal is None else f"{float(row.formal):.6g}"
        texts = [inert(visible(text)) for text in (row.structure, row.bond, row.kind)]
        writer.writerow([*texts, row.count or "", *numbers, formal, *deviations])
    return out.getvalue()
