"""Many calculations at one geometry at once: Hamiltonians, charges and orbitals of a stack of parameter draws.

All matrices are in the Löwdin basis of their own overlap matrix, where the eigenproblem is an ordinary one and numpy
solves a whole stack in one call. The charges start from those of one solved calculation and follow Newton's rule with
its response, corrected by Broyden's update for each draw.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ehmo.electronic.charges import CHARGE_TOLERANCE, ElectronCount
from ehmo.electronic.hamiltonian import type_factors
from ehmo.electronic.occupation import fill, fill_smeared
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.electronic import ElectronicState

BoolArray = NDArray[np.bool_]

_LARGEST_STEP = 0.5  # [e]
_BLOCK = 4_000_000  # numbers in one block of transition charges
_SMALLEST = 1e-300


@dataclass(frozen=True, slots=True, eq=False)
class Metric:
    """S and its square roots: one for all draws (n_ao, n_ao), or one for each (n_draws, n_ao, n_ao)."""

    overlap: FloatArray
    half: FloatArray
    inverse_half: FloatArray

    @classmethod
    def of(cls, overlap: FloatArray, eigenvalues: FloatArray, vectors: FloatArray) -> Metric:
        """Square roots from the eigen-decomposition of S."""
        roots = np.sqrt(eigenvalues)[..., None, :]
        mirrored = vectors.swapaxes(-1, -2)
        return cls(overlap, (vectors * roots) @ mirrored, (vectors / roots) @ mirrored)

    def chosen(self, draws: IntArray | BoolArray) -> Metric:
        """The same for some of the draws."""
        if self.overlap.ndim == 2 or (draws.dtype == bool and draws.all()):
            return self
        return Metric(self.overlap[draws], self.half[draws], self.inverse_half[draws])


@dataclass(frozen=True, slots=True, eq=False)
class StackedStates:
    """Orbitals and charges of a stack of draws.

    Attributes
    ----------
    energies_eV : (n_draws, n_mo) ndarray
        Ascending [eV].
    vectors : (n_draws, n_ao, n_mo) ndarray
        Orbitals in the Löwdin basis, S^(1/2) C.
    occupations : (n_draws, 2, n_mo) ndarray
    charges : (n_draws, n_atoms) ndarray
        Mulliken [e].
    settled : (n_draws,) ndarray of bool
        Whether the charges reproduce themselves; the other rows hold NaN.
    iterations : (n_draws,) ndarray of int
        Diagonalisations.
    """

    energies_eV: FloatArray
    vectors: FloatArray
    occupations: FloatArray
    charges: FloatArray
    settled: BoolArray
    iterations: IntArray


def stacked_hamiltonians(
    basis: Basis,
    h_ii_eV: FloatArray,
    overlap: FloatArray,
    K: FloatArray,
    *,
    weighting: bool,
    scaled_overlap: FloatArray | None = None,
) -> FloatArray:
    """Wolfsberg-Helmholz Hamiltonians of a stack of draws; see `wolfsberg_helmholz`.

    Parameters
    ----------
    basis : Basis
        Functions.
    h_ii_eV : (n_draws, n_types) ndarray
        Diagonal elements of the shell types [eV].
    overlap : (n_draws, n_ao, n_ao) or (n_ao, n_ao) ndarray
        S.
    K : (n_draws,) ndarray
        Wolfsberg-Helmholz constant.
    weighting : bool
        Whether K is weighted.
    scaled_overlap : (n_draws, n_ao, n_ao) ndarray, optional
        K S with K of each channel and distance; replaces `K` times `overlap`.

    Returns
    -------
    hamiltonians : (n_draws, n_ao, n_ao) ndarray
        [eV].
    """
    with_K, alone = type_factors(h_ii_eV, weighting)
    kinds = basis.type_of[:, None], basis.type_of
    hamiltonians: FloatArray
    if scaled_overlap is None:
        hamiltonians = overlap * (K[:, None, None] * with_K + alone)[:, *kinds]
    else:
        hamiltonians = scaled_overlap * with_K[:, *kinds] + overlap * alone[:, *kinds]
    places = np.arange(len(basis))
    hamiltonians[:, places, places] = h_ii_eV[:, basis.type_of]
    return hamiltonians


def charge_response(state: ElectronicState, overlap: FloatArray, basis: Basis) -> FloatArray:
    """Change of the gross populations with the potentials of the atoms, at fixed filling.

    Parameters
    ----------
    state : ElectronicState
        Solved calculation.
    overlap : (n_ao, n_ao) ndarray
        S.
    basis : Basis
        Functions.

    Returns
    -------
    response : (n_atoms, n_atoms) ndarray
        d(gross population of A)/d(potential of B), first order [e/eV].

    Notes
    -----
    2 sum over i < a of (f_i - f_a)/(e_i - e_a) T^A_ia T^B_ia with the transition charges T^A_ia =
    sum over the functions m of A of (C_mi (SC)_ma + C_ma (SC)_mi)/2.
    """
    C, energies, filling = state.coefficients, state.energies_eV, state.occupations.sum(axis=0)
    SC = overlap @ C
    starts, n_atoms = basis.atom_start[:-1], len(basis.symbols)
    response = np.zeros((n_atoms, n_atoms))
    holding = int(filling.nonzero()[0][-1]) + 1
    step = max(1, _BLOCK // (len(basis) * len(basis)))
    for first in range(0, holding, step):
        lower = np.arange(first, min(first + step, holding))
        pairs = (filling[lower, None] != filling) & (lower[:, None] < np.arange(len(energies)))
        i, a = np.nonzero(pairs)
        i = lower[i]
        products = C[:, i] * SC[:, a] + C[:, a] * SC[:, i]
        transition = np.add.reduceat(products, starts, axis=0) / 2
        factor = 2 * (filling[i] - filling[a]) / (energies[i] - energies[a])
        response += (transition * factor) @ transition.T
    return response


def settled_charges(
    hamiltonians: FloatArray,
    metric: Metric,
    basis: Basis,
    electrons: ElectronCount,
    interactions_eV: FloatArray | None,
    start: FloatArray,
    response: FloatArray | None,
    *,
    smearing_eV: float = 0.0,
    limit: int = 50,
    tolerance: float = CHARGE_TOLERANCE,
) -> StackedStates:
    """Orbitals of a stack of Hamiltonians, each in the potential of the charges that it gives.

    Parameters
    ----------
    hamiltonians : (n_draws, n_ao, n_ao) ndarray
        H0 in the basis functions [eV].
    metric : Metric
        Overlap matrix and its roots.
    basis : Basis
        Functions.
    electrons : ElectronCount
        Electrons to fill in.
    interactions_eV : (n_draws, n_atoms, n_atoms) ndarray or None
        lambda gamma of each draw; None for fixed charges [eV].
    start : (n_atoms,) ndarray
        Charges of a solved calculation nearby [e].
    response : (n_atoms, n_atoms) ndarray or None
        Its `charge_response` [e/eV]; None for fixed charges.
    smearing_eV : float
        Width of the filling, 0 for whole electrons [eV].
    limit : int
        Diagonalisations allowed.
    tolerance : float
        Largest change of a charge at convergence [e].

    Returns
    -------
    states : StackedStates

    References
    ----------
    .. [1] broyden-1965: C. G. Broyden, Math. Comput. 19, 577 (1965).
    """
    n_draws, n_ao = hamiltonians.shape[:2]
    n_atoms = len(basis.symbols)
    bare = metric.inverse_half @ hamiltonians @ metric.inverse_half
    if interactions_eV is None or response is None:
        found = _solve(bare, metric, basis, electrons, smearing_eV)
        every, once = np.ones(n_draws, dtype=bool), np.ones(n_draws, dtype=np.intp)
        return StackedStates(found.energies, found.vectors, found.occupations, found.charges, every, once)
    result = StackedStates(
        np.full((n_draws, n_ao), np.nan),
        np.full((n_draws, n_ao, n_ao), np.nan),
        np.full((n_draws, 2, n_ao), np.nan),
        np.full((n_draws, n_atoms), np.nan),
        np.zeros(n_draws, dtype=bool),
        np.zeros(n_draws, dtype=np.intp),
    )
    search = _ChargeSearch(start, response, interactions_eV)
    active = np.arange(n_draws)
    for _ in range(limit):
        own = metric if len(active) == n_draws else metric.chosen(active)
        half = np.take(search.potentials() / 2, basis.atom_of, axis=1)
        shift = (own.half * half[:, None, :]) @ own.inverse_half
        found = _solve(bare[active] + shift + shift.swapaxes(1, 2), own, basis, electrons, smearing_eV)
        result.iterations[active] += 1
        done = search.largest_change(found.charges) < tolerance
        _keep(result, active[done], done, found)
        active = active[~done]
        if not len(active):
            break
        search.move(found.charges, ~done)
    return result


class _ChargeSearch:
    """Charges of the draws still open, with the inverse Jacobian of each by Broyden's good update."""

    def __init__(self, start: FloatArray, response: FloatArray, interactions_eV: FloatArray) -> None:
        # Potential and gross population each bring a minus sign.
        jacobian = response @ interactions_eV
        self._inverse = np.linalg.inv(np.eye(len(start)) - jacobian)
        self._interactions = interactions_eV
        self._charges = np.tile(start, (len(interactions_eV), 1))
        self._residual: FloatArray | None = None
        self._step: FloatArray | None = None

    def potentials(self) -> FloatArray:
        """-lambda sum gamma q of each draw [eV]."""
        potentials: FloatArray = -(self._interactions @ self._charges[:, :, None])[:, :, 0]
        return potentials

    def largest_change(self, image: FloatArray) -> FloatArray:
        """Largest difference of the charges from those that they give."""
        largest: FloatArray = np.abs(image - self._charges).max(axis=1)
        return largest

    def move(self, image: FloatArray, kept: BoolArray) -> None:
        """Drop the draws that are done and take one step with the others."""
        residual = (image - self._charges)[kept]
        self._charges, self._inverse = self._charges[kept], self._inverse[kept]
        self._interactions = self._interactions[kept]
        if self._residual is not None and self._step is not None:
            step, change = self._step[kept], residual - self._residual[kept]
            moved = (self._inverse @ change[:, :, None])[:, :, 0]
            row = (step[:, None, :] @ self._inverse)[:, 0]
            scale = (row * change).sum(axis=1)
            scale = np.where(np.abs(scale) < _SMALLEST, np.inf, scale)
            self._inverse = self._inverse - (step + moved)[:, :, None] * (row / scale[:, None])[:, None, :]
        step = (self._inverse @ residual[:, :, None])[:, :, 0]
        step *= np.minimum(1, _LARGEST_STEP / np.maximum(np.abs(step).max(axis=1), _SMALLEST))[:, None]
        self._charges = self._charges + step
        self._residual, self._step = residual, step


@dataclass(frozen=True, slots=True, eq=False)
class _Solution:
    energies: FloatArray
    vectors: FloatArray
    occupations: FloatArray
    charges: FloatArray


def _solve(
    matrices: FloatArray, metric: Metric, basis: Basis, electrons: ElectronCount, smearing_eV: float
) -> _Solution:
    energies, vectors = np.linalg.eigh(matrices)
    if smearing_eV:
        filled = [fill_smeared(row, electrons.total, electrons.unpaired, smearing_eV) for row in energies]
    else:
        filled = [fill(row, electrons.total, electrons.unpaired) for row in energies]
    occupations = np.array(filled)
    filling = occupations.sum(axis=1)
    holding = int(filling.any(axis=0).nonzero()[0][-1]) + 1
    occupied = vectors[:, :, :holding]
    products = (metric.inverse_half @ occupied) * (metric.half @ occupied)
    gross = (products @ filling[:, :holding, None])[:, :, 0]
    charges = basis.core_charges - np.add.reduceat(gross, basis.atom_start[:-1], axis=1)
    return _Solution(energies, vectors, occupations, charges)


def _keep(result: StackedStates, draws: IntArray, chosen: BoolArray, found: _Solution) -> None:
    result.energies_eV[draws] = found.energies[chosen]
    result.vectors[draws] = found.vectors[chosen]
    result.occupations[draws] = found.occupations[chosen]
    result.charges[draws] = found.charges[chosen]
    result.settled[draws] = True
