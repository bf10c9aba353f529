"""Ligand fields, free ions and shells that several tests share."""

from __future__ import annotations

from math import comb

import numpy as np

from ehmo.harmonics import harmonic_rotations
from ehmo.records.multiplets import ElectronRepulsion, Terms
from ehmo.units import PER_CM_PER_EV

XY, YZ, Z2, XZ, X2Y2 = range(5)
GROUPS = ("C1", "Cs", "C3", "C4", "S4", "C2v", "C3v", "C4v", "D2d", "D3h", "D4h", "D5h", "D4d", "Td", "Oh", "D∞h")


def octahedral_eV(delta_per_cm: float) -> np.ndarray:
    """Field with t2g at -2/5 and eg at 3/5 of delta."""
    return diagonal_eV(xy=-0.4, yz=-0.4, z2=0.6, xz=-0.4, x2y2=0.6) * delta_per_cm


def diagonal_eV(xy: float, yz: float, z2: float, xz: float, x2y2: float) -> np.ndarray:
    """Field diagonal in the real d functions, energies in cm^-1."""
    return np.diag([xy, yz, z2, xz, x2y2]) / PER_CM_PER_EV


def tetragonal_eV(b1: float, a1: float, b2: float, e: float) -> np.ndarray:
    """Field of a square pyramid with its donors on z and on +-x, +-y."""
    return diagonal_eV(xy=b2, yz=e, z2=a1, xz=e, x2y2=b1)


def turned(field: np.ndarray, rotation: np.ndarray) -> np.ndarray:
    """Field of a molecule that was turned."""
    matrix = harmonic_rotations(rotation[None], (len(field) - 1) // 2)[0]
    return matrix @ field @ matrix.T


def random_field_eV(size: int, seed: int, width_per_cm: float = 5000.0) -> np.ndarray:
    """Field without any symmetry."""
    matrix = np.random.default_rng(seed).normal(size=(size, size)) * width_per_cm / PER_CM_PER_EV
    return (matrix + matrix.T) / 2


def racah(B: float, C: float) -> ElectronRepulsion:
    return ElectronRepulsion.from_racah(B, C)


def energies(terms: Terms, label: str) -> np.ndarray:
    """Energies of all terms of one label, ascending."""
    return np.array([term.energy_per_cm for term in terms.terms if term.label == label])


def n_determinants(l: int, n_electrons: int) -> int:
    return comb(4 * l + 2, n_electrons)
