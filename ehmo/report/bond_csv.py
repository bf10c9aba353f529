"""The bonds of a report as CSV."""

from __future__ import annotations

import csv
import io
import math

from ehmo.conventions import BOND_SYMMETRIES
from ehmo.records.report import BondReport

COLUMNS = (
    "bond",
    "kind",
    "length_A",
    "overlap_population",
    "mayer",
    "wiberg",
    "formal_order",
    *(f"{symmetry}_weight" for symmetry in BOND_SYMMETRIES),
)
"""Columns without spread; standard deviations follow where there are any."""


def bond_csv(report: BondReport) -> str:
    """One row for each distinct bond: orders, and the weight of its channels by symmetry.

    Parameters
    ----------
    report : BondReport

    Returns
    -------
    text : str
        All text in it is made here, none comes from a file.
    """
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    deviations = ("overlap_population_sd", "mayer_sd", "wiberg_sd") if report.spread is not None else ()
    writer.writerow([*COLUMNS, *deviations])
    for place in report.distinct_bonds():
        bond, orders, formal = report.coordination.bonds[place], report.orders[place], report.formal_orders[place]
        numbers = [bond.length_A, orders.overlap_population, orders.mayer, orders.wiberg]
        numbers.append(math.nan if formal is None else float(formal.order))
        kinds = orders.channel_shares.argmax(axis=1)
        numbers += [float(orders.channel_weights[kinds == k].sum()) for k in range(len(BOND_SYMMETRIES))]
        if report.spread is not None:
            spread = report.spread.bonds[place]
            numbers += [spread.overlap_population, spread.mayer, spread.wiberg]
        cells = [f"{value:.6g}" if math.isfinite(value) else "" for value in numbers]
        writer.writerow([report.bond_label(bond), str(bond.kind), *cells])
    return out.getvalue()
