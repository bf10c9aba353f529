"""Point groups of spheres and molecules, irreps of their orbitals, distances from ideal shapes."""

from __future__ import annotations

from ehmo.analysis.symmetry.adapted import donor_irreps, functions_of_atoms, shell_irreps
from ehmo.analysis.symmetry.detect import find_symmetry
from ehmo.analysis.symmetry.groups import GROUP_NAMES, point_group
from ehmo.analysis.symmetry.irreps import lowdin_rows, orbital_irreps, parting_turns
from ehmo.analysis.symmetry.labels import ascii_symbol
from ehmo.analysis.symmetry.shape import shape_measures

__all__ = [
    "GROUP_NAMES",
    "ascii_symbol",
    "donor_irreps",
    "find_symmetry",
    "functions_of_atoms",
    "lowdin_rows",
    "orbital_irreps",
    "parting_turns",
    "point_group",
    "shape_measures",
    "shell_irreps",
]
