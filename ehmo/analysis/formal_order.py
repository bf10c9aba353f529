"""Bond order by textbook counting, limited by symmetry.

The sigma frame takes the metal functions with an angular-overlap sigma sum of at least 0.75; the rest are free for
pi bonding. Multiply bonded donors offer pi functions. The singular values of the coupling between both count the
pi bonds: in each irrep there are as many as the smaller of the two sets, and none where symmetry forbids it.
Electrons in antibonding levels of the ladder undo bonds.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction

import numpy as np

from ehmo.analysis.angular import donor_functions, pi_axes
from ehmo.analysis.ladder import BONDING_OVERLAP
from ehmo.records.arrays import FloatArray
from ehmo.records.coordination import MULTIPLY_BONDED_KINDS, DonorKind, MetalDonorBond
from ehmo.records.formal_order import FormalOrder
from ehmo.records.ligand_field import Ladder

SIGMA_FRAME = 0.75
"""Angular-overlap sigma sum from which a metal function belongs to the sigma frame."""

COUPLED = 0.5
"""Singular value of the pi coupling from which a pi bond counts; one donor along an axis gives 1."""

_SHARPEST = 12  # denominators of textbook orders

_SINGLE = FormalOrder(Fraction(1), Fraction(1), Fraction(0), "single: one sigma", "")
_SINGLE_BY_CONVENTION = FormalOrder(
    Fraction(1), Fraction(1), Fraction(0), "single: one sigma", "one by convention; its pi part is in the channels"
)
_BY_CONVENTION = frozenset(
    {
        DonorKind.CARBONYL,
        DonorKind.NITROSYL_LINEAR,
        DonorKind.NITROSYL_BENT,
        DonorKind.HALIDE,
        DonorKind.ALKOXO,
        DonorKind.HYDROXO,
        DonorKind.AQUA,
        DonorKind.CYANIDO,
    }
)
_TWO_PI = frozenset({DonorKind.OXO, DonorKind.SULFIDO, DonorKind.NITRIDO, DonorKind.IMIDO_LINEAR, DonorKind.CARBYNE})
_NAMES = {
    Fraction(1): "single",
    Fraction(3, 2): "between single and double",
    Fraction(2): "double",
    Fraction(5, 2): "between double and triple",
    Fraction(3): "triple",
}
_COUNTS = {Fraction(0): "no", Fraction(1): "one", Fraction(2): "two", Fraction(3): "three"}


@dataclass(frozen=True, slots=True, eq=False)
class _Frame:
    """Metal functions about one metal: those of d and, in actinyls, f, one above the other.

    Attributes
    ----------
    sigma, pi : ndarrays (n_donors, n) and (n_offered, n)
        Functions that point at every donor, and those met by each offered pi function.
    owner : tuple of int
        Donor of each offered pi function.
    """

    sigma: FloatArray
    pi: FloatArray
    owner: tuple[int, ...]


def formal_orders(
    bonds: Sequence[MetalDonorBond],
    directions: FloatArray,
    pi_normals: Mapping[int, FloatArray],
    ladder: Ladder | None,
    *,
    with_f: bool = False,
) -> tuple[FormalOrder | None, ...]:
    """Textbook order of each bond of one metal.

    Parameters
    ----------
    bonds : sequence of MetalDonorBond
        Bonds of one metal.
    directions : (n_bonds, 3) ndarray
        Unit vectors to the donors, of the idealised sphere, in the metal's local axes.
    pi_normals : mapping of int to (3,) ndarray
        For donors that offer one pi function (bent imido, carbene, planar amido): the direction it lies along,
        in the same axes, by the place of the bond. Amido without an entry offers none.
    ladder : Ladder or None
        Filling of the antibonding levels; None leaves multiply bonded donors without an order.
    with_f : bool
        Whether f functions are free for pi bonding too (actinyls).

    Returns
    -------
    orders : tuple of FormalOrder or None
        In the order of `bonds`.
    """
    offered = [_offered(bond.kind, place, directions, pi_normals) for place, bond in enumerate(bonds)]
    multiple = [place for place, functions in enumerate(offered) if len(functions)]
    if not multiple:
        return tuple(_single(bond) for bond in bonds)
    if ladder is None:
        return tuple(None if place in multiple else _single(bond) for place, bond in enumerate(bonds))
    capacity, lost = np.zeros(len(bonds)), 0.0
    sigma_lost = np.zeros(len(bonds))
    total = 0
    for l in (2, 3) if with_f else (2,):
        frame = _frame(directions, offered, l)
        free = _free(frame.sigma) if l == 2 else np.eye(2 * l + 1)
        coupled = _coupled_functions(frame.pi @ free)
        total += coupled.shape[1]
        capacity += [_rank(frame.pi[[owner == place for owner in frame.owner]] @ free) for place in range(len(bonds))]
        if l == ladder.angular_momentum:
            lost = 0.5 * _antibonding_electrons(ladder, free @ coupled)
            sigma_lost = _antibonding_sigma(ladder, frame.sigma, free, multiple)
    capacity = np.minimum(capacity, [len(functions) for functions in offered])
    total = min(total, round(float(capacity.sum())))
    shared = _shared_evenly(total, capacity)
    left = max(0.0, 1 - lost / total) if total else 0.0
    rule = _rule(directions, offered, total, n_multiple=len(multiple), with_f=with_f)
    result: list[FormalOrder | None] = []
    for place, bond in enumerate(bonds):
        if place in multiple:
            result.append(_order(_fraction(1 - sigma_lost[place]), _fraction(left * shared[place]), rule))
        else:
            result.append(_single(bond))
    return tuple(result)


def _single(bond: MetalDonorBond) -> FormalOrder:
    return _SINGLE_BY_CONVENTION if bond.kind in _BY_CONVENTION else _SINGLE


def _offered(kind: DonorKind, place: int, directions: FloatArray, pi_normals: Mapping[int, FloatArray]) -> FloatArray:
    """(n, 3) directions across the bond of the pi functions that a donor offers."""
    across: FloatArray = pi_axes(directions[place : place + 1])[0].T
    if kind in _TWO_PI:
        return across
    if place not in pi_normals or (kind not in MULTIPLY_BONDED_KINDS and kind is not DonorKind.AMIDO):
        return np.zeros((0, 3))
    normal = pi_normals[place] - directions[place] * (pi_normals[place] @ directions[place])
    unit: FloatArray = normal / np.linalg.norm(normal)
    return unit[None]


def _frame(directions: FloatArray, offered: Sequence[FloatArray], l: int) -> _Frame:
    functions = donor_functions(directions, l)
    axes = pi_axes(directions)
    rows: list[FloatArray] = []
    owner: list[int] = []
    for place, lines in enumerate(offered):
        for line in lines:
            rows.append((line @ axes[place]) @ functions[place, 1:])
            owner.append(place)
    return _Frame(functions[:, 0], np.array(rows), tuple(owner))


def _free(sigma: FloatArray) -> FloatArray:
    """(n, n_free) metal functions that the sigma frame leaves, as orthonormal columns."""
    sums, vectors = np.linalg.eigh(sigma.T @ sigma)
    free: FloatArray = vectors[:, sums < SIGMA_FRAME]
    return free


def _coupled_functions(coupling: FloatArray) -> FloatArray:
    """Free metal functions that make pi bonds, as orthonormal columns."""
    _, strength, metal_side = np.linalg.svd(coupling, full_matrices=False)
    functions: FloatArray = metal_side[strength >= COUPLED].T
    return functions


def _rank(coupling: FloatArray) -> int:
    return _coupled_functions(coupling).shape[1] if len(coupling) else 0


def _shared_evenly(total: float, capacity: FloatArray) -> FloatArray:
    """Shares of a total, equal but for donors that cannot take as much."""
    shares = np.zeros(len(capacity))
    while total > 1e-9 and (open_ := shares < capacity - 1e-9).any():
        step = min(total / int(open_.sum()), float((capacity - shares)[open_].min()))
        shares[open_] += step
        total -= step * int(open_.sum())
    return shares


def _antibonding_electrons(ladder: Ladder, functions: FloatArray) -> float:
    """Electrons in levels that lie in the coupled functions and are not bonding themselves."""
    inside = ((functions.T @ ladder.vectors) ** 2).sum(axis=0) > 0.5
    return sum(
        level.electrons
        for level, within in zip(ladder.levels, inside, strict=True)
        if within and level.overlap_population <= BONDING_OVERLAP
    )


def _antibonding_sigma(ladder: Ladder, sigma: FloatArray, free: FloatArray, multiple: Sequence[int]) -> FloatArray:
    """Sigma bonds undone by electrons of the sigma frame, shared by the squares of the sigma functions."""
    lost = np.zeros(len(sigma))
    if ladder.angular_momentum != 2:
        return lost
    outside = ((free.T @ ladder.vectors) ** 2).sum(axis=0) < 0.5
    for k in np.flatnonzero(outside):
        squares = (sigma @ ladder.vectors[:, k]) ** 2
        lost += 0.5 * ladder.levels[k].electrons * squares / squares.sum()
    keep = np.zeros(len(sigma))
    keep[list(multiple)] = 1.0
    return lost * keep


def _rule(directions: FloatArray, offered: Sequence[FloatArray], total: int, *, n_multiple: int, with_f: bool) -> str:
    """What makes the count debatable, in words."""
    if with_f:
        return "6d and 5f functions both serve pi bonding"
    n_offered = sum(len(functions) for functions in offered)
    if n_multiple == 1 or total == n_offered:
        return ""
    said = f"{total} pi bonds of the d functions left by the sigma frame, shared by {n_multiple} donors"
    if n_multiple == len(offered):
        limit = _rank(_frame(directions, offered, 2).pi)
        return f"{said}; upper limit {_fraction(1 + limit / n_multiple)} if all d functions served"
    if len(offered) == 4:
        six = Fraction(1) + Fraction(min(3, n_offered), n_multiple)
        return f"{said}; a six-coordinate count, with three d functions left, gives {six}"
    return said


def _fraction(value: float) -> Fraction:
    return Fraction(round(value * _SHARPEST), _SHARPEST)


def _order(sigma: Fraction, pi: Fraction, rule: str) -> FormalOrder:
    order = sigma + pi
    name = _NAMES.get(order, f"order {order}")
    parts = [f"{_COUNTS.get(part, str(part))} {symmetry}" for part, symmetry in ((sigma, "sigma"), (pi, "pi")) if part]
    return FormalOrder(order, sigma, pi, f"{name}: {', '.join(parts)}", rule)
