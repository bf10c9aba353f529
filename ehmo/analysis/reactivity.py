"""Nucleophilic or electrophilic: a reading of each multiply bonded donor from charge and frontier orbitals.

The donor's charge, less what is usual for its element, sets the leaning; a low-lying pi* level moves it one step
towards electrophilic, a highest filled level on the donor one step towards nucleophilic. The thresholds were set
on 2026-12-01 so that RuO4, Ru(VI) nitride and Fischer carbenes come out electrophilic, tungstate, molybdate and
Schrock carbynes nucleophilic (common practice).
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ehmo.conventions import DEGENERACY_TOLERANCE_EV
from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.bonding import BondOrders, Populations
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.electronic import ElectronicState
from ehmo.records.reactivity import DonorReactivity, Leaning

_LEANINGS: tuple[Leaning, ...] = (
    "nucleophilic",
    "leans nucleophilic",
    "between",
    "leans electrophilic",
    "electrophilic",
)
_CHARGE_STEPS = (-0.85, -0.70, -0.40, -0.15)
_USUAL_CHARGE = {"O": 0.0, "N": 0.10, "S": 0.20, "Se": 0.20, "C": 0.35}
_LOW_PI_STAR_EV = 3.5
_ON_DONOR = 0.40
_SEEN = 0.10
_ANTIBONDING = -0.02


def donor_reactivity(
    bonds: Sequence[MetalDonorBond],
    orders: Sequence[BondOrders],
    basis: Basis,
    overlap: FloatArray,
    state: ElectronicState,
    populations: Populations,
) -> tuple[DonorReactivity, ...]:
    """Reading of each donor whose bond may be multiple.

    Parameters
    ----------
    bonds : sequence of MetalDonorBond
    orders : sequence of BondOrders
        One per bond.
    basis : Basis
        Functions.
    overlap : (n_ao, n_ao) ndarray
        S.
    state : ElectronicState
        Orbitals and their filling.
    populations : Populations
        Charges.

    Returns
    -------
    readings : tuple of DonorReactivity
        By place of the bond.
    """
    return tuple(
        _reading(place, bond, orders[place], basis, overlap, state, populations)
        for place, bond in enumerate(bonds)
        if bond.may_be_multiple
    )


def _reading(
    place: int,
    bond: MetalDonorBond,
    orders: BondOrders,
    basis: Basis,
    overlap: FloatArray,
    state: ElectronicState,
    populations: Populations,
) -> DonorReactivity:
    functions = basis.functions_of(bond.donor)
    own = np.arange(functions.start, functions.stop)[basis.shell_l[basis.shell_of[functions]] == 1]
    share = (state.coefficients[own] * (overlap[own] @ state.coefficients)).sum(axis=0)
    energies, charge = state.energies_eV, float(populations.charges[bond.donor])
    homo_share = _level_mean(share, energies, state.homo)
    lumo_share = 0.0 if state.lumo is None else _level_mean(share, energies, state.lumo)
    open_ = state.occupations[1] < 1 - 1e-9
    star = np.flatnonzero(open_ & (share > _SEEN * 0.8) & (orders.orbital_overlap < _ANTIBONDING))
    filled = np.flatnonzero((state.occupations[1] > 1 - 1e-9) & (share > _SEEN))
    pi_star = float(energies[star[0]]) if len(star) else None
    gap = pi_star - float(energies[filled[-1]]) if pi_star is not None and len(filled) else None
    step = int(np.searchsorted(_CHARGE_STEPS, charge - _USUAL_CHARGE.get(basis.symbols[bond.donor], 0.0)))
    step += int(gap is not None and gap < _LOW_PI_STAR_EV) - int(homo_share > _ON_DONOR)
    leaning = _LEANINGS[min(max(step, 0), len(_LEANINGS) - 1)]
    return DonorReactivity(place, charge, homo_share, lumo_share, pi_star, gap, leaning)


def _level_mean(share: FloatArray, energies: FloatArray, orbital: int) -> float:
    """Mean over the orbitals degenerate with one."""
    alike = np.abs(energies - energies[orbital]) < 10 * DEGENERACY_TOLERANCE_EV
    return float(share[alike].mean())
