"""Order against length as SVG, one drawing per metal."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Final, TypeVar

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.records.store_summary import Outlier, Trend
from ehmo.report.page.markup import Markup, element

Number = TypeVar("Number", float, FloatArray)

WIDTH, HEIGHT = 440, 300
_LEFT, _RIGHT, _TOP, _BOTTOM = 46, 10, 12, 40
_NEAR = 14.0  # from a ring to its number [px]
_GRID = 1.5  # marks closer than this are one mark [px]

MARKS: Final = (
    ("sigma", "m-2.6 0a2.6 2.6 0 1 0 5.2 0a2.6 2.6 0 1 0-5.2 0"),
    ("pi", "m-2.3-2.3h4.6v4.6h-4.6z"),
    ("delta", "m0-3l2.7 4.8h-5.4z"),
    ("phi", "m0-3.2l3.2 3.2-3.2 3.2-3.2-3.2z"),
    ("muted", "m-2.6 0h5.2m-2.6-2.6v5.2"),
)
"""Colour and shape of the kinds of donor in their order; the last serves all further ones."""


@dataclass(frozen=True, slots=True)
class KindPoints:
    """Bonds of one metal and kind to be drawn.

    Attributes
    ----------
    kind : str
    mark : int
        Place in `MARKS`.
    lengths_A, orders : (n,) ndarray
    trend : Trend or None
        Line to draw.
    """

    kind: str
    mark: int
    lengths_A: FloatArray
    orders: FloatArray
    trend: Trend | None


@dataclass(frozen=True, slots=True)
class Limits:
    """Ends of the axes: lengths [angstrom] and orders."""

    lengths_A: tuple[float, float]
    orders: tuple[float, float]

    @classmethod
    def around(cls, kinds: Sequence[KindPoints]) -> Limits:
        """Limits that hold all points with some room."""
        lengths = np.concatenate([kind.lengths_A for kind in kinds])
        orders = np.concatenate([kind.orders for kind in kinds])
        across, up = max(float(np.ptp(lengths)), 0.1), max(float(np.ptp(orders)), 0.3)
        return cls(
            (float(lengths.min()) - 0.05 * across, float(lengths.max()) + 0.05 * across),
            (min(0.0, float(orders.min()) - 0.05 * up), float(orders.max()) + 0.08 * up),
        )

    def x(self, length_A: Number) -> Number:
        """Place of lengths [px]."""
        first, last = self.lengths_A
        return _LEFT + (WIDTH - _LEFT - _RIGHT) * (length_A - first) / (last - first)

    def y(self, order: Number) -> Number:
        """Place of orders [px]."""
        first, last = self.orders
        return HEIGHT - _BOTTOM - (HEIGHT - _TOP - _BOTTOM) * (order - first) / (last - first)


def scatter_drawing(metal: str, kinds: Sequence[KindPoints], limits: Limits, numbered: Mapping[int, Outlier]) -> Markup:
    """Drawing of the bonds of one metal.

    Parameters
    ----------
    metal : str
    kinds : sequence of KindPoints
    limits : Limits
    numbered : mapping of int to Outlier
        Outliers of the metal by their number in the table, which they link to.

    Returns
    -------
    svg : Markup
    """
    count = sum(len(kind.orders) for kind in kinds)
    return element(
        "svg",
        list(_axes(limits)),
        [_line(kind, limits) for kind in kinds],
        [_marks(kind, limits) for kind in kinds],
        list(_numbers(numbered, limits)),
        view_box=f"0 0 {WIDTH} {HEIGHT}",
        role="img",
        aria_label=f"Mayer order against length of {count} bonds of {metal}",
    )


def mark_sample(mark: int) -> Markup:
    """A mark on its own, for the key."""
    return element(
        "svg", _path(f"M8 8{MARKS[mark][1]}", mark), view_box="0 0 16 16", class_="sample", aria_hidden="true"
    )


def ticks(first: float, last: float, wanted: int = 7) -> list[float]:
    """Round numbers between two ends.

    Examples
    --------
    >>> ticks(1.48, 2.31)
    [1.6, 1.8, 2.0, 2.2]
    """
    rough = (last - first) / wanted
    scale = 10.0 ** math.floor(math.log10(rough))
    step = next(scale * factor for factor in (1, 2, 5, 10) if scale * factor >= rough)
    start = math.ceil(first / step - 1e-9)
    return [round(k * step, 10) for k in range(start, math.floor(last / step + 1e-9) + 1)]


def _axes(limits: Limits) -> Iterator[Markup]:
    bottom, right = HEIGHT - _BOTTOM, WIDTH - _RIGHT
    for length in ticks(*limits.lengths_A):
        x = f"{limits.x(length):.1f}"
        yield element("line", x1=x, x2=x, y1=_TOP, y2=bottom, class_="rule")
        yield element("text", f"{length:g}", x=x, y=bottom + 15, class_="tick", text_anchor="middle")
    for order in ticks(*limits.orders):
        y = limits.y(order)
        yield element("line", x1=_LEFT, x2=right, y1=f"{y:.1f}", y2=f"{y:.1f}", class_="rule")
        yield element("text", f"{order:g}", x=_LEFT - 6, y=f"{y + 4:.1f}", class_="tick", text_anchor="end")
    yield element("text", "length/Å", x=(_LEFT + right) / 2, y=HEIGHT - 6, class_="axis", text_anchor="middle")
    middle = (_TOP + bottom) / 2
    yield element(
        "text", "Mayer order", x=12, y=middle, class_="axis", text_anchor="middle", transform=f"rotate(-90 12 {middle})"
    )


def _line(kind: KindPoints, limits: Limits) -> Markup | None:
    if kind.trend is None or not len(kind.orders):
        return None
    ends = np.quantile(kind.lengths_A, (0.05, 0.95))  # not out to an outlier
    lengths = np.linspace(ends[0], ends[1], 25)
    places = zip(limits.x(lengths).tolist(), limits.y(kind.trend.at(lengths)).tolist(), strict=True)
    points = " ".join(f"{x:.1f},{y:.1f}" for x, y in places)
    return element("polyline", points=points, class_=f"trend mark-{MARKS[kind.mark][0]}")


def _marks(kind: KindPoints, limits: Limits) -> Markup:
    """All marks of a kind as one path; those that would lie on one another once."""
    places = np.stack([limits.x(kind.lengths_A), limits.y(kind.orders)], axis=1)
    cells = np.unique(np.round(places / _GRID).astype(np.int64), axis=0)
    shape = MARKS[kind.mark][1]
    return _path("".join(f"M{x * _GRID:g} {y * _GRID:g}{shape}" for x, y in cells.tolist()), kind.mark)


def _path(data: str, mark: int) -> Markup:
    return element("path", d=data, class_=f"mark mark-{MARKS[mark][0]}")


def _numbers(numbered: Mapping[int, Outlier], limits: Limits) -> Iterator[Markup]:
    """Rings round the outliers, each with its number beside it, none over another."""
    taken: list[tuple[float, float]] = []
    for number, one in numbered.items():
        if one.mayer is None:
            continue
        x, y = limits.x(one.length_A), limits.y(one.mayer)
        at = _free_place(x, y, taken)
        taken.append(at)
        yield element(
            "a",
            element("title", f"{one.bond}, {one.kind}: {one.source}{', ' if one.entry else ''}{one.entry}"),
            element("circle", cx=f"{x:.1f}", cy=f"{y:.1f}", r="6", class_="ring"),
            element("line", x1=f"{x:.1f}", y1=f"{y:.1f}", x2=f"{at[0]:.1f}", y2=f"{at[1]:.1f}", class_="leader")
            if math.dist((x, y), at) > 2 * _NEAR
            else None,
            element(
                "text", str(number), x=f"{at[0]:.1f}", y=f"{at[1] + 4:.1f}", class_="numbered", text_anchor="middle"
            ),
            href=f"#outlier-{number}",
        )


def _free_place(x: float, y: float, taken: Sequence[tuple[float, float]]) -> tuple[float, float]:
    """Place of a number near a ring, clear of the others and within the axes as far as there is one."""
    place = x + _NEAR, y
    for k in range(96):
        turn, reach = math.pi / 6 * (k % 12), _NEAR + 9.0 * (k // 12)
        place = x + reach * math.cos(turn), y - reach * math.sin(turn)
        inside = _LEFT + 8 < place[0] < WIDTH - _RIGHT - 4 and _TOP + 4 < place[1] < HEIGHT - _BOTTOM - 8
        if inside and all(abs(place[0] - a) > 18 or abs(place[1] - b) > 13 for a, b in taken):
            break
    return place
