"""Result of the orbital calculation."""

from __future__ import annotations

from dataclasses import dataclass

from ehmo.records.arrays import FloatArray, frozen_floats

NO_ELECTRON = 0.01
"""Occupation up to which an orbital counts as empty: smeared filling has long tails."""


@dataclass(frozen=True, slots=True, eq=False)
class ElectronicState:
    """Orbitals and their filling.

    Attributes
    ----------
    energies_eV : (n_mo,) ndarray
        Orbital energies, ascending [eV].
    coefficients : (n_ao, n_mo) ndarray
        Column k is orbital k; C^T S C = 1.
    occupations : (2, n_mo) ndarray
        Alpha and beta occupation of each orbital.
    energy_eV : float
        Tr(P H0) plus the charge term; no core repulsion [eV].
    charge_model : str
        "fixed" or "self-consistent".
    iterations : int
        Diagonalisations.
    charge_residual : float
        Largest change of a charge in the last iteration, 0 for fixed charges [e].
    smearing_eV : float
        Width of the Fermi-Dirac filling, 0 for whole electrons [eV].
    """

    energies_eV: FloatArray
    coefficients: FloatArray
    occupations: FloatArray
    energy_eV: float
    charge_model: str
    iterations: int
    charge_residual: float
    smearing_eV: float = 0.0

    def __post_init__(self) -> None:
        n_mo = len(self.energies_eV)
        put = object.__setattr__
        put(self, "energies_eV", frozen_floats(self.energies_eV, (n_mo,), "energies_eV"))
        put(self, "coefficients", frozen_floats(self.coefficients, (n_mo, n_mo), "coefficients"))
        put(self, "occupations", frozen_floats(self.occupations, (2, n_mo), "occupations"))

    @property
    def homo(self) -> int:
        """Index of the highest orbital that holds electrons."""
        return int((self.occupations[0] > NO_ELECTRON).nonzero()[0][-1])

    @property
    def lumo(self) -> int | None:
        """Index of the lowest empty orbital; None if every orbital is filled."""
        empty = (self.occupations[0] <= NO_ELECTRON).nonzero()[0]
        return int(empty[0]) if len(empty) else None


@dataclass(frozen=True, slots=True, eq=False)
class OverlapSpectrum:
    """Overlap matrix with its eigenvalues and eigenvectors.

    Attributes
    ----------
    matrix : (n_ao, n_ao) ndarray
        S.
    eigenvalues : (n_ao,) ndarray
        Ascending, all positive.
    vectors : (n_ao, n_ao) ndarray
        Column k belongs to eigenvalue k.
    """

    matrix: FloatArray
    eigenvalues: FloatArray
    vectors: FloatArray

    def __post_init__(self) -> None:
        n_ao = len(self.matrix)
        put = object.__setattr__
        put(self, "matrix", frozen_floats(self.matrix, (n_ao, n_ao), "matrix"))
        put(self, "eigenvalues", frozen_floats(self.eigenvalues, (n_ao,), "eigenvalues"))
        put(self, "vectors", frozen_floats(self.vectors, (n_ao, n_ao), "vectors"))
