"""Numerical health: near dependence, counter-intuitive mixing, convergence, frontier."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ehmo.conventions import FRONTIER_TOLERANCE_EV
from ehmo.records.basis import Basis
from ehmo.records.bonding import BondOrders, Populations
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.electronic import NO_ELECTRON, ElectronicState
from ehmo.records.health import AntibondingShell, Health, ShellPopulation

POPULATION_TOLERANCE = 0.005
"""Populations beyond the possible by less are rounding or smearing [e]."""

ANTIBONDING_POPULATION = 0.02
"""Overlap populations of one metal shell with a donor below minus this are listed [e]."""


def numerical_health(
    bonds: Sequence[MetalDonorBond],
    basis: Basis,
    state: ElectronicState,
    populations: Populations,
    orders: Sequence[BondOrders],
    smallest_overlap_eigenvalue: float,
) -> Health:
    """Signs that the numbers of a calculation cannot mean what they should.

    Parameters
    ----------
    bonds : sequence of MetalDonorBond
    basis : Basis
        Functions.
    state : ElectronicState
        Orbitals and their filling.
    populations : Populations
    orders : sequence of BondOrders
        One per bond.
    smallest_overlap_eigenvalue : float

    Returns
    -------
    health : Health

    References
    ----------
    .. [1] ammeter-1978: counter-intuitive mixing, its signs and its cure by weighting.
    """
    filled = state.occupations[0] > NO_ELECTRON
    shared = (state.occupations > NO_ELECTRON) & (state.occupations < 1 - NO_ELECTRON)
    lumo = state.lumo
    gap = None if lumo is None else float(state.energies_eV[lumo] - state.energies_eV[state.homo])
    return Health(
        smallest_overlap_eigenvalue=smallest_overlap_eigenvalue,
        iterations=state.iterations,
        charge_residual=state.charge_residual,
        impossible_populations=_impossible(basis, populations),
        negative_bonds=tuple(k for k, own in enumerate(orders) if own.overlap_population < 0),
        antibonding_shells=_antibonding(bonds, basis, populations),
        smallest_metal_share=float(populations.orbital_shares[filled, 0].min()),
        frontier_gap_eV=gap,
        nearly_degenerate=bool(shared.any()) or (gap is not None and gap < FRONTIER_TOLERANCE_EV),
        smeared=state.smearing_eV > 0,
    )


def _impossible(basis: Basis, populations: Populations) -> tuple[ShellPopulation, ...]:
    gross = np.add.reduceat(populations.gross, basis.shell_start)
    room = 2 * (2 * basis.shell_l + 1)
    beyond = (gross < -POPULATION_TOLERANCE) | (gross > room + POPULATION_TOLERANCE)
    return tuple(
        ShellPopulation(int(basis.shell_atom[k]), basis.shell_label(int(k)), float(gross[k]))
        for k in np.flatnonzero(beyond)
    )


def _antibonding(
    bonds: Sequence[MetalDonorBond], basis: Basis, populations: Populations
) -> tuple[AntibondingShell, ...]:
    found = []
    for place, bond in enumerate(bonds):
        own, other = np.flatnonzero(basis.shell_atom == bond.metal), basis.shell_atom == bond.donor
        by_shell = populations.shell_overlap[own][:, other].sum(axis=1)
        found += [
            AntibondingShell(place, basis.shell_label(int(shell)), float(population))
            for shell, population in zip(own, by_shell, strict=True)
            if population < -ANTIBONDING_POPULATION
        ]
    return tuple(found)
