"""Units and constants: angstrom, electronvolt, bohr^-1 for exponents.

Values: CODATA 2022 recommended values (E. Tiesinga et al., NIST, physics.nist.gov/constants; from memory,
checked against scipy.constants in the tests).
"""

from __future__ import annotations

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
