"""Stretching of metal-donor bonds: force constants and normal modes."""

from __future__ import annotations

from dataclasses import dataclass

from ehmo.records.arrays import FloatArray, frozen_floats


@dataclass(frozen=True, slots=True, eq=False)
class StretchingModes:
    """Normal modes within the stretches of some bonds, every angle held.

    Attributes
    ----------
    force_constants_eV_per_A2 : (n, n) ndarray
        Second derivatives of the energy by the bond lengths [eV/angstrom^2].
    wavenumbers_per_cm : (n,) ndarray
        Harmonic, highest first; negative for a direction in which the energy falls off [cm^-1].
    stretches : (n_modes, n_bonds) ndarray
        Changes of the lengths in each mode, of unit length together.
    vectors : (n_modes, n_bonds) ndarray
        The modes in symmetrically orthonormalised coordinates; their squares are the shares of the bonds.
    reduced_masses_u : (n,) ndarray
        (l F l)/omega^2 of each mode with its stretches l [u].
    """

    force_constants_eV_per_A2: FloatArray
    wavenumbers_per_cm: FloatArray
    stretches: FloatArray
    vectors: FloatArray
    reduced_masses_u: FloatArray

    def __post_init__(self) -> None:
        n = len(self.wavenumbers_per_cm)
        put = object.__setattr__
        put(self, "wavenumbers_per_cm", frozen_floats(self.wavenumbers_per_cm, (n,), "wavenumbers_per_cm"))
        put(self, "reduced_masses_u", frozen_floats(self.reduced_masses_u, (n,), "reduced_masses_u"))
        for name in ("force_constants_eV_per_A2", "stretches", "vectors"):
            put(self, name, frozen_floats(getattr(self, name), (n, n), name))
