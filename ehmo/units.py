"""Units and constants: angstrom, electronvolt, bohr^-1 for exponents.

Values: CODATA 2022 recommended values (E. Tiesinga et al., NIST, physics.nist.gov/constants; from memory,
checked against scipy.constants in the tests).
"""

from __future__ import annotations

from math import pi

BOHR_A = 0.529177210544
"""One bohr [angstrom]."""

HARTREE_EV = 27.211386245981
"""One hartree [eV]."""

COULOMB_EV_A = HARTREE_EV * BOHR_A
"""e^2 / (4 pi epsilon_0) [eV angstrom]."""

PER_CM_PER_EV = 8065.543937349211
"""Wavenumber of one electronvolt [cm^-1]."""

BOLTZMANN_PER_CM_K = 0.6950348004861274
"""Boltzmann constant [cm^-1 / K]."""

ELECTRON_G = 2.00231930436092
"""g factor of the free electron, taken positive."""

NEWTON_PER_M_PER_EV_A2 = 16.02176634
"""Force constant of one electronvolt per square angstrom [N/m]."""

ATOMIC_MASS_KG = 1.66053906892e-27
"""One atomic mass unit [kg]."""

PER_CM_PER_ROOT_EV_A2_U = (NEWTON_PER_M_PER_EV_A2 / ATOMIC_MASS_KG) ** 0.5 / (2 * pi * 2.99792458e10)
"""Wavenumber of a mass of 1 u on a force constant of 1 eV/angstrom^2 [cm^-1]."""

STRENGTH_PER_ABSORPTIVITY = 4.318999188e-9
"""Oscillator strength of a band whose molar absorptivity, integrated over wavenumbers, is 1 L mol^-1 cm^-2.

4 epsilon_0 m_e c^2 ln 10 / (N_A e^2): classical oscillators that follow the law of Lambert and Beer.
"""
