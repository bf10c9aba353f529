"""The local frame of a metal: z and x by its bonds."""

from __future__ import annotations

from itertools import combinations
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ehmo.records.arrays import FloatArray
from ehmo.records.coordination import DonorKind, LocalFrame, MetalDonorBond
from ehmo.records.fragment import Fragment

TIE_A: Final = 0.02
"""Bonds whose lengths differ by less are tied [angstrom]."""

TRANS_DEG: Final = 160.0
"""Two bonds at a larger angle are trans [degree]."""

AXIS_TOLERANCE: Final = 0.15
"""Largest distance of unit vectors that a rotation may leave, to count as an axis of the sphere."""

MAX_AXIS_DONORS: Final = 12
"""Donors whose pairs and triples are tried as axes; coordination numbers rarely exceed it."""

_NEAR_AXIS_SIN: Final = 0.3
"""Donors whose bond makes an angle with z below asin(0.3) = 17 degrees are axial."""


def local_frame(fragment: Fragment, metal: int, bonds: tuple[MetalDonorBond, ...]) -> LocalFrame:
    """Right-handed axes of one metal.

    z runs from the metal to its shortest multiply bonded donor; of tied donors a trans pair decides, else the
    highest rotation axis of the sphere, else the lowest index. Without multiple bonds the axis decides first,
    then a trans pair. x points along the equatorial donor that gives dx2-y2 the most sigma overlap.

    Parameters
    ----------
    fragment : Fragment
    metal : int
        Atom index.
    bonds : tuple of MetalDonorBond
        Bonds of that metal, shortest first.

    Returns
    -------
    frame : LocalFrame
    """
    if not bonds:
        return LocalFrame(metal, np.eye(3), "no donors: axes of the file", "no donors: axes of the file")
    bonds, units = _directions(fragment, bonds)
    labels = [fragment.labels[bond.donor] for bond in bonds]
    z, z_reason = _z_axis(units, bonds, labels)
    x, x_reason = _x_axis(units, z, bonds, labels)
    if x is None:
        others = fragment.positions_A - fragment.positions_A[metal]
        x, x_reason = (
            _x_axis_far(others, z),
            "no equatorial donor: towards the first atom off the axis, else free",
        )
    return LocalFrame(metal, np.array([x, np.cross(z, x), z]), z_reason, x_reason)


def _directions(fragment: Fragment, bonds: tuple[MetalDonorBond, ...]) -> tuple[tuple[MetalDonorBond, ...], FloatArray]:
    """One bond and one unit vector per donor; side-on carbon counts once, by the centre of its atoms."""
    groups: dict[tuple[DonorKind, int], list[MetalDonorBond]] = {}
    for bond in bonds:
        number = bond.ligand if bond.kind is DonorKind.SIDE_ON_CARBON else -1 - bond.donor
        groups.setdefault((bond.kind, number), []).append(bond)
    origin = fragment.positions_A[bonds[0].metal]
    vectors = np.array(
        [fragment.positions_A[[bond.donor for bond in group]].mean(axis=0) - origin for group in groups.values()]
    )
    return tuple(group[0] for group in groups.values()), vectors / np.linalg.norm(vectors, axis=1)[:, None]


def _z_axis(units: FloatArray, bonds: tuple[MetalDonorBond, ...], labels: list[str]) -> tuple[FloatArray, str]:
    multiple = [k for k, bond in enumerate(bonds) if bond.may_be_multiple]
    if multiple:
        shortest = min(bonds[k].length_A for k in multiple)
        tied = [k for k in multiple if bonds[k].length_A < shortest + TIE_A]
        if len(tied) == 1:
            return units[tied[0]], f"shortest multiply bonded donor {labels[tied[0]]}"
    else:
        tied = list(range(len(bonds)))
    tied.sort(key=lambda k: bonds[k].donor)
    pair = _trans_pair(units, tied)
    axis, order = _principal_axis(units, bonds, tied)
    if multiple and pair:
        return units[pair[0]], f"trans pair {labels[pair[0]]}, {labels[pair[1]]}"
    if axis is not None:
        return axis, f"{order}-fold axis of the coordination sphere"
    if pair:
        return units[pair[0]], f"trans pair {labels[pair[0]]}, {labels[pair[1]]}"
    return units[tied[0]], f"lowest index of equal donors, {labels[tied[0]]}"


def _trans_pair(units: FloatArray, among: list[int]) -> tuple[int, int] | None:
    limit = np.cos(np.radians(TRANS_DEG))
    return next(((a, b) for a, b in combinations(among, 2) if units[a] @ units[b] < limit), None)


def _principal_axis(
    units: FloatArray, bonds: tuple[MetalDonorBond, ...], tied: list[int]
) -> tuple[FloatArray | None, int]:
    """Only axis of the highest order, towards the shortest of the tied donors; None if there are several."""
    some = range(min(len(units), MAX_AXIS_DONORS))
    candidates = [*units]
    for size in (2, 3):
        candidates += [units[list(few)].sum(axis=0) for few in combinations(some, size)]
    candidates += [np.cross(units[a], units[b]) for a, b in combinations(some, 2)]
    if np.linalg.norm(np.cross(units, units[0]), axis=1).max() < _NEAR_AXIS_SIN:
        return None, 1  # on one line, every order is an axis
    norms = [float(np.linalg.norm(candidate)) for candidate in candidates]
    axes = np.array([c / n for c, n in zip(candidates, norms, strict=True) if n > 0.1])
    alike = np.array([[_alike(a, b) for b in bonds] for a in bonds])
    for order in (6, 5, 4, 3, 2):
        good = axes[_are_axes(axes, order, units, alike)]
        if len(good) == 0:
            continue
        if (np.abs(good @ good[0]) < 1.0 - AXIS_TOLERANCE**2).any():
            return None, order
        along = units @ good[0]
        off_plane = [k for k in tied if abs(along[k]) > 0.1] or tied
        shortest = min(bonds[k].length_A for k in off_plane)
        side = min(off_plane, key=lambda k: (round((bonds[k].length_A - shortest) / TIE_A), bonds[k].donor))
        return (good[0] if along[side] >= 0 else -good[0]), order
    return None, 1


def _alike(a: MetalDonorBond, b: MetalDonorBond) -> bool:
    """Whether symmetry may exchange two donors: donors of one kind at nearly one length."""
    return a.kind == b.kind and abs(a.length_A - b.length_A) < 0.1


def _are_axes(axes: FloatArray, order: int, units: FloatArray, alike: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Which axes, turned by 360/order degrees, bring every donor onto one like it."""
    angle = 2.0 * np.pi / order
    along = (axes @ units.T)[:, :, None] * axes[:, None, :]
    turned = along + np.cos(angle) * (units - along) + np.sin(angle) * np.cross(axes[:, None, :], units[None])
    gaps = np.linalg.norm(turned[:, :, None, :] - units[None, None, :, :], axis=3)
    found: NDArray[np.bool_] = (np.where(alike, gaps, np.inf).min(axis=2) < AXIS_TOLERANCE).all(axis=1)
    return found


def _x_axis(
    units: FloatArray, z: FloatArray, bonds: tuple[MetalDonorBond, ...], labels: list[str]
) -> tuple[FloatArray | None, str]:
    flat = units - (units @ z)[:, None] * z
    sines = np.linalg.norm(flat, axis=1)
    equatorial = [k for k in range(len(bonds)) if sines[k] > _NEAR_AXIS_SIN]
    if not equatorial:
        return None, ""
    equatorial.sort(key=lambda k: bonds[k].donor)
    directions = flat[equatorial] / sines[equatorial][:, None]
    cosines = directions @ directions.T
    # sigma overlap of dx2-y2 with a donor at polar angle theta: (sqrt 3 / 2) sin^2 theta cos 2 phi
    strength = ((2.0 * cosines**2 - 1.0) ** 2 * sines[equatorial] ** 4).sum(axis=1)
    # Equal in strength: multiply bonded donors first, then shorter bonds, then the order of the file.
    tied = np.flatnonzero(strength > strength.max() - 1e-3)
    shortest = min(bonds[equatorial[k]].length_A for k in tied)
    best = int(
        min(
            tied,
            key=lambda k: (
                not bonds[equatorial[k]].may_be_multiple,
                round((bonds[equatorial[k]].length_A - shortest) / TIE_A),
                bonds[equatorial[k]].donor,
            ),
        )
    )
    return directions[best], f"equatorial donor {labels[equatorial[best]]}"


def _x_axis_far(vectors: FloatArray, z: FloatArray) -> FloatArray:
    flat = vectors - (vectors @ z)[:, None] * z
    off = np.flatnonzero(np.linalg.norm(flat, axis=1) > 0.1)
    chosen = flat[off[0]] if off.size else np.eye(3)[np.argmin(np.abs(z))]
    chosen = chosen - (chosen @ z) * z
    return np.asarray(chosen / np.linalg.norm(chosen))
