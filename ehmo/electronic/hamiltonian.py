"""Wolfsberg-Helmholz Hamiltonian from an overlap matrix."""

from __future__ import annotations

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis


def wolfsberg_helmholz(
    basis: Basis,
    overlap: FloatArray,
    K: float,
    *,
    weighting: bool = True,
    scaled_overlap: FloatArray | None = None,
) -> FloatArray:
    """Hamiltonian of fixed diagonal elements.

    H_ij = K' S_ij (H_ii + H_jj)/2 with, if weighted, K' = K + D^2 + D^4 (1 - K), D = (H_ii - H_jj)/(H_ii + H_jj).

    Parameters
    ----------
    basis : Basis
        Functions with their diagonal elements.
    overlap : (n_ao, n_ao) ndarray
        Overlap matrix S.
    K : float
        Wolfsberg-Helmholz constant.
    weighting : bool
        Whether K is weighted against counter-intuitive mixing.
    scaled_overlap : (n_ao, n_ao) ndarray, optional
        K S with K of each channel and distance; replaces `K` times `overlap`.

    Returns
    -------
    hamiltonian : (n_ao, n_ao) ndarray
        Symmetric [eV].

    References
    ----------
    .. [1] wolfsberg-1952: M. Wolfsberg, L. Helmholz, J. Chem. Phys. 20, 837 (1952).
    .. [2] hoffmann-1963: R. Hoffmann, J. Chem. Phys. 39, 1397 (1963).
    .. [3] ammeter-1978: J. H. Ammeter, H.-B. Bürgi, J. C. Thibeault, R. Hoffmann, J. Am. Chem. Soc. 100, 3686 (1978).
    """
    with_K, alone = shell_factors(basis, weighting)
    kinds = basis.type_of[:, None], basis.type_of
    if scaled_overlap is None:
        hamiltonian: FloatArray = overlap * (K * with_K + alone)[kinds]
    else:
        hamiltonian = scaled_overlap * with_K[kinds] + overlap * alone[kinds]
    np.fill_diagonal(hamiltonian, basis.type_h_ii_eV[basis.type_of])
    return hamiltonian


def shell_factors(basis: Basis, weighting: bool) -> tuple[FloatArray, FloatArray]:
    """What multiplies K S and what multiplies S alone, by shell types: K' is linear in K.

    Parameters
    ----------
    basis : Basis
        Functions with their diagonal elements.
    weighting : bool
        Whether K is weighted.

    Returns
    -------
    with_K, alone : (n_types, n_types) ndarray
        H_ij = with_K K S_ij + alone S_ij [eV].
    """
    return type_factors(basis.type_h_ii_eV, weighting)


def type_factors(h_ii_eV: FloatArray, weighting: bool) -> tuple[FloatArray, FloatArray]:
    """`shell_factors` of given diagonal elements (..., n_types), one set or a stack of them."""
    rows, columns = h_ii_eV[..., :, None], h_ii_eV[..., None, :]
    mean = (rows + columns) / 2
    if not weighting:
        return mean, np.zeros_like(mean)
    squared = ((rows - columns) / (rows + columns)) ** 2
    return mean * (1 - squared**2), mean * (squared + squared**2)
