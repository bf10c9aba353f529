"""Total energy of a fragment, its parts, and its gradient."""

from __future__ import annotations

from dataclasses import dataclass

from ehmo.records.arrays import FloatArray, frozen_floats


@dataclass(frozen=True, slots=True, eq=False)
class FragmentEnergy:
    """Energy of a fragment at one geometry.

    Attributes
    ----------
    electronic_eV : float
        Tr(P H0) + (lambda/2) sum of gamma q q [eV].
    repulsion_eV : float
        Sum of the two-body terms [eV].
    atoms_eV : float
        Energy of the separated neutral atoms, the zero of `total_eV` [eV].
    entropy_eV : float
        -T S of a smeared filling, 0 for whole electrons [eV].
    charges : (n_atoms,) ndarray
        Mulliken charges [e].
    smearing_eV : float
        Width of the filling, 0 for whole electrons [eV].
    gradient_eV_per_A : (n_atoms, 3) ndarray or None
        Derivative of `free_eV` by the positions, if it was asked for [eV/angstrom].
    dipole_e_A : (3,) ndarray or None
        Dipole moment about the origin of the coordinates, if it was asked for [e angstrom].
    """

    electronic_eV: float
    repulsion_eV: float
    atoms_eV: float
    entropy_eV: float
    charges: FloatArray
    smearing_eV: float
    gradient_eV_per_A: FloatArray | None = None
    dipole_e_A: FloatArray | None = None

    def __post_init__(self) -> None:
        n_atoms = len(self.charges)
        put = object.__setattr__
        put(self, "charges", frozen_floats(self.charges, (n_atoms,), "charges"))
        if self.gradient_eV_per_A is not None:
            put(self, "gradient_eV_per_A", frozen_floats(self.gradient_eV_per_A, (n_atoms, 3), "gradient_eV_per_A"))
        if self.dipole_e_A is not None:
            put(self, "dipole_e_A", frozen_floats(self.dipole_e_A, (3,), "dipole_e_A"))

    @property
    def total_eV(self) -> float:
        """Electronic energy and repulsion, above the separated neutral atoms [eV]."""
        return self.electronic_eV + self.repulsion_eV - self.atoms_eV

    @property
    def free_eV(self) -> float:
        """`total_eV` with the entropy of a smeared filling: what the gradient belongs to [eV]."""
        return self.total_eV + self.entropy_eV
