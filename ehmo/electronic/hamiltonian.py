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
    h = basis.type_h_ii_eV
    mean = (h[:, None] + h) / 2
    # K' is linear in K: what multiplies K S and what multiplies S alone depend on the two shell types only.
    with_K, alone = mean, np.zeros_like(mean)
    if weighting:
        squared = ((h[:, None] - h) / (h[:, None] + h)) ** 2
        with_K, alone = mean * (1 - squared**2), mean * (squared + squared**2)
    kinds = basis.type_of[:, None], basis.type_of
    if scaled_overlap is None:
        hamiltonian: FloatArray = overlap * (K * with_K + alone)[kinds]
    else:
        hamiltonian = scaled_overlap * with_K[kinds] + overlap * alone[kinds]
    np.fill_diagonal(hamiltonian, h[basis.type_of])
    return hamiltonian
