"""What the energy's derivative weighs the overlaps with, and the parts of the energy that no overlap carries."""

from __future__ import annotations

import numpy as np

from ehmo.electronic.charges import mulliken_charges
from ehmo.electronic.hamiltonian import shell_factors
from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.electronic import ElectronicState
from ehmo.units import COULOMB_EV_A


def overlap_weights(
    state: ElectronicState, basis: Basis, potential_eV: FloatArray | None, *, weighting: bool
) -> tuple[FloatArray, FloatArray]:
    """Weights of dS and of d(K S) in the derivative of the energy.

    The energy is variational, so that only the matrices move: dE = sum P dH0 + sum P dS (V_A + V_B)/2 - sum W dS with
    the energy-weighted density W, and H0 = with_K (K S) + alone S.

    Parameters
    ----------
    state : ElectronicState
        Orbitals and filling.
    basis : Basis
        Functions.
    potential_eV : (n_atoms,) ndarray or None
        Potential of the charges; None for fixed charges [eV].
    weighting : bool
        Whether K is weighted.

    Returns
    -------
    plain, scaled : (n_ao, n_ao) ndarray
        [eV]

    References
    ----------
    .. [1] pulay-1969: P. Pulay, Mol. Phys. 17, 197 (1969).
    """
    filling = state.occupations.sum(axis=0)
    last = int(filling.nonzero()[0][-1]) + 1
    occupied, held = state.coefficients[:, :last], filling[:last]
    density = density_matrix(state)
    with_K, alone = shell_factors(basis, weighting)
    kinds = basis.type_of[:, None], basis.type_of
    factors = alone[kinds]
    if potential_eV is not None:
        half = 0.5 * potential_eV[basis.atom_of]
        factors = factors + (half[:, None] + half)
    plain = density * factors
    plain -= (occupied * (held * state.energies_eV[:last])) @ occupied.T
    return plain, density * with_K[kinds]


def density_matrix(state: ElectronicState) -> FloatArray:
    """(n_ao, n_ao) density P of both spins [e]."""
    filling = state.occupations.sum(axis=0)
    last = int(filling.nonzero()[0][-1]) + 1
    occupied = state.coefficients[:, :last]
    density: FloatArray = (occupied * filling[:last]) @ occupied.T
    return density


def dipole_moment(state: ElectronicState, basis: Basis, positions_A: FloatArray, dipoles: FloatArray) -> FloatArray:
    """Dipole moment of cores and electrons about the origin.

    Parameters
    ----------
    state : ElectronicState
        Orbitals and filling.
    basis : Basis
        Functions.
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].
    dipoles : (3, n_ao, n_ao) ndarray
        Dipole integrals [angstrom].

    Returns
    -------
    moment : (3,) ndarray
        From negative to positive; it moves with the origin for an ion [e angstrom].
    """
    moment: FloatArray = basis.core_charges @ positions_A - np.tensordot(dipoles, density_matrix(state), axes=2)
    return moment


def state_charges(state: ElectronicState, overlap: FloatArray, basis: Basis) -> FloatArray:
    """(n_atoms,) Mulliken charges of a state [e]."""
    return mulliken_charges(state.coefficients, overlap, state.occupations.sum(axis=0), basis)


def interaction_gradient(
    positions_A: FloatArray, interaction_eV: FloatArray, charges: FloatArray, weight: float
) -> FloatArray:
    """Derivative of (1/2) sum_AB lambda gamma_AB q_A q_B by the positions at fixed charges.

    Parameters
    ----------
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].
    interaction_eV : (n_atoms, n_atoms) ndarray
        lambda gamma, see `charge_interaction` [eV].
    charges : (n_atoms,) ndarray
        q [e].
    weight : float
        lambda.

    Returns
    -------
    gradient : (n_atoms, 3) ndarray
        [eV/angstrom]
    """
    if not weight:
        return np.zeros_like(positions_A)
    # gamma = e^2 (R^2 + a^2)^(-1/2), so its derivative by R^2 is -gamma^3/(2 e^4).
    pull = interaction_eV**3 * (-1 / (weight * COULOMB_EV_A) ** 2) * np.outer(charges, charges)
    gradient: FloatArray = pull.sum(axis=1)[:, None] * positions_A - pull @ positions_A
    return gradient


def smearing_entropy_eV(state: ElectronicState) -> float:
    """-T S of a smeared filling; 0 for whole electrons [eV].

    References
    ----------
    .. [1] mermin-1965: N. D. Mermin, Phys. Rev. 137, A1441 (1965).
    """
    if not state.smearing_eV:
        return 0.0
    held = state.occupations[(state.occupations > 0) & (state.occupations < 1)]
    return float(state.smearing_eV * (held * np.log(held) + (1 - held) * np.log1p(-held)).sum())
