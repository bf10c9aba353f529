"""Builds molecules for the tests from lengths and angles: a metal at the origin, donors around it."""

from __future__ import annotations

from math import cos, radians, sin

import numpy as np

Z_AXIS = (0.0, 0.0, 1.0)
X_AXIS = (1.0, 0.0, 0.0)
TETRAHEDRAL_DEG = 109.471221


def polar(length: float, theta_deg: float, phi_deg: float = 0.0) -> np.ndarray:
    """Cartesian vector of a length at polar angle theta from z and azimuth phi."""
    theta, phi = radians(theta_deg), radians(phi_deg)
    return length * np.array([sin(theta) * cos(phi), sin(theta) * sin(phi), cos(theta)])


class Molecule:
    """Atoms put down one after another; `grow` sets one by length, angle and dihedral."""

    def __init__(self, metal: str) -> None:
        self.symbols = [metal]
        self.points = [np.zeros(3)]
        self.parents = [0]

    def put(self, symbol: str, position: np.ndarray, parent: int = 0) -> int:
        """Add an atom at a position; returns its index."""
        self.symbols.append(symbol)
        self.points.append(np.asarray(position, dtype=float))
        self.parents.append(parent)
        return len(self.symbols) - 1

    def donor(self, symbol: str, length: float, theta_deg: float, phi_deg: float = 0.0) -> int:
        """Add a donor atom by its polar coordinates about the metal."""
        return self.put(symbol, polar(length, theta_deg, phi_deg))

    def grow(
        self, symbol: str, on: int, length: float, angle_deg: float, dihedral_deg: float = 0.0, toward=Z_AXIS
    ) -> int:
        """Add an atom bonded to `on`: angle with the parent of `on`, dihedral from `toward`."""
        back = self.points[self.parents[on]] - self.points[on]
        back /= np.linalg.norm(back)
        side = np.asarray(toward, dtype=float)
        if np.linalg.norm(np.cross(side, back)) < 1e-3:
            side = np.asarray(X_AXIS if abs(back[0]) < 0.9 else (0.0, 1.0, 0.0))
        side = side - back * (side @ back)
        side /= np.linalg.norm(side)
        angle, dihedral = radians(angle_deg), radians(dihedral_deg)
        turn = cos(dihedral) * side + sin(dihedral) * np.cross(back, side)
        return self.put(symbol, self.points[on] + length * (cos(angle) * back + sin(angle) * turn), on)

    def water(self, length: float, theta_deg: float, phi_deg: float = 0.0, toward=Z_AXIS) -> int:
        """Planar aqua ligand, O-H 0.96, H-O-H 109 (idealised); its plane contains `toward`."""
        oxygen = self.donor("O", length, theta_deg, phi_deg)
        for dihedral in (0.0, 180.0):
            self.grow("H", oxygen, 0.96, 125.5, dihedral, toward)
        return oxygen

    def ammine(self, length: float, theta_deg: float, phi_deg: float = 0.0) -> int:
        """Ammine ligand, N-H 1.02 (idealised)."""
        nitrogen = self.donor("N", length, theta_deg, phi_deg)
        self.hydrogens(nitrogen, 3, 1.02)
        return nitrogen

    def hydrogens(self, on: int, count: int, length: float = 1.09, angle_deg: float = TETRAHEDRAL_DEG) -> None:
        """`count` hydrogens on an atom, spread over the three staggered (or two planar) places."""
        for k in range(count):
            self.grow("H", on, length, angle_deg, (180.0 if count == 2 else 120.0) * k)

    def diatomic(
        self, inner: str, outer: str, lengths: tuple[float, float], theta_deg: float, phi_deg: float = 0.0
    ) -> int:
        """Linear ligand such as CO, CN or linear NO."""
        donor = self.donor(inner, lengths[0], theta_deg, phi_deg)
        self.grow(outer, donor, lengths[1], 180.0)
        return donor

    def methyl(self, on: int, length: float, angle_deg: float, dihedral_deg: float = 0.0) -> int:
        """Methyl group on an atom."""
        carbon = self.grow("C", on, length, angle_deg, dihedral_deg)
        self.hydrogens(carbon, 3)
        return carbon

    def phenyl(self, on: int, length: float, angle_deg: float, dihedral_deg: float = 0.0) -> int:
        """Regular phenyl ring, C-C 1.39 and C-H 1.08 (idealised), on an atom."""
        ipso = self.grow("C", on, length, angle_deg, dihedral_deg)
        axis = self.points[ipso] - self.points[on]
        axis /= np.linalg.norm(axis)
        across = np.cross(axis, X_AXIS if abs(axis[0]) < 0.9 else Z_AXIS)
        across /= np.linalg.norm(across)
        centre = self.points[ipso] + 1.39 * axis
        for k in range(1, 6):
            turn = radians(60.0 * k)
            outward = -cos(turn) * axis + sin(turn) * across
            carbon = self.put("C", centre + 1.39 * outward, ipso)
            self.put("H", centre + 2.47 * outward, carbon)
        return ipso
