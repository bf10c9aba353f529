"""Systems that the benchmarks share: aqua vanadyl, alone and in a block of water on a lattice.

The lattice is a load for the clock and the memory, not a model of the solution.
"""

from __future__ import annotations

from itertools import product

import numpy as np

from ehmo.records.fragment import Fragment
from tests.geometries import SPECIES

VANADYL = "[VO(OH2)5]2+"
WATERS = {43: 0, 295: 42, 997: 159}
"""Waters round the ion, by the number of basis functions that they make."""

_SPACING_A = 3.1
_CLEARANCE_A = 2.6
_WATER = np.array([[0.0, 0.0, 0.0], [0.76, 0.59, 0.0], [-0.76, 0.59, 0.0]])


def vanadyl_in_water(n_functions: int) -> Fragment:
    """Aqua vanadyl with as many waters on a cubic lattice as the number of functions asks for."""
    ion = SPECIES[VANADYL]
    symbols, positions = list(ion.symbols), [ion.positions_A]
    wanted = WATERS[n_functions]
    cells = np.array(sorted(product(range(-5, 6), repeat=3), key=lambda cell: (sum(k * k for k in cell), cell)))
    for origin in _SPACING_A * cells:
        if len(symbols) == len(ion.symbols) + 3 * wanted:
            break
        water = origin + _WATER
        gaps = np.linalg.norm(water[:, None] - ion.positions_A, axis=2)
        if gaps.min() > _CLEARANCE_A:
            symbols += ["O", "H", "H"]
            positions.append(water)
    return Fragment(tuple(symbols), np.concatenate(positions), ion.charge, ion.unpaired_electrons, title=ion.name)
