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
