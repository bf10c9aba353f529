"""What a page shows in three dimensions: the hybrids of every channel, and the orbitals that carry them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from basis_params import ParameterTable
from ehmo.analysis.channel_orbitals import channel_orbitals, half_overlap
from ehmo.analysis.interaction import bond_interaction
from ehmo.orbitals.grid import grid_around, grid_values
from ehmo.records.arrays import FloatArray
from ehmo.records.bonding import BondChannel
from ehmo.records.channel_orbitals import ChannelOrbitals
from ehmo.records.grid import Grid
from ehmo.records.interaction import OrbitalSet
from ehmo.records.report import BondReport

LEAST_WEIGHT: Final = 0.10
"""Channels of less weight are named, without pictures."""

LEAST_SHARE: Final = 0.05
"""Part of a channel from which a level is listed as carrying it."""

MOST_CARRIERS: Final = 6
"""Levels listed for one channel; the others stand as one sum."""

MOST_CHANNELS: Final = 40
"""Channels with pictures; those of further bonds are listed by weight alone."""

MOST_ORBITALS: Final = 60
"""Orbitals that carry channels with pictures; a bond that would need more is left to its weights."""

LEVELS: Final = (0.03, 0.05, 0.08, 0.12)
"""Amplitudes of the surfaces [bohr^-3/2]."""

USUAL_LEVEL: Final = 1
"""Place of the amplitude shown first."""

_MARGIN_A = 2.8
_HYBRID_POINTS, _ORBITAL_POINTS = 30_000, 90_000
_HYBRID_SPACING_A, _ORBITAL_SPACING_A = 0.20, 0.18


@dataclass(frozen=True, slots=True)
class Carrier:
    """A level that carries part of a channel.

    Attributes
    ----------
    level : OrbitalSet
    share : float
        Part of the channel's weight, summed over the level.
    opposed : bool
        Whether it is listed because the two hybrids meet out of phase in it more than in any other level.
    """

    level: OrbitalSet
    share: float
    opposed: bool = False


@dataclass(frozen=True, slots=True, eq=False)
class ShownChannel:
    """A channel with its hybrids and carriers.

    Attributes
    ----------
    bond, place : int
        Place of the bond in the report, and of the channel in the bond.
    channel : BondChannel
    orbitals : ChannelOrbitals
    carriers : tuple of Carrier
        By falling share, the level in which the hybrids are opposed last.
    """

    bond: int
    place: int
    channel: BondChannel
    orbitals: ChannelOrbitals
    carriers: tuple[Carrier, ...]

    @property
    def rest(self) -> float:
        """Share of all levels that are not listed."""
        return 1.0 - sum(carrier.share for carrier in self.carriers)

    @property
    def key(self) -> str:
        """Name of the channel within a page."""
        return f"channel-{self.bond}-{self.place}"


def orbital_key(orbital: int) -> str:
    """Name of an orbital within a page."""
    return f"orbital-{orbital}"


def shown_channels(report: BondReport) -> list[ShownChannel]:
    """Channels of the distinct bonds, multiple bonds first where there are too many.

    Parameters
    ----------
    report : BondReport

    Returns
    -------
    channels : list of ShownChannel
        In the order of the bonds.
    """
    root = half_overlap(report.overlap)
    bonds = report.coordination.bonds
    ranked = sorted(report.distinct_bonds(), key=lambda k: (not bonds[k].may_be_multiple, k))  # by metal, then length
    found: list[ShownChannel] = []
    orbitals_so_far: set[int] = set()
    for bond in ranked:
        listed = [channel for channel in report.orders[bond].channels if channel.weight >= LEAST_WEIGHT]
        if len(found) + len(listed) > MOST_CHANNELS:
            break
        sets = bond_interaction(report, bond).sets
        orbitals = channel_orbitals(bonds[bond], listed, report.basis, root, report.state)
        added = [
            ShownChannel(bond, place, channel, own, _carriers(own, sets))
            for place, (channel, own) in enumerate(zip(listed, orbitals, strict=True))
        ]
        needed = orbitals_so_far | {k for shown in added for one in shown.carriers for k in one.level.orbitals}
        if found and len(needed) > MOST_ORBITALS:
            continue
        found, orbitals_so_far = found + added, needed
    return sorted(found, key=lambda shown: (shown.bond, shown.place))


def _carriers(orbitals: ChannelOrbitals, sets: Sequence[OrbitalSet]) -> tuple[Carrier, ...]:
    # Of degenerate orbitals only the sum of the shares has a meaning.
    shares = [Carrier(level, float(orbitals.shares[list(level.orbitals)].sum())) for level in sets]
    strongest = sorted((one for one in shares if abs(one.share) >= LEAST_SHARE), key=lambda one: -abs(one.share))
    carriers = sorted(strongest[:MOST_CARRIERS], key=lambda one: -one.share)
    if orbitals.couplings.min() < 0:
        opposed = next(level for level in sets if orbitals.antibonding in level.orbitals)
        if all(one.level is not opposed for one in carriers):
            share = float(orbitals.shares[list(opposed.orbitals)].sum())
            carriers.append(Carrier(opposed, share, opposed=True))
    return tuple(carriers)


def shown_orbitals(report: BondReport, channels: Sequence[ShownChannel]) -> list[int]:
    """Orbitals with pictures: carriers, ladder, highest filled and lowest empty one; by rising energy."""
    found = {k for shown in channels for carrier in shown.carriers for k in carrier.level.orbitals}
    for site in report.sites:
        if site.ladder is not None:
            found |= {level.orbital for level in site.ladder.levels if level.orbital is not None}
    found.add(report.state.homo)
    if report.state.lumo is not None:
        found.add(report.state.lumo)
    return sorted(found)


def orbital_grid(report: BondReport, spacing_A: float = _ORBITAL_SPACING_A, points: int = _ORBITAL_POINTS) -> Grid:
    """Grid that holds the orbitals of a report."""
    return grid_around(report.fragment.positions_A, _MARGIN_A, spacing_A, most_points=points)


def orbital_values(report: BondReport, table: ParameterTable, orbitals: Sequence[int], grid: Grid) -> FloatArray:
    """(n_orbitals, nx, ny, nz) values of orbitals on a grid [bohr^-3/2]."""
    coefficients = report.state.coefficients[:, list(orbitals)]
    return grid_values(coefficients, report.basis, report.fragment.positions_A, table, grid)


def hybrid_values(
    report: BondReport, table: ParameterTable, channels: Sequence[ShownChannel]
) -> tuple[Grid, FloatArray]:
    """Grid round one bond, and (2 n_channels, nx, ny, nz) values on it: metal and donor hybrid of each channel."""
    bond = report.coordination.bonds[channels[0].bond]
    positions = report.fragment.positions_A
    grid = grid_around(positions[[bond.metal, bond.donor]], _MARGIN_A, _HYBRID_SPACING_A, most_points=_HYBRID_POINTS)
    hybrids = [h for shown in channels for h in (shown.orbitals.metal_orbital, shown.orbitals.donor_orbital)]
    return grid, grid_values(np.stack(hybrids, axis=1), report.basis, positions, table, grid)
