"""Bonds and electrons in the words and table cells that every text form of a report shares."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final

from ehmo.conventions import BOND_SYMMETRIES
from ehmo.records.bonding import BondChannel, BondOrders
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.formal_order import FormalOrder
from ehmo.records.fragment import Fragment
from ehmo.records.spread import BondSpread

FULL_CHANNEL: Final = 0.60
PARTIAL_CHANNEL: Final = 0.20
"""Weights from which a channel counts as full or as partial when a bond is put into words."""

LISTED_CHANNEL: Final = 0.05
"""Weight below which a channel is not listed among the weights of a bond."""

BOND_NUMBERS: Final = (2, 3, 4, 5, 6)
"""Columns of `bond_rows` that hold numbers."""

_NUMBER_WORDS = ("no", "one", "two", "three", "four", "five", "six")


def electrons_in_words(fragment: Fragment) -> str:
    """Charge and unpaired electrons, such as ``charge +2, 1 unpaired electron``."""
    unpaired = fragment.unpaired_electrons
    return f"charge {signed(fragment.charge)}, {unpaired or 'no'} unpaired electron{'' if unpaired == 1 else 's'}"


def signed(charge: int | None) -> str:
    """Charge with its sign; 0 has none.

    Examples
    --------
    >>> signed(2), signed(0), signed(-1)
    ('+2', '0', '-1')
    """
    if charge is None:
        return "unknown"
    return f"{charge:+d}" if charge else "0"


def channels_in_words(channels: Sequence[BondChannel]) -> str:
    """Reading of a bond such as ``one sigma, two pi``; weaker channels are called partial."""
    full = [channel.type for channel in channels if channel.weight >= FULL_CHANNEL]
    partial = [c.type for c in channels if PARTIAL_CHANNEL <= c.weight < FULL_CHANNEL]
    parts = [
        f"{_NUMBER_WORDS[kinds.count(symmetry)]} {prefix}{symmetry}"
        for prefix, kinds in (("", full), ("partial ", partial))
        for symmetry in BOND_SYMMETRIES
        if symmetry in kinds
    ]
    return ", ".join(parts) or "traces only"


def channel_weights(channels: Sequence[BondChannel]) -> str:
    """Weights grouped by symmetry, such as ``sigma 0.75 0.15  pi 0.81 0.80``."""
    groups = []
    for symmetry in BOND_SYMMETRIES:
        weights = [f"{c.weight:.2f}" for c in channels if c.type == symmetry and c.weight >= LISTED_CHANNEL]
        if weights:
            groups.append(f"{symmetry} {' '.join(weights)}")
    return "  ".join(groups)


def with_deviation(value: str, deviation: float | None, digits: int) -> str:
    """Number with its standard deviation, where there is one.

    Examples
    --------
    >>> with_deviation("2.30", 0.1, 2), with_deviation("2.30", None, 2)
    ('2.30 ± 0.10', '2.30')
    """
    return value if deviation is None or math.isnan(deviation) else f"{value} ± {deviation:.{digits}f}"


def _orders_in_words(order: BondOrders, spread: BondSpread | None) -> list[str]:
    """Overlap population, Mayer and Wiberg order, with their standard deviations if there are any."""
    values = (order.overlap_population, order.mayer, order.wiberg)
    deviations = (None,) * 3 if spread is None else (spread.overlap_population, spread.mayer, spread.wiberg)
    return [with_deviation(f"{value:.2f}", sd, 2) for value, sd in zip(values, deviations, strict=True)]


def bond_rows(
    bonds: Sequence[MetalDonorBond],
    orders: Sequence[BondOrders],
    formal_orders: Sequence[FormalOrder | None],
    labels: Sequence[str],
    spreads: Sequence[BondSpread] | None = None,
) -> list[list[str]]:
    """Heading and one row of cells for each bond.

    Parameters
    ----------
    bonds : sequence of MetalDonorBond
    orders : sequence of BondOrders
        One per bond.
    formal_orders : sequence of FormalOrder or None
        One per bond.
    labels : sequence of str
        Label of each atom.
    spreads : sequence of BondSpread, optional
        Standard deviations, one per bond.

    Returns
    -------
    rows : list of list of str
    """
    rows = [["bond", "kind", "length/Å", "overlap pop.", "Mayer", "Wiberg", "formal", "channels and their weights"]]
    every = [None] * len(bonds) if spreads is None else spreads
    for bond, order, formal, spread in zip(bonds, orders, formal_orders, every, strict=True):
        rows.append(
            [
                f"{labels[bond.metal]}-{labels[bond.donor]}",
                bond.kind,
                f"{bond.length_A:.3f}",
                *_orders_in_words(order, spread),
                "?" if formal is None else str(formal.order),
                channel_weights(order.channels),
            ]
        )
    return rows
