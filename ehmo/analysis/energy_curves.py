"""Density of states and crystal-orbital overlap population against energy."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from scipy.sparse import csr_array

from ehmo.records.arrays import FloatArray
from ehmo.records.bonding import BondOrders
from ehmo.records.crystal_electronic import BandState, EnergyCurve

BROADENING_EV = 0.1
"""Standard deviation of the Gaussian that stands for each level [eV]."""

_STEPS_PER_WIDTH = 2
_MARGIN = 6  # widths, beyond which a Gaussian is below 1e-8 of its height


def density_of_states(state: BandState, *, width_eV: float = BROADENING_EV) -> EnergyCurve:
    """States of both spins per cell and electronvolt, by shells.

    Parameters
    ----------
    state : BandState
        Bands with the shares of the shells.
    width_eV : float
        Standard deviation of the broadening [eV].

    Returns
    -------
    density : EnergyCurve
        One curve per shell; they add up to the whole.
    """
    levels = state.energies_eV.ravel()
    amounts = 2 * state.mesh.weights[:, None, None] * state.shell_shares
    return _broadened(levels, amounts.transpose(1, 0, 2).reshape(amounts.shape[1], -1), width_eV)


def overlap_population_curves(
    state: BandState, orders: Sequence[BondOrders], *, width_eV: float = BROADENING_EV
) -> EnergyCurve:
    """Crystal-orbital overlap population: overlap population of each bond per electronvolt, all bands counted full.

    Parameters
    ----------
    state : BandState
        Bands.
    orders : sequence of BondOrders
        Bonds, as from `crystal_orders`.
    width_eV : float
        Standard deviation of the broadening [eV].

    Returns
    -------
    population : EnergyCurve
        One curve per bond; the integral up to the Fermi level of an insulator is its overlap population.

    References
    ----------
    .. [1] hughbanks-1983: T. Hughbanks, R. Hoffmann, J. Am. Chem. Soc. 105, 3528 (1983).
    """
    n_bands = state.energies_eV.shape[1]
    amounts = np.repeat(state.mesh.weights, n_bands) * np.array([order.orbital_overlap for order in orders])
    return _broadened(state.energies_eV.ravel(), amounts.reshape(len(orders), -1), width_eV)


def _broadened(levels: FloatArray, amounts: FloatArray, width: float) -> EnergyCurve:
    """Sum of Gaussians at the levels, with one amount per curve and level."""
    step = width / _STEPS_PER_WIDTH
    reach = _MARGIN * _STEPS_PER_WIDTH
    nearest = np.round(levels / step).astype(np.intp)
    first = int(nearest.min()) - reach
    energies = np.asarray(step * np.arange(first, int(nearest.max()) + reach + 1), dtype=np.float64)
    steps = np.arange(-reach, reach + 1)
    distances = (nearest * step - levels)[:, None] + step * steps
    gaussians = np.exp(-0.5 * (distances / width) ** 2) / (width * np.sqrt(2 * np.pi))
    columns = nearest[:, None] - first + steps
    starts = np.arange(len(levels) + 1) * len(steps)
    spread = csr_array((gaussians.ravel(), columns.ravel(), starts), shape=(len(levels), len(energies)))
    return EnergyCurve(energies, np.asarray(amounts @ spread, dtype=np.float64), width)
