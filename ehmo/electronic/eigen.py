"""Generalised symmetric eigenproblem H C = S C E."""

from __future__ import annotations

import numpy as np
from scipy.linalg import lapack

from ehmo.conventions import atom_label
from ehmo.errors import OverlapError
from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.electronic import OverlapSpectrum

SMALLEST_OVERLAP_EIGENVALUE = 1e-7
"""Below this the functions count as linearly dependent."""


def solve(hamiltonian: FloatArray, overlap: FloatArray, basis: Basis) -> tuple[FloatArray, FloatArray]:
    """Orbital energies and coefficients, lowest first.

    Parameters
    ----------
    hamiltonian, overlap : (n_ao, n_ao) ndarray
        Symmetric; left as they are.
    basis : Basis
        Names the functions if the overlap matrix is singular.

    Returns
    -------
    energies : (n_ao,) ndarray
        Orbital energies [eV].
    coefficients : (n_ao, n_ao) ndarray
        Column k is orbital k, with C^T S C = 1.

    Raises
    ------
    OverlapError
        If the overlap matrix is not positive definite.
    """
    # The transpose of a C-ordered symmetric matrix is itself in the order LAPACK wants: no copy but LAPACK's own.
    energies, vectors, info = lapack.dsygvd(hamiltonian.T, overlap.T, uplo="L")
    if info:
        overlap_spectrum(overlap, basis)
        raise OverlapError(
            f"the eigensolver failed (LAPACK dsygvd, info {info})",
            mend="check the geometry for atoms too close together",
        )
    return energies, vectors


def overlap_spectrum(overlap: FloatArray, basis: Basis) -> OverlapSpectrum:
    """Eigen-decomposition of the overlap matrix, refused if functions are linearly dependent.

    Parameters
    ----------
    overlap : (n_ao, n_ao) ndarray
        S.
    basis : Basis
        Names the functions in the message.

    Returns
    -------
    spectrum : OverlapSpectrum

    Raises
    ------
    OverlapError
        If the smallest eigenvalue is below `SMALLEST_OVERLAP_EIGENVALUE`.
    """
    eigenvalues, vectors = np.linalg.eigh(overlap)
    if eigenvalues[0] < SMALLEST_OVERLAP_EIGENVALUE:
        names = ", ".join(
            f"{basis.function_label(int(i))} of {atom_label(basis.symbols[basis.atom_of[i]], int(basis.atom_of[i]))}"
            for i in np.argsort(-np.abs(vectors[:, 0]))[:3]
        )
        raise OverlapError(
            f"the basis functions are linearly dependent (smallest overlap eigenvalue {eigenvalues[0]:.1e}, "
            f"mostly {names})",
            mend="check that these atoms are not too close, or use a set with tighter exponents",
        )
    return OverlapSpectrum(overlap, eigenvalues, vectors)
