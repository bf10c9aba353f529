"""Mulliken populations taken apart: by shell of each orbital, and by irrep."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.electronic import ElectronicState


def orbital_shell_shares(state: ElectronicState, overlap: FloatArray, basis: Basis) -> FloatArray:
    """Share of each shell in each orbital, by gross population.

    Parameters
    ----------
    state : ElectronicState
        Orbitals.
    overlap : (n_ao, n_ao) ndarray
        S.
    basis : Basis
        Functions.

    Returns
    -------
    shares : (n_shells, n_mo) ndarray
        Columns add up to 1; small negative shares are possible.

    References
    ----------
    .. [1] mulliken-1955: R. S. Mulliken, J. Chem. Phys. 23, 1833 (1955).
    """
    gross = state.coefficients * (overlap @ state.coefficients)
    shares: FloatArray = np.add.reduceat(gross, basis.shell_start, axis=0)
    return shares


def sums_by_irrep(values: FloatArray, irreps: Sequence[str]) -> dict[str, FloatArray]:
    """Sums over the orbitals of each irrep.

    Parameters
    ----------
    values : (..., n_mo) ndarray
        What each orbital adds, such as shares or overlap populations times its electrons.
    irreps : sequence of str
        Label of each orbital; an empty one stands for orbitals without a label.

    Returns
    -------
    sums : dict of str to (...) ndarray
        In the order in which the irreps appear.

    Examples
    --------
    >>> {irrep: float(total) for irrep, total in sums_by_irrep(np.array([2.0, 2.0, 1.0]), ("a1", "e", "e")).items()}
    {'a1': 2.0, 'e': 3.0}
    """
    names = np.array(irreps)
    return {irrep: values[..., names == irrep].sum(axis=-1) for irrep in dict.fromkeys(irreps)}
