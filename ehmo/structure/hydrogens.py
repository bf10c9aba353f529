"""Hydrogens that a structure lacks: recognised, placed, and X-ray bonds to hydrogen lengthened."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from typing import Final

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.structure.donors import AQUA_VALENCE, HYDROXO_VALENCE

NEUTRON_LENGTHS_A: Final = {"O": 0.98, "N": 1.015, "C": 1.089, "B": 1.19}
"""X-H lengths by neutron diffraction (Allen and Bruno 2010, averages; memory) [angstrom]."""

BRIDGING_HYDROXO_VALENCE: Final = 1.25
"""Oxygen between metals with a smaller sum of bond valences carries a hydrogen (common practice) [valence units]."""

PLACED_LENGTH_A: Final = 0.005
"""Hydrogens nearer than this to their standard length are left where they are [angstrom]."""

_AMINE_VALENCE: Final = 0.95  # amide N-M bonds are stronger
_SINGLE_A: Final = {"C": 1.46, "N": 1.41, "O": 1.36, "S": 1.76, "P": 1.78, "Si": 1.80, "B": 1.52}
_DOUBLE_A: Final = {"C": 1.25, "N": 1.20, "O": 1.00, "S": 1.50}
_ANGLES: Final = {"O": (117.0, 127.0), "N": (110.5, 120.0), "C": (109.5, 120.0)}
_ACCEPTORS: Final = frozenset({"O", "N", "F", "Cl", "Br", "S"})
_WATER_LABEL: Final = re.compile(r"(O\d*W|O-W|WAT|W)\W?\d*[A-Z]?\W?", re.IGNORECASE)
_HYDROXYL_LABEL: Final = re.compile(r"(O\d*H|O-H)\W?\d*[A-Z]?\W?", re.IGNORECASE)


@dataclass(frozen=True, slots=True)
class Surroundings:
    """An atom and what it is bonded to.

    Attributes
    ----------
    symbol, label : str
    neighbours : tuple of str
        Elements of the bonded atoms.
    vectors : (n_neighbours, 3) ndarray
        Towards them [angstrom].
    metal : tuple of bool
        Which of them are metals.
    valence : float or None
        Sum of the bond valences to metals; None where one is unknown [valence units].
    attached : int or None
        Hydrogens that the file says the atom has.
    formula_has_hydrogen : bool or None
        Whether the formula of the crystal has any; None where there is no formula.
    """

    symbol: str
    label: str
    neighbours: tuple[str, ...]
    vectors: FloatArray
    metal: tuple[bool, ...]
    valence: float | None
    attached: int | None = None
    formula_has_hydrogen: bool | None = None

    @property
    def n_hydrogens(self) -> int:
        """Hydrogens already there."""
        return self.neighbours.count("H")

    @property
    def carbons_and_others(self) -> list[int]:
        """Places of neighbours that are neither metals nor hydrogen."""
        return [k for k, s in enumerate(self.neighbours) if s != "H" and not self.metal[k]]


@dataclass(frozen=True, slots=True)
class Missing:
    """Hydrogens an atom lacks, what the group then is, and why."""

    count: int
    group: str
    reason: str


def missing_hydrogens(atom: Surroundings) -> Missing | None:
    """Hydrogens an atom lacks; None where it seems complete.

    Oxygen and nitrogen on metals go by bond valence and label, carbon by its bond lengths and angles; what the
    file says of attached hydrogens wins.
    """
    have = atom.n_hydrogens
    if atom.attached is not None and atom.attached > have and atom.symbol in ("C", "N", "O"):
        group = {"O": "water" if atom.attached == 2 else "hydroxide"}.get(atom.symbol, f"{atom.symbol}H{atom.attached}")
        return Missing(atom.attached - have, group, "the file says so")
    if have:
        return None
    if atom.symbol == "O":
        return _oxygen(atom)
    if atom.symbol == "N":
        return _nitrogen(atom)
    return _carbon(atom) if atom.symbol == "C" else None


def _oxygen(atom: Surroundings) -> Missing | None:
    if not atom.neighbours:
        return Missing(2, "water", "bonded to nothing")
    if not all(atom.metal):
        return None
    label = f"label {atom.label}"
    valence = atom.valence
    if _WATER_LABEL.fullmatch(atom.label) and (valence is None or valence < HYDROXO_VALENCE):
        return Missing(2, "water", label if valence is None else f"{label}, bond valence {valence:.2f}")
    if _HYDROXYL_LABEL.fullmatch(atom.label) and (valence is None or valence < BRIDGING_HYDROXO_VALENCE):
        return Missing(1, "hydroxide", label if valence is None else f"{label}, bond valence {valence:.2f}")
    if valence is None:
        return None
    if valence < AQUA_VALENCE:
        return Missing(2, "water", f"bond valence {valence:.2f}")
    limit = HYDROXO_VALENCE if len(atom.neighbours) == 1 else BRIDGING_HYDROXO_VALENCE
    if valence < limit and atom.formula_has_hydrogen is not False:
        return Missing(1, "hydroxide", f"bond valence {valence:.2f}")
    return None


def _nitrogen(atom: Surroundings) -> Missing | None:
    if not atom.neighbours:
        return Missing(3, "ammonia or ammonium", "bonded to nothing")
    others = atom.carbons_and_others
    metals = len(atom.neighbours) - len(others)
    weak = atom.valence is None or atom.valence < HYDROXO_VALENCE
    if metals == 1 and not others and weak:
        return Missing(3, "ammine", "" if atom.valence is None else f"bond valence {atom.valence:.2f}")
    single = all(atom.neighbours[k] == "C" and _length(atom, k) >= _SINGLE_A["N"] for k in others)
    if metals == 1 and single and (atom.valence is None or atom.valence < _AMINE_VALENCE):
        if len(others) == 1:
            return Missing(2, "amine", "single bond to carbon")
        if len(others) == 2 and _angle_sum(atom) < 350.0:
            return Missing(1, "amine", "single bonds to carbon, pyramidal")
    return None


def _carbon(atom: Surroundings) -> Missing | None:
    others = atom.carbons_and_others
    sigma_metal = len(others) < 2 and any(atom.metal)
    if sigma_metal or not others:
        return None
    single = [_length(atom, k) >= _SINGLE_A.get(atom.neighbours[k], 0.0) for k in others]
    if len(others) == 1:
        element, length = atom.neighbours[others[0]], _length(atom, others[0])
        if single[0]:
            return Missing(3, "CH3", "one single bond")
        if element == "C":
            count = 2 if length > _DOUBLE_A["C"] else 1
            return Missing(count, f"CH{count}" if count > 1 else "CH", "one multiple bond")
        return None
    if len(others) == 2:
        a, b = (atom.vectors[k] / _length(atom, k) for k in others)
        if a @ b < np.cos(np.radians(155.0)):
            return None
        return Missing(2, "CH2", "two single bonds") if all(single) else Missing(1, "CH", "two bonds, one multiple")
    if len(others) == 3 and _angle_sum(atom) < 345.0:
        return Missing(1, "CH", "three bonds, pyramidal")
    return None


def _length(atom: Surroundings, k: int) -> float:
    return float(np.linalg.norm(atom.vectors[k]))


def _angle_sum(atom: Surroundings) -> float:
    """Sum of the angles between three bonds; of all bonds where carbon has no metal, else of three [degree]."""
    unit = atom.vectors / np.linalg.norm(atom.vectors, axis=1)[:, None]
    keep = atom.carbons_and_others
    unit = unit[keep] if len(keep) == 3 else unit[:3]
    return sum(float(np.degrees(np.arccos(np.clip(unit[a] @ unit[b], -1, 1)))) for a, b in ((0, 1), (1, 2), (0, 2)))


def hydrogen_vectors(atom: Surroundings, count: int, around: FloatArray, around_symbols: Sequence[str]) -> FloatArray:
    """Where hydrogens go, relative to their atom.

    Angles are fixed by the bonds where these leave no freedom; a turn about a bond, or of a whole water molecule,
    is chosen so that hydrogens point at acceptors and stay clear of everything else.

    Parameters
    ----------
    atom : Surroundings
    count : int
        Hydrogens to place.
    around : (n, 3) ndarray
        Vectors to all atoms within some 4 A [angstrom].
    around_symbols : sequence of str
        Their elements.

    Returns
    -------
    vectors : (count, 3) ndarray
        [angstrom]
    """
    length = NEUTRON_LENGTHS_A[atom.symbol]
    candidates = length * _directions(atom, count)
    if len(candidates) == 1:
        return np.asarray(candidates[0])
    return np.asarray(candidates[int(np.argmin(_crowding(candidates, around, around_symbols)))])


def _directions(atom: Surroundings, count: int) -> FloatArray:
    """Unit vectors of every candidate, (n_candidates, count, 3)."""
    used = [k for k, s in enumerate(atom.neighbours) if not (atom.symbol == "C" and atom.metal[k])]
    unit = atom.vectors[used] / np.linalg.norm(atom.vectors[used], axis=1)[:, None] if used else np.empty((0, 3))
    if len(unit) == 0:
        return _free(count)
    if len(unit) == 1:
        return _about_axis(unit[0], atom.symbol, count, planar=atom.symbol == "C" and count < 3)
    away = -unit.sum(axis=0)
    size = float(np.linalg.norm(away))
    if len(unit) == 2:
        normal = np.cross(unit[0], unit[1])
        if size < 0.2 or np.linalg.norm(normal) < 0.1:
            return _about_axis(unit[0], atom.symbol, count, right_angle=True)
        if count == 1:
            return (away / size)[None, None]
        half = np.radians(54.0)
        normal = normal / np.linalg.norm(normal)
        pair = np.array([np.cos(half) * away / size + sign * np.sin(half) * normal for sign in (1, -1)])
        return pair[None, :count]
    if size < 0.2:
        normal = np.cross(unit[1] - unit[0], unit[2] - unit[0])
        return np.array([normal, -normal])[:, None] / np.linalg.norm(normal)
    return np.repeat((away / size)[None, None], count, axis=1)


def _about_axis(
    axis: FloatArray, symbol: str, count: int, *, planar: bool = False, right_angle: bool = False
) -> FloatArray:
    """Hydrogens on a cone about a bond, in steps of ten degrees."""
    theta, apart = _ANGLES[symbol]
    if planar:
        theta, apart = (180.0, 0.0) if count == 1 else (121.0, 180.0)
    if right_angle:
        theta = 90.0
    if symbol == "O" and count == 1 and not right_angle:
        theta = 112.0
    x = np.cross(axis, np.eye(3)[int(np.abs(axis).argmin())])
    x = x / np.linalg.norm(x)
    y = np.cross(axis, x)
    turns = np.radians(np.arange(0.0, 360.0, 10.0))
    offsets = np.radians(apart) * np.arange(count)
    angle = turns[:, None] + offsets[None, :]
    t = np.radians(theta)
    ring = np.cos(angle)[..., None] * x + np.sin(angle)[..., None] * y
    return np.asarray(np.cos(t) * axis + np.sin(t) * ring)


@cache
def _free(count: int) -> FloatArray:
    """Orientations of a water molecule or ammonia, spread over the sphere."""
    n = 32
    k = np.arange(n) + 0.5
    height, turn = 1 - 2 * k / n, np.pi * (1 + 5**0.5) * k
    flat = np.sqrt(1 - height**2)
    first = np.column_stack([flat * np.cos(turn), flat * np.sin(turn), height])
    found = []
    for axis in first:
        x = np.cross(axis, np.eye(3)[int(np.abs(axis).argmin())])
        x = x / np.linalg.norm(x)
        y = np.cross(axis, x)
        theta, apart = (np.radians(104.5), 180.0) if count <= 2 else (np.radians(107.0), 120.0)
        for start in np.radians(np.arange(0.0, 360.0, 30.0)):
            rest = [
                np.cos(theta) * axis + np.sin(theta) * (np.cos(start + s) * x + np.sin(start + s) * y)
                for s in np.radians(apart) * np.arange(count - 1)
            ]
            found.append([axis, *rest])
    return np.array(found)


def _crowding(candidates: FloatArray, around: FloatArray, symbols: Sequence[str]) -> FloatArray:
    """Score of each candidate, low where hydrogens point at acceptors and are far from the rest."""
    if not len(around):
        return np.zeros(len(candidates))
    gap = around[None, None] - candidates[:, :, None]
    distance = np.linalg.norm(gap, axis=-1)
    acceptor = np.array([s in _ACCEPTORS for s in symbols])
    light = np.array([s == "H" for s in symbols])
    wanted = np.where(light, 2.0, np.where(acceptor, 1.7, 2.5))
    score = (np.clip(wanted - distance, 0.0, None) ** 2).sum(axis=(1, 2))
    unit = candidates / np.linalg.norm(candidates, axis=-1, keepdims=True)
    cosine = (gap * unit[:, :, None]).sum(axis=-1) / np.maximum(distance, 1e-9)
    bond = acceptor & (cosine > np.cos(np.radians(55.0))) & (np.linalg.norm(around, axis=1) > 2.3)
    pull = np.exp(-(((distance - 1.85) / 0.4) ** 2)) * np.clip(cosine, 0.0, None)
    return np.asarray(score - 0.5 * np.where(bond, pull, 0.0).max(axis=2).sum(axis=1))
