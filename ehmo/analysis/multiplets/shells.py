"""Open shells that have terms, and their ligand field in wavenumbers."""

from __future__ import annotations

import numpy as np

from ehmo.conventions import SHELL_LETTERS
from ehmo.errors import MultipletError
from ehmo.records.arrays import FloatArray
from ehmo.records.multiplets import ElectronRepulsion
from ehmo.units import PER_CM_PER_EV

MOST_F_ELECTRONS = 3
"""Largest number of f electrons (or holes) that is treated."""


def check_shell(l: int, n_electrons: int) -> None:
    """Refuse shells without terms, or with more than are computed.

    Parameters
    ----------
    l : int
        2 or 3.
    n_electrons : int

    Raises
    ------
    MultipletError
        For an empty or full shell, an impossible count, and f4 to f10.
    """
    capacity = 2 * (2 * l + 1)
    name = f"{SHELL_LETTERS[l]}{n_electrons}"
    if l not in (2, 3):
        raise MultipletError(f"terms are computed for d and f shells, not for {name}")
    if not 0 <= n_electrons <= capacity:
        raise MultipletError(f"a {SHELL_LETTERS[l]} shell holds 0 to {capacity} electrons, not {n_electrons}")
    if n_electrons in (0, capacity):
        state = "full" if n_electrons else "empty"
        raise MultipletError(f"{name} has no terms: the shell is {state}, the ground state is a closed-shell singlet")
    if l == 3 and MOST_F_ELECTRONS < n_electrons < capacity - MOST_F_ELECTRONS:
        raise MultipletError(
            f"terms of {name} are not computed, only those of f1 to f{MOST_F_ELECTRONS} and their hole counterparts",
            mend="the ladder of the seven f levels is given instead",
        )


def slater_vector(l: int, n_electrons: int, repulsion: ElectronRepulsion | None) -> FloatArray:
    """F^2, F^4, (F^6) as an array.

    Parameters
    ----------
    l, n_electrons : int
    repulsion : ElectronRepulsion or None
        None is enough for one electron or one hole.

    Returns
    -------
    integrals : (l,) ndarray
        [cm^-1].

    Raises
    ------
    MultipletError
        If the repulsion is needed and missing.
    """
    if repulsion is None:
        if 1 < n_electrons < 4 * l + 1:
            name = f"{SHELL_LETTERS[l]}{n_electrons}"
            raise MultipletError(f"terms of {name} need the repulsion between its electrons", mend="give B and C")
        return np.zeros(l)
    return np.array([repulsion.F2_per_cm, repulsion.F4_per_cm, repulsion.F6_per_cm])[:l]


def field_per_cm(ligand_field_eV: FloatArray) -> FloatArray:
    """Ligand field from its barycentre, in wavenumbers.

    Parameters
    ----------
    ligand_field_eV : (2l+1, 2l+1) ndarray
        Real and symmetric [eV].

    Returns
    -------
    field : (2l+1, 2l+1) ndarray
        Traceless [cm^-1].

    Raises
    ------
    ValueError
        If the matrix is not 5 x 5 or 7 x 7, not finite or not symmetric.
    """
    field = np.asarray(ligand_field_eV, dtype=np.float64) * PER_CM_PER_EV
    if field.shape not in ((5, 5), (7, 7)):
        raise ValueError(f"ligand field has shape {field.shape}, expected (5, 5) or (7, 7)")
    if not np.isfinite(field).all():
        raise ValueError("ligand field holds numbers that are not finite")
    scale = float(np.abs(field).max())
    if np.abs(field - field.T).max() > 1e-8 * scale:
        raise ValueError("ligand field is not symmetric")
    centred: FloatArray = (field + field.T) / 2 - np.trace(field) / len(field) * np.eye(len(field))
    return centred
