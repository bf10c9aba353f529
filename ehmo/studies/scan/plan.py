"""What a scan changes: the atoms, the values, and the geometry at each of them."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

import basis_params
from ehmo.errors import InputError, LimitError
from ehmo.records.arrays import FloatArray
from ehmo.records.coordination import Coordination, MetalDonorBond
from ehmo.records.fragment import Fragment
from ehmo.records.scan import ScanPlan
from ehmo.studies.displacement import rigid_group

CONTACT_FRACTION = 0.7
"""Atoms that are not bonded and come nearer than this part of the sum of their covalent radii run into each other."""

RELAXED = "every other length and angle is relaxed at each point, from the geometry of the file"

MOST_STEPS = 2000
"""Largest number of points."""


def bond_plan(
    fragment: Fragment,
    coordination: Coordination,
    words: str,
    first: float,
    last: float,
    steps: int,
    *,
    relax: bool = False,
) -> ScanPlan:
    """Plan of a scan of one metal-donor length.

    The ligand moves rigidly along the bond; of a chelating or bridging ligand the donor atom moves alone.

    Parameters
    ----------
    fragment : Fragment
    coordination : Coordination
    words : str
        Labels of metal and donor, such as ``V1-O2``.
    first, last : float
        Lengths [angstrom].
    steps : int
        Points, ends included.
    relax : bool
        Whether the rest of the molecule is relaxed at each value.

    Returns
    -------
    plan : ScanPlan

    Raises
    ------
    InputError
        If there is no such bond, or the lengths or steps make no scan.
    """
    pair = _atoms(fragment, words, 2)
    bond = _bond_between(coordination, pair)
    if bond is None:
        listed = ", ".join(f"{fragment.labels[b.metal]}-{fragment.labels[b.donor]}" for b in coordination.bonds)
        raise InputError(f"there is no bond {words}", mend=f"choose from {listed}")
    moved, note = _moving(coordination, bond, fragment)
    values = _values(first, last, steps, lowest=0.5, highest=20.0)
    return ScanPlan("length", (bond.metal, bond.donor), moved, values, (RELAXED if relax else note,), relax)


def angle_plan(
    fragment: Fragment,
    coordination: Coordination,
    words: str,
    first: float,
    last: float,
    steps: int,
    *,
    relax: bool = False,
) -> ScanPlan:
    """Plan of a scan of one donor-metal-donor angle: the last donor's ligand turns about the metal.

    Parameters
    ----------
    fragment : Fragment
    coordination : Coordination
    words : str
        Labels of donor, metal and donor, such as ``O2-V1-O3``.
    first, last : float
        Angles [degree].
    steps : int
        Points, ends included.
    relax : bool
        Whether the rest of the molecule is relaxed at each value.

    Returns
    -------
    plan : ScanPlan

    Raises
    ------
    InputError
        If the atoms are no two bonds of one metal, or the angles or steps make no scan.
    """
    a, metal, b = _atoms(fragment, words, 3)
    bonds = [_bond_between(coordination, (metal, donor)) for donor in (a, b)]
    if bonds[0] is None or bonds[1] is None or bonds[0].metal != metal or bonds[1].metal != metal:
        raise InputError(
            f"{words} is no angle of two bonds at a metal", mend="name donor-metal-donor, such as O2-V1-O3"
        )
    moved, note = _moving(coordination, bonds[1], fragment)
    values = _values(first, last, steps, lowest=10.0, highest=180.0)
    return ScanPlan("angle", (a, metal, b), moved, values, (RELAXED if relax else note,), relax)


def displaced(fragment: Fragment, plan: ScanPlan, value: float) -> Fragment:
    """Fragment with the scanned coordinate at a value.

    Parameters
    ----------
    fragment : Fragment
        Start.
    plan : ScanPlan
    value : float
        Length [angstrom] or angle [degree].

    Returns
    -------
    fragment : Fragment
    """
    positions = np.array(fragment.positions_A)
    moved = list(plan.moved)
    if plan.coordinate == "length":
        metal, donor = plan.atoms
        along = positions[donor] - positions[metal]
        length = float(np.linalg.norm(along))
        positions[moved] += along * (value / length - 1)
    else:
        a, metal, b = plan.atoms
        first, second = positions[a] - positions[metal], positions[b] - positions[metal]
        positions[moved] = positions[metal] + (positions[moved] - positions[metal]) @ _turn(first, second, value).T
    return replace(fragment, positions_A=positions)


def check_contacts(fragment: Fragment, plan: ScanPlan, bonded: Sequence[tuple[int, int]]) -> None:
    """Refuse a geometry in which what moved comes upon an atom that it is not bonded to.

    Parameters
    ----------
    fragment : Fragment
        Displaced.
    plan : ScanPlan
    bonded : sequence of (int, int)
        Bonded atoms of the start.

    Raises
    ------
    InputError
        It names the atoms.
    """
    moved = np.zeros(len(fragment), dtype=bool)
    moved[list(plan.moved)] = True
    first, second = np.nonzero(moved[:, None] & ~moved)
    distances = np.linalg.norm(fragment.positions_A[first] - fragment.positions_A[second], axis=1)
    radii = np.array([basis_params.atom(symbol).covalent_radius_A for symbol in fragment.symbols])
    shared = {frozenset(pair) for pair in bonded} | {frozenset(plan.atoms[-2:])}
    for place in np.flatnonzero(distances < CONTACT_FRACTION * (radii[first] + radii[second])):
        a, b = int(first[place]), int(second[place])
        if frozenset((a, b)) not in shared:
            raise InputError(
                f"{fragment.labels[a]} runs upon {fragment.labels[b]}, {distances[place]:.2f} Å away",
                mend="take another range",
            )


def _turn(first: FloatArray, second: FloatArray, angle_deg: float) -> FloatArray:
    """Rotation in the plane of two vectors that brings the second to an angle from the first."""
    axis = np.cross(first, second)
    if np.linalg.norm(axis) < 1e-6 * np.linalg.norm(first) * np.linalg.norm(second):
        # On one line every plane will do.
        axis = np.cross(first, np.eye(3)[np.abs(first).argmin()])
    axis /= np.linalg.norm(axis)
    now = np.arctan2(np.linalg.norm(np.cross(first, second)), first @ second)
    change = np.radians(angle_deg) - now
    skew = np.array([[0, -axis[2], axis[1]], [axis[2], 0, -axis[0]], [-axis[1], axis[0], 0]])
    turn: FloatArray = np.eye(3) + np.sin(change) * skew + (1 - np.cos(change)) * (skew @ skew)
    return turn


def _atoms(fragment: Fragment, words: str, count: int) -> tuple[int, ...]:
    names = re.split(r"[-–,\s]+", words.strip())
    if len(names) != count:
        raise InputError(
            f"{words!r} names {len(names)} atoms, not {count}", mend="write labels such as V1-O2 or O2-V1-O3"
        )
    labels = {label.lower(): index for index, label in enumerate(fragment.labels)}
    missing = [name for name in names if name.lower() not in labels]
    if missing:
        raise InputError(f"there is no atom {missing[0]}", mend="labels are element and place in the file, such as V1")
    return tuple(labels[name.lower()] for name in names)


def _bond_between(coordination: Coordination, pair: tuple[int, ...]) -> MetalDonorBond | None:
    return next((bond for bond in coordination.bonds if {bond.metal, bond.donor} == set(pair)), None)


def _moving(coordination: Coordination, bond: MetalDonorBond, fragment: Fragment) -> tuple[tuple[int, ...], str]:
    whole = rigid_group(coordination, bond)
    ligand, label = coordination.ligands[bond.ligand], fragment.labels[bond.donor]
    if whole != ligand.atoms:
        return whole, f"{label} belongs to a chelating or bridging ligand: it moves alone"
    said = f"the ligand {ligand.formula} of {label} moves rigidly" if len(whole) > 1 else f"{label} moves"
    return whole, f"{said}; every other atom stays"


def _values(first: float, last: float, steps: int, *, lowest: float, highest: float) -> tuple[float, ...]:
    if not (np.isfinite([first, last]).all() and lowest <= min(first, last) and max(first, last) <= highest):
        raise InputError(
            f"the range {first:g} to {last:g} is no scan", mend=f"give two numbers between {lowest:g} and {highest:g}"
        )
    if steps < 2 or first == last:
        raise InputError("a scan needs two different ends and at least 2 steps", mend="give --from, --to and --steps")
    if steps > MOST_STEPS:
        raise LimitError(f"{steps} steps, more than the limit of {MOST_STEPS}", mend="take fewer steps")
    return tuple(float(value) for value in np.linspace(first, last, steps))
