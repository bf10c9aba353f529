"""Terms, spin-orbit levels and magnetism of open d and f shells in a ligand field."""

from __future__ import annotations

from ehmo.analysis.multiplets.configurations import configuration_terms, dipole_polarisations, highest_spin_terms
from ehmo.analysis.multiplets.first_order import d1_square_pyramid_g, octahedral_g, tetragonal_energies
from ehmo.analysis.multiplets.magnetism import effective_moment, magnetic_properties, spin_only_moment
from ehmo.analysis.multiplets.momentum import orbital_momentum, reduced_momentum
from ehmo.analysis.multiplets.spin_orbit import spin_orbit_states
from ehmo.analysis.multiplets.stacked import term_energies
from ehmo.analysis.multiplets.terms import free_ion_terms, multiplet_terms

__all__ = [
    "configuration_terms",
    "d1_square_pyramid_g",
    "dipole_polarisations",
    "effective_moment",
    "free_ion_terms",
    "highest_spin_terms",
    "magnetic_properties",
    "multiplet_terms",
    "octahedral_g",
    "orbital_momentum",
    "reduced_momentum",
    "spin_only_moment",
    "spin_orbit_states",
    "term_energies",
    "tetragonal_energies",
]
