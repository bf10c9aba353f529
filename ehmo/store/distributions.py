"""Distributions of bond numbers by metal and kind of donor, and the bonds far outside of them."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from ehmo.records.arrays import FloatArray
from ehmo.records.store_summary import Distribution, KindSummary, Outlier, Trend
from ehmo.store.store import Store
from ehmo.store.trends import order_trend
from ehmo.store.where import Condition

QUANTITIES = ("mayer", "wiberg", "formal_order", "overlap_population", "length_A")
"""Columns of bonds whose distributions are given."""

FENCE = 3.0
"""Interquartile ranges beyond the quartiles from where a value is far out (Tukey, Exploratory Data Analysis, 1977)."""

LEAST_RANGES = {"mayer": 0.1, "length_A": 0.1}
"""Interquartile ranges taken at least, so that nearly equal values make no outliers of small differences."""

LEAST_BONDS = 12
"""Bonds of one metal and kind from which a line is drawn and outliers are sought."""

MOST_OUTLIERS = 1000
"""Outliers listed; all are counted."""


@dataclass(frozen=True, slots=True)
class BondStatistics:
    """Kinds of bonds, the outliers listed, and the number of all."""

    kinds: tuple[KindSummary, ...]
    outliers: tuple[Outlier, ...]
    outliers_found: int


@dataclass(frozen=True, slots=True)
class _Bonds:
    """Bonds of one metal and kind: id of the structure and number in it, and values by quantity."""

    metal: str
    kind: str
    ids: NDArray[np.int64]
    places: NDArray[np.int64]
    values: dict[str, FloatArray]


@dataclass(frozen=True, slots=True)
class _Far:
    """An outlier by the place of its row."""

    id: int
    place: int
    metal: str
    kind: str
    length_A: float
    mayer: float | None
    quantity: Literal["mayer", "length_A"]
    value: float
    expected: float
    distance: float


def bond_statistics(store: Store, where: Condition | None = None) -> BondStatistics:
    """Distributions by metal and kind, and outliers.

    Outliers are bonds whose length, or whose Mayer order less that of the trend at its length, is far out among the
    bonds of its metal and kind.

    Parameters
    ----------
    store : Store
    where : Condition, optional
        Only bonds that meet it.

    Returns
    -------
    statistics : BondStatistics
    """
    kinds: list[KindSummary] = []
    far: list[_Far] = []
    for bonds in _by_kind(store, where, QUANTITIES):
        present = {name: values[np.isfinite(values)] for name, values in bonds.values.items()}
        found = {name: distribution(values) for name, values in present.items() if len(values)}
        trend = _trend(bonds)
        kinds.append(KindSummary(bonds.metal, bonds.kind, len(bonds.ids), found, trend))
        if trend is not None:
            far += _far(bonds, trend)
    far.sort(key=lambda one: (-one.distance, one.id, one.place))
    return BondStatistics(tuple(kinds), tuple(_named(store, far[:MOST_OUTLIERS])), len(far))


def distribution(values: FloatArray) -> Distribution:
    """Five numbers of a sample.

    Parameters
    ----------
    values : (n,) ndarray
        At least one, all finite.

    Returns
    -------
    distribution : Distribution
    """
    return Distribution(len(values), *(float(number) for number in np.quantile(values, (0.0, 0.25, 0.5, 0.75, 1.0))))


def beyond_quartiles(values: FloatArray, least_range: float) -> FloatArray:
    """Distance of each value beyond the nearer quartile of all, in interquartile ranges.

    Parameters
    ----------
    values : (n,) ndarray
        NaN where there is none.
    least_range : float
        Interquartile range taken at least.

    Returns
    -------
    distances : (n,) ndarray
        Zero between the quartiles, where no value is, and where there are less than `LEAST_BONDS` of them.
    """
    present = values[np.isfinite(values)]
    if len(present) < LEAST_BONDS:
        return np.zeros(len(values))
    lower, upper = np.quantile(present, (0.25, 0.75))
    beyond = np.maximum(lower - values, values - upper) / max(upper - lower, least_range)
    distances: FloatArray = np.maximum(np.nan_to_num(beyond, nan=0.0), 0.0)
    return distances


def _trend(bonds: _Bonds) -> Trend | None:
    lengths, orders = bonds.values["length_A"], bonds.values["mayer"]
    both = np.isfinite(lengths) & np.isfinite(orders)
    # The line of a few bonds of one or two compounds says nothing.
    return order_trend(lengths[both], orders[both]) if both.sum() >= LEAST_BONDS else None


def _far(bonds: _Bonds, trend: Trend) -> Iterator[_Far]:
    lengths, orders = bonds.values["length_A"], bonds.values["mayer"]
    on_line = trend.at(lengths)
    usual = np.full(len(lengths), np.median(lengths[np.isfinite(lengths)]))
    sought: tuple[tuple[Literal["mayer", "length_A"], FloatArray, FloatArray], ...] = (
        ("mayer", orders, on_line),
        ("length_A", lengths, usual),
    )
    for quantity, values, expected in sought:
        distances = beyond_quartiles(values - expected, LEAST_RANGES[quantity])
        for k in np.flatnonzero(distances > FENCE):
            yield _Far(
                int(bonds.ids[k]),
                int(bonds.places[k]),
                bonds.metal,
                bonds.kind,
                float(lengths[k]),
                float(orders[k]) if np.isfinite(orders[k]) else None,
                quantity,
                float(values[k]),
                float(expected[k]),
                float(distances[k]),
            )


def bond_points(store: Store, where: Condition | None = None) -> Iterator[tuple[str, str, FloatArray, FloatArray]]:
    """Bonds of each metal and kind to be drawn.

    Parameters
    ----------
    store : Store
    where : Condition, optional
        Only bonds that meet it.

    Yields
    ------
    metal, kind : str
    lengths_A, orders : (n,) ndarray
        Lengths [angstrom] and Mayer orders of the bonds that have both.
    """
    for bonds in _by_kind(store, where, ("length_A", "mayer")):
        lengths, orders = bonds.values["length_A"], bonds.values["mayer"]
        both = np.isfinite(lengths) & np.isfinite(orders)
        yield bonds.metal, bonds.kind, lengths[both], orders[both]


def _by_kind(store: Store, where: Condition | None, names: Sequence[str]) -> Iterator[_Bonds]:
    """Bonds of each metal and kind, with the values of these columns."""
    codes: dict[tuple[str, str], int] = {}
    places: list[NDArray[np.int64]] = []
    numbers: list[FloatArray] = []
    for page in store.bond_pages(("metal", "kind", *names), where):
        ids, at, metals, kinds, *columns = zip(*page, strict=True)
        code = [codes.setdefault(one, len(codes)) for one in zip(metals, kinds, strict=True)]
        places.append(np.array((code, ids, at), dtype=np.int64))
        numbers.append(np.array(columns, dtype=np.float64))  # None becomes NaN
    if not codes:
        return
    rows, values = np.concatenate(places, axis=1), np.concatenate(numbers, axis=1)
    order = np.argsort(rows[0], kind="stable")
    rows, values = rows[:, order], values[:, order]
    starts = np.searchsorted(rows[0], np.arange(len(codes) + 1))
    for (metal, kind), code_ in sorted(((tuple(map(str, names)), code) for names, code in codes.items())):
        some = slice(starts[code_], starts[code_ + 1])
        yield _Bonds(metal, kind, rows[1, some], rows[2, some], dict(zip(names, values[:, some], strict=True)))


def _named(store: Store, far: list[_Far]) -> Iterator[Outlier]:
    names = store.bond_names([(one.id, one.place) for one in far])
    for one, (key, source, entry, bond) in zip(far, names, strict=True):
        yield Outlier(
            key,
            source,
            entry,
            bond,
            one.metal,
            one.kind,
            one.length_A,
            one.mayer,
            one.quantity,
            one.value,
            one.expected,
            one.distance,
        )
