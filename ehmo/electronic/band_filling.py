"""Filling of bands: whole levels where there is a gap, a smeared distribution where there is none.

The rule looks at the levels of all k-points together, so that a supercell and its folded mesh are filled alike.
"""

from __future__ import annotations

import numpy as np

from ehmo.errors import ElectronCountError
from ehmo.records.arrays import FloatArray
from ehmo.records.crystal_electronic import BandFilling, CellElectrons

SMEARING_EV = 0.02
"""Width of the Fermi-Dirac filling of metals [eV]."""

SHARP_GAP_EV = 0.1
"""Levels are full or empty where the next one lies farther than this above the last electron [eV]."""

_EXACT = 1e-9


def fill_bands(
    energies_eV: FloatArray,
    weights: FloatArray,
    electrons: CellElectrons,
    *,
    smear: bool = False,
    width_eV: float = SMEARING_EV,
) -> BandFilling:
    """Occupation of every level of a mesh.

    Each spin fills the lowest levels of the mesh if they hold its electrons exactly and the next level lies more than
    0.1 eV higher; otherwise both spins follow Fermi-Dirac distributions.

    Parameters
    ----------
    energies_eV : (n_k, n_bands) ndarray
        Ascending levels [eV].
    weights : (n_k,) ndarray
        Of the k-points.
    electrons : CellElectrons
        Electrons per cell.
    smear : bool
        Use the distribution in any case.
    width_eV : float
        Its width [eV].

    Returns
    -------
    filling : BandFilling

    Raises
    ------
    ElectronCountError
        If the electrons do not fit.

    References
    ----------
    .. [1] mermin-1965: N. D. Mermin, Phys. Rev. 137, A1441 (1965).
    """
    _check(electrons, energies_eV.shape[1])
    whole = None if smear else [_whole_levels(energies_eV, weights, count) for count in electrons.by_spin]
    if whole is not None and all(part is not None for part in whole):
        parts = [part for part in whole if part is not None]
        width = 0.0
    else:
        parts = [_smeared(energies_eV, weights, count, width_eV) for count in electrons.by_spin]
        width = width_eV
    occupations, levels = zip(*parts, strict=True)
    return BandFilling(np.stack(occupations), np.array(levels), width)


def _check(electrons: CellElectrons, n_bands: int) -> None:
    total, unpaired = electrons.total, electrons.unpaired or 0
    if total < 1:
        raise ElectronCountError(
            f"the charge leaves {total} valence electrons in the cell, too few for a bond", mend="lower the charge"
        )
    if not 0 <= unpaired <= total or (electrons.unpaired is not None and (total - unpaired) % 2):
        parity = "odd" if total % 2 else "even"
        raise ElectronCountError(
            f"{total} valence electrons in the cell cannot have {unpaired} unpaired",
            mend=f"give an {parity} number of unpaired electrons from {total % 2} to {total}",
        )
    if electrons.by_spin[0] > n_bands:
        raise ElectronCountError(
            f"{electrons.by_spin[0]:g} electrons of one spin do not fit into {n_bands} bands",
            mend="raise the charge or lower the unpaired electrons",
        )


def _whole_levels(energies: FloatArray, weights: FloatArray, count: float) -> tuple[FloatArray, float] | None:
    """Occupations and Fermi level of one spin if it fills whole levels below a gap."""
    order = np.argsort(energies, axis=None)
    levels = energies.ravel()[order]
    held = np.cumsum(np.repeat(weights, energies.shape[1])[order])
    filled = int(np.searchsorted(held, count - _EXACT, side="left")) + 1 if count > _EXACT else 0
    if filled and abs(held[filled - 1] - count) > _EXACT:
        return None
    if 0 < filled < len(levels):
        if levels[filled] - levels[filled - 1] <= SHARP_GAP_EV:
            return None
        level = (levels[filled] + levels[filled - 1]) / 2
    else:
        level = levels[-1] + SHARP_GAP_EV if filled else levels[0] - SHARP_GAP_EV
    return (energies < level).astype(np.float64), float(level)


def _smeared(energies: FloatArray, weights: FloatArray, count: float, width: float) -> tuple[FloatArray, float]:
    """Fermi-Dirac occupations that hold the electrons of one spin, by bisection of the Fermi level."""
    low, high = float(energies.min()) - 50 * width, float(energies.max()) + 50 * width
    for _ in range(100):
        level = (low + high) / 2
        occupations: FloatArray = 0.5 - 0.5 * np.tanh((energies - level) / (2 * width))
        if weights @ occupations.sum(axis=1) < count:
            low = level
        else:
            high = level
    return occupations, level
