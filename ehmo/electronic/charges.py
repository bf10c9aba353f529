"""Fixed and self-consistent charges.

The potential of the charges shifts the diagonal elements, and with them the off-diagonal ones:
H_ij = H0_ij + S_ij (V_A + V_B)/2 with V_A = -lambda sum_B gamma_AB q_B. The energy
Tr(P H0) + (lambda/2) sum_AB gamma_AB q_A q_B is variational with exactly this H.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ehmo.electronic.eigen import solve
from ehmo.electronic.mixing import AndersonMixer
from ehmo.electronic.occupation import fill, fill_smeared
from ehmo.errors import ConvergenceError
from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.electronic import ElectronicState
from ehmo.units import COULOMB_EV_A

CHARGE_TOLERANCE = 1e-8
"""Largest change of a charge at convergence [e]."""

SHARP_ITERATIONS = 50
"""Diagonalisations with whole electrons: two and a half times what any species of the tests needs."""

SMEARING_EV = 0.02
"""Width of the Fermi-Dirac filling that takes over where levels cross as the charges settle [eV]."""

SMEARED_DAMPING = 0.06
"""Share of the residual in the next charges under that filling: a level that distant atoms share answers a potential by
U / (4 width), some fifty times the step, and larger shares overshoot."""


@dataclass(frozen=True, slots=True)
class ElectronCount:
    """Valence electrons of the fragment and how many of them are unpaired."""

    total: int
    unpaired: int


def fixed_charges(
    hamiltonian: FloatArray, overlap: FloatArray, basis: Basis, electrons: ElectronCount
) -> ElectronicState:
    """Orbitals of the Hamiltonian as it stands.

    Parameters
    ----------
    hamiltonian, overlap : (n_ao, n_ao) ndarray
        H0 [eV] and S.
    basis : Basis
        Functions.
    electrons : ElectronCount
        Electrons to fill in.

    Returns
    -------
    state : ElectronicState
    """
    energies, coefficients = solve(hamiltonian, overlap, basis)
    occupations = fill(energies, electrons.total, electrons.unpaired)
    energy = float(energies @ occupations.sum(axis=0))
    return ElectronicState(energies, coefficients, occupations, energy, "fixed", 1, 0.0)


def self_consistent_charges(
    hamiltonian: FloatArray,
    overlap: FloatArray,
    basis: Basis,
    electrons: ElectronCount,
    interaction_eV: FloatArray,
    *,
    max_iterations: int = 100,
) -> ElectronicState:
    """Orbitals in the potential of the charges that they give.

    Parameters
    ----------
    hamiltonian, overlap : (n_ao, n_ao) ndarray
        H0 [eV] and S.
    basis : Basis
        Functions.
    electrons : ElectronCount
        Electrons to fill in.
    interaction_eV : (n_atoms, n_atoms) ndarray
        lambda gamma, see `charge_interaction` [eV].
    max_iterations : int
        Diagonalisations allowed. If `SHARP_ITERATIONS` of them do not settle the charges, levels cross at the
        frontier: the rest is spent with the filling smeared by `SMEARING_EV`, which the state tells.

    Returns
    -------
    state : ElectronicState

    Raises
    ------
    ConvergenceError
        If the charges still change by more than `CHARGE_TOLERANCE`.
    """
    run = _ChargeIteration(hamiltonian, overlap, basis, electrons, interaction_eV)
    state = run.settle(0.0, min(SHARP_ITERATIONS, max_iterations))
    if state is None and max_iterations > SHARP_ITERATIONS:
        state = run.settle(SMEARING_EV, max_iterations)
    if state is None:
        raise ConvergenceError(
            f"the charges still change by {run.residual:.1e} e after {max_iterations} iterations",
            mend="try another number of unpaired electrons, or --charges fixed",
        )
    return state


class _ChargeIteration:
    """The iteration with its current charges: sharp filling first, smeared filling if levels cross."""

    def __init__(
        self,
        hamiltonian: FloatArray,
        overlap: FloatArray,
        basis: Basis,
        electrons: ElectronCount,
        interaction_eV: FloatArray,
    ) -> None:
        self._hamiltonian = hamiltonian
        self._overlap = overlap
        self._basis = basis
        self._electrons = electrons
        self._interaction = interaction_eV
        self._charges = np.zeros(len(basis.symbols))
        self.iterations = 0
        self.residual = np.inf

    def settle(self, smearing_eV: float, limit: int) -> ElectronicState | None:
        """State whose charges reproduce themselves; None once `limit` diagonalisations are spent in all."""
        basis, electrons = self._basis, self._electrons
        mixer = (
            AndersonMixer(self._charges, damping=SMEARED_DAMPING, depth=8)
            if smearing_eV
            else AndersonMixer(self._charges)
        )
        while self.iterations < limit:
            self.iterations += 1
            potential = -self._interaction @ mixer.value
            half = 0.5 * potential[basis.atom_of]
            shifted = self._hamiltonian + self._overlap * (half[:, None] + half)
            energies, coefficients = solve(shifted, self._overlap, basis)
            if smearing_eV:
                occupations = fill_smeared(energies, electrons.total, electrons.unpaired, smearing_eV)
            else:
                occupations = fill(energies, electrons.total, electrons.unpaired)
            filling = occupations.sum(axis=0)
            charges = mulliken_charges(coefficients, self._overlap, filling, basis)
            self.residual = float(np.abs(charges - mixer.value).max())
            if self.residual < CHARGE_TOLERANCE:
                gross = basis.core_charges - charges
                energy = float(energies @ filling - gross @ potential + 0.5 * charges @ self._interaction @ charges)
                return ElectronicState(
                    energies,
                    coefficients,
                    occupations,
                    energy,
                    "self-consistent",
                    self.iterations,
                    self.residual,
                    smearing_eV,
                )
            mixer.update(charges)
        self._charges = mixer.value
        return None


def mulliken_charges(coefficients: FloatArray, overlap: FloatArray, filling: FloatArray, basis: Basis) -> FloatArray:
    """Core charge minus gross population of each atom.

    Parameters
    ----------
    coefficients, overlap : (n_ao, n_ao) ndarray
        C and S.
    filling : (n_mo,) ndarray
        Electrons in each orbital.
    basis : Basis
        Functions.

    Returns
    -------
    charges : (n_atoms,) ndarray
        [e]

    References
    ----------
    .. [1] mulliken-1955: R. S. Mulliken, J. Chem. Phys. 23, 1833 (1955).
    """
    occupied = coefficients[:, : int(filling.nonzero()[0][-1]) + 1]
    gross = ((overlap @ occupied) * occupied) @ filling[: occupied.shape[1]]
    charges: FloatArray = basis.core_charges - np.add.reduceat(gross, basis.atom_start[:-1])
    return charges


def charge_interaction(positions_A: FloatArray, hardness_eV: FloatArray, weight: float) -> FloatArray:
    """Interaction of the charges, lambda gamma_AB.

    gamma_AB = e^2 / sqrt(R^2 + a^2) with a = e^2 (1/U_A + 1/U_B)/2, so that gamma_AA = U_A.

    Parameters
    ----------
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].
    hardness_eV : (n_atoms,) ndarray
        U = I - A of each neutral atom [eV].
    weight : float
        lambda of the parameter set.

    Returns
    -------
    interaction : (n_atoms, n_atoms) ndarray
        [eV]

    References
    ----------
    .. [1] klopman-1964: G. Klopman, J. Am. Chem. Soc. 86, 4550 (1964).
    .. [2] ohno-1964: K. Ohno, Theor. Chim. Acta 2, 219 (1964).
    """
    difference = positions_A[:, None, :] - positions_A
    squared = np.einsum("abi,abi->ab", difference, difference)
    inverse = 1 / hardness_eV
    softness = COULOMB_EV_A / 2 * (inverse[:, None] + inverse)
    interaction: FloatArray = weight * COULOMB_EV_A / np.sqrt(squared + softness**2)
    return interaction
