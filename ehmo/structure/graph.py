"""The bond graph: which atoms are bonded, by sums of covalent radii."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.fragment import Fragment
from ehmo.structure.elements import COUNTER_IONS, covalent_radius_A, metal_symbols

BOND_FACTOR: Final = 1.25
"""Two atoms are bonded up to this multiple of the sum of their covalent radii (common practice)."""

METAL_CARBON_FACTOR: Final = 1.10
"""Tighter for metal-carbon: chelate rings bring unbonded carbon to 1.2 times the sum of radii."""

METAL_METAL_FACTOR: Final = 0.95
"""Metal-metal contacts up to this hold a molecule together; they are not metal-donor bonds."""

SHADOW_MARGIN: Final = 0.05
"""A donor beyond 1.0 radii sums whose neighbour is closer by this much is a mere contact."""

OVERLAP_A: Final = 0.5
"""Atoms closer than this overlap [angstrom]."""

OVERLAP_FRACTION: Final = 0.5
"""Atoms other than hydrogen closer than this fraction of the sum of their radii overlap."""

MAX_COORDINATE_A: Final = 1e6
"""Coordinates beyond this are taken for mistakes [angstrom]."""

_BRUTE_FORCE_ATOMS: Final = 800


@dataclass(frozen=True, slots=True, eq=False)
class BondGraph:
    """Bonds of a fragment.

    Attributes
    ----------
    symbols : tuple of str
    positions_A : (n_atoms, 3) ndarray
        [angstrom]
    metals : tuple of int
        Metal atoms, ascending.
    neighbours : tuple of tuple of int
        Bonded atoms other than metals, of each atom, ascending.
    metal_neighbours : tuple of tuple of int
        Metals each atom is bonded to, ascending; empty for a metal.
    metal_contacts : tuple of tuple of int
        Pairs of metals within bonding distance of each other.
    """

    symbols: tuple[str, ...]
    positions_A: FloatArray
    metals: tuple[int, ...]
    neighbours: tuple[tuple[int, ...], ...]
    metal_neighbours: tuple[tuple[int, ...], ...]
    metal_contacts: tuple[tuple[int, int], ...]

    def distance_A(self, i: int, j: int) -> float:
        """Distance of two atoms [angstrom]."""
        return float(np.linalg.norm(self.positions_A[i] - self.positions_A[j]))

    def angle_deg(self, i: int, j: int, k: int) -> float:
        """Angle i-j-k [degree]."""
        a, b = self.positions_A[i] - self.positions_A[j], self.positions_A[k] - self.positions_A[j]
        return float(np.degrees(np.arctan2(np.linalg.norm(np.cross(a, b)), a @ b)))

    def donors_of(self, metal: int) -> tuple[int, ...]:
        """Atoms bonded to a metal, ascending."""
        return self.neighbours[metal]


@dataclass(frozen=True, slots=True, eq=False)
class ElementReach:
    """Radii and roles of the atoms of one structure, as arrays over atoms."""

    radii_A: FloatArray
    is_metal: NDArray[np.bool_]
    is_hydrogen: NDArray[np.bool_]
    is_carbon: NDArray[np.bool_]
    is_bare_ion: NDArray[np.bool_]

    @classmethod
    def of(cls, symbols: Sequence[str]) -> ElementReach:
        """Look up the elements of a structure."""
        metals = metal_symbols(symbols)
        radius = {symbol: covalent_radius_A(symbol) for symbol in set(symbols)}
        ions = COUNTER_IONS - metals
        return cls(
            np.array([radius[symbol] for symbol in symbols]),
            np.array([symbol in metals for symbol in symbols]),
            np.array([symbol == "H" for symbol in symbols]),
            np.array([symbol == "C" for symbol in symbols]),
            np.array([symbol in ions for symbol in symbols]),
        )

    @property
    def longest_A(self) -> float:
        """No bond is longer than this [angstrom]."""
        return 2.0 * BOND_FACTOR * float(self.radii_A.max())

    def ratios(self, i: IntArray, j: IntArray, distances: FloatArray) -> FloatArray:
        """Distances in units of the sum of covalent radii."""
        return distances / (self.radii_A[i] + self.radii_A[j])

    def bonded(self, i: IntArray, j: IntArray, distances: FloatArray) -> NDArray[np.bool_]:
        """Which pairs are bonded; the list must hold each pair both ways.

        Bare counter-ions have no bonds. Hydrogen takes its nearest neighbour alone, and any other atom before a
        metal, so that hydrogens of water or alkyl groups near a metal are no hydrides; a hydride may bridge.
        """
        ratio = self.ratios(i, j, distances)
        both_metals = self.is_metal[i] & self.is_metal[j]
        metal_carbon = (self.is_metal[i] & self.is_carbon[j]) | (self.is_carbon[i] & self.is_metal[j])
        factor = np.where(metal_carbon, METAL_CARBON_FACTOR, BOND_FACTOR)
        factor = np.where(both_metals, METAL_METAL_FACTOR, factor)
        within = (ratio <= factor) & ~self.is_bare_ion[i] & ~self.is_bare_ion[j]
        rank = np.where(self.is_metal[j], ratio + 10.0, ratio)
        nearest = np.full(len(self.radii_A), np.inf)
        np.minimum.at(nearest, i[within], rank[within])
        hydride = nearest >= 10.0
        taken = (rank <= nearest[i]) | (hydride[i] & self.is_metal[j])
        taken_by_other = (np.where(self.is_metal[i], ratio + 10.0, ratio) <= nearest[j]) | (
            hydride[j] & self.is_metal[i]
        )
        kept: NDArray[np.bool_] = within & (~self.is_hydrogen[i] | taken) & (~self.is_hydrogen[j] | taken_by_other)
        return kept


def bond_graph(fragment: Fragment) -> BondGraph:
    """Bond graph of a fragment.

    Raises
    ------
    InputError
        If two atoms overlap.
    """
    reach = ElementReach.of(fragment.symbols)
    check_overlap(fragment.positions_A, reach, fragment.labels, fragment.source or "fragment")
    i, j, distances = _close_pairs(fragment.positions_A, reach.longest_A)
    bonded = reach.bonded(i, j, distances)
    i, j, ratio = i[bonded], j[bonded], reach.ratios(i, j, distances)[bonded]
    bare = [dict[int, float]() for _ in fragment.symbols]
    for a, b, r in zip(i.tolist(), j.tolist(), ratio.tolist(), strict=True):
        bare[a][b] = r
    metals = tuple(np.flatnonzero(reach.is_metal).tolist())
    metal_set = frozenset(metals)
    real = [{b for b, r in near.items() if not _only_contact(a, b, r, bare, metal_set)} for a, near in enumerate(bare)]
    return BondGraph(
        symbols=fragment.symbols,
        positions_A=fragment.positions_A,
        metals=metals,
        neighbours=tuple(tuple(sorted(near - metal_set)) for near in real),
        metal_neighbours=tuple(
            () if a in metal_set else tuple(sorted(near & metal_set)) for a, near in enumerate(real)
        ),
        metal_contacts=tuple((a, b) for a in metals for b in sorted(real[a] & metal_set) if a < b),
    )


def _only_contact(a: int, b: int, ratio: float, near: list[dict[int, float]], metals: frozenset[int]) -> bool:
    """Whether a contact is owed to a closer donor next to it, as for the N of a chelating nitrate."""
    if (a in metals) == (b in metals) or ratio <= 1.0:
        return False
    metal, far = (a, b) if a in metals else (b, a)
    return any(near[metal].get(c, np.inf) < ratio - SHADOW_MARGIN for c in near[far] if c not in metals)


def check_overlap(positions: FloatArray, reach: ElementReach, labels: Sequence[str], place: str) -> None:
    """Refuse atoms that overlap, and coordinates far out of any molecule.

    Raises
    ------
    InputError
        Naming the closest pair found, or the atom too far out.
    """
    far = np.abs(positions).max(axis=1)
    if far.max() > MAX_COORDINATE_A:
        raise InputError(
            f"{labels[int(far.argmax())]} has a coordinate beyond {MAX_COORDINATE_A:.0e} A",
            place=place,
            mend="give coordinates in angstrom",
        )
    if len(positions) < 2:
        return
    first, second, distance = _nearest_neighbours(positions)
    radii = reach.radii_A[first] + reach.radii_A[second]
    light = reach.is_hydrogen[first] | reach.is_hydrogen[second]
    allowed = np.where(light, OVERLAP_A, np.maximum(OVERLAP_A, OVERLAP_FRACTION * radii))
    if (distance < allowed).any():
        k = int(np.argmin(distance - allowed))
        raise InputError(
            f"{labels[first[k]]} and {labels[second[k]]} overlap at {distance[k]:.3f} A",
            place=place,
            mend="remove one of them or correct the coordinates",
        )


def _nearest_neighbours(positions: FloatArray) -> tuple[IntArray, IntArray, FloatArray]:
    every = np.arange(len(positions))
    if len(positions) <= _BRUTE_FORCE_ATOMS:
        distances = _all_distances(positions)
        np.fill_diagonal(distances, np.inf)
        nearest = distances.argmin(axis=1)
        return every, nearest, distances[every, nearest]
    from scipy.spatial import cKDTree

    gaps, found = (np.asarray(part) for part in cKDTree(positions).query(positions, k=2))
    # Of coinciding atoms the query may name the other one first.
    nearest = np.where(found[:, 1] == every, found[:, 0], found[:, 1])
    return every, nearest, gaps[:, 1]


def _close_pairs(positions: FloatArray, reach_A: float) -> tuple[IntArray, IntArray, FloatArray]:
    """Pairs within reach, both ways; a tree for large structures, whose import would slow down small ones."""
    if len(positions) <= _BRUTE_FORCE_ATOMS:
        distances = _all_distances(positions)
        np.fill_diagonal(distances, np.inf)
        i, j = np.nonzero(distances <= reach_A)
        return i, j, distances[i, j]
    from scipy.spatial import cKDTree

    half = cKDTree(positions).query_pairs(reach_A, output_type="ndarray")
    i = np.concatenate([half[:, 0], half[:, 1]])
    j = np.concatenate([half[:, 1], half[:, 0]])
    return i, j, np.linalg.norm(positions[i] - positions[j], axis=1)


def _all_distances(positions: FloatArray) -> FloatArray:
    return np.asarray(np.linalg.norm(positions[:, None, :] - positions[None, :, :], axis=2))
