"""Filling of orbitals: aufbau, Pauli, and equal shares within degenerate sets."""

from __future__ import annotations

import numpy as np

from ehmo.conventions import DEGENERACY_TOLERANCE_EV
from ehmo.errors import ElectronCountError
from ehmo.records.arrays import FloatArray


def fill(energies_eV: FloatArray, n_electrons: int, unpaired: int) -> FloatArray:
    """Occupation of every orbital by alpha and by beta electrons.

    Both spins use the same orbitals. Where a spin runs out of electrons within a degenerate set, the set shares
    them evenly, so that rounding never breaks the symmetry.

    Parameters
    ----------
    energies_eV : (n_mo,) ndarray
        Ascending orbital energies [eV].
    n_electrons, unpaired : int
        All electrons, and alpha minus beta.

    Returns
    -------
    occupations : (2, n_mo) ndarray
        Alpha, beta; each between 0 and 1.

    Raises
    ------
    ElectronCountError
        If the electrons do not fit.
    """
    n_alpha = _alpha_electrons(len(energies_eV), n_electrons, unpaired)
    occupations = np.zeros((2, len(energies_eV)))
    _fill_spin(occupations[0], energies_eV, n_alpha)
    if unpaired:
        _fill_spin(occupations[1], energies_eV, n_alpha - unpaired)
    else:
        occupations[1] = occupations[0]
    return occupations


def fill_smeared(energies_eV: FloatArray, n_electrons: int, unpaired: int, width_eV: float) -> FloatArray:
    """Occupation by the Fermi-Dirac distribution, alpha and beta each at its own Fermi level.

    Parameters
    ----------
    energies_eV : (n_mo,) ndarray
        Ascending orbital energies [eV].
    n_electrons, unpaired : int
        All electrons, and alpha minus beta.
    width_eV : float
        k T of the distribution [eV].

    Returns
    -------
    occupations : (2, n_mo) ndarray
        Alpha, beta; each between 0 and 1.

    Raises
    ------
    ElectronCountError
        If the electrons do not fit.

    References
    ----------
    .. [1] mermin-1965: N. D. Mermin, Phys. Rev. 137, A1441 (1965).
    """
    n_alpha = _alpha_electrons(len(energies_eV), n_electrons, unpaired)
    return np.stack([_smeared_spin(energies_eV, n, width_eV) for n in (n_alpha, n_alpha - unpaired)])


def _smeared_spin(energies: FloatArray, n_electrons: int, width: float) -> FloatArray:
    """Fermi-Dirac occupations that add up to the electrons, by bisection of the Fermi level."""
    if n_electrons in (0, len(energies)):
        return np.full(len(energies), float(n_electrons > 0))
    low, high = energies[0] - 50 * width, energies[-1] + 50 * width
    for _ in range(100):
        level = (low + high) / 2
        occupation: FloatArray = 0.5 - 0.5 * np.tanh((energies - level) / (2 * width))
        if occupation.sum() < n_electrons:
            low = level
        else:
            high = level
    return occupation


def _alpha_electrons(n_orbitals: int, n_electrons: int, unpaired: int) -> int:
    """Alpha electrons, after checking that all electrons fit."""
    if n_electrons < 1:
        raise ElectronCountError(
            f"the charge leaves {n_electrons} valence electrons, too few for a bond", mend="lower the charge"
        )
    if (n_electrons - unpaired) % 2 or not 0 <= unpaired <= n_electrons:
        parity = "odd" if n_electrons % 2 else "even"
        raise ElectronCountError(
            f"{n_electrons} valence electrons cannot have {unpaired} unpaired",
            mend=f"give an {parity} number of unpaired electrons from {n_electrons % 2} to {n_electrons}, "
            "or another charge",
        )
    n_alpha = (n_electrons + unpaired) // 2
    if n_alpha > n_orbitals:
        raise ElectronCountError(
            f"{n_alpha} electrons of one spin do not fit into {n_orbitals} orbitals",
            mend="raise the charge or lower the unpaired electrons",
        )
    return n_alpha


def _fill_spin(occupation: FloatArray, energies: FloatArray, n_electrons: int) -> None:
    if n_electrons == 0:
        return
    first, stop = frontier_set(energies, n_electrons - 1, DEGENERACY_TOLERANCE_EV)
    occupation[:first] = 1.0
    occupation[first:stop] = (n_electrons - first) / (stop - first)


def frontier_set(energies: FloatArray, index: int, tolerance: float) -> tuple[int, int]:
    """Range [first, stop) of levels joined to one level by gaps below the tolerance."""
    first, stop = index, index + 1
    while first > 0 and energies[first] - energies[first - 1] < tolerance:
        first -= 1
    while stop < len(energies) and energies[stop] - energies[stop - 1] < tolerance:
        stop += 1
    return first, stop
