"""Ideal coordination spheres: a metal at the origin, donors by kind, length and direction."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tests.molecule_builder import TETRAHEDRAL_DEG, polar

FOUR = (0.0, 90.0, 180.0, 270.0)
THREE = (0.0, 120.0, 240.0)
FIVE = tuple(72.0 * k for k in range(5))
PRISM_DEG = 49.1066  # polar angle of a trigonal prism with square sides, arccos(sqrt(3/7))


@dataclass(frozen=True)
class Sphere:
    """Metal and donors; the metal is atom 0 and has kind 0."""

    group: str
    positions_A: np.ndarray
    kinds: np.ndarray


def sphere(group: str, *donors: tuple[int, float, float, float]) -> Sphere:
    """Sphere from kind, length, polar angle and azimuth of each donor."""
    positions = np.array([np.zeros(3)] + [polar(length, theta, phi) for _, length, theta, phi in donors])
    return Sphere(group, positions, np.array([0] + [kind for kind, *_ in donors]))


SPHERES: dict[str, Sphere] = {
    "octahedron": sphere("Oh", (1, 2.0, 0, 0), (1, 2.0, 180, 0), *((1, 2.0, 90, phi) for phi in FOUR)),
    "tetrahedron": sphere("Td", (1, 1.65, 0, 0), *((1, 1.65, TETRAHEDRAL_DEG, phi) for phi in THREE)),
    "square plane": sphere("D4h", *((1, 2.3, 90, phi) for phi in FOUR)),
    "trans-dioxo": sphere("D4h", (2, 1.75, 0, 0), (2, 1.75, 180, 0), *((1, 2.38, 90, phi) for phi in FOUR)),
    "oxo square pyramid": sphere("C4v", (2, 1.6, 0, 0), *((1, 2.33, 103, phi) for phi in FOUR)),
    "oxo octahedron": sphere("C4v", (2, 1.6, 0, 0), (1, 2.22, 180, 0), *((1, 2.04, 97, phi) for phi in FOUR)),
    "flat oxo octahedron": sphere("C4v", (2, 1.6, 0, 0), (1, 2.22, 180, 0), *((1, 2.04, 90, phi) for phi in FOUR)),
    "oxo octahedron, one kind": sphere("C4v", (1, 1.65, 0, 0), (1, 2.1, 180, 0), *((1, 2.05, 92, phi) for phi in FOUR)),
    "oxo tetrahedron": sphere("C3v", (2, 1.57, 0, 0), *((1, 2.14, 108, phi) for phi in THREE)),
    "facial trioxo": sphere(
        "C3v", *((2, 1.75, 58, phi) for phi in THREE), *((1, 2.11, 128, phi + 180) for phi in THREE)
    ),
    "trigonal bipyramid": sphere("D3h", (1, 2.0, 0, 0), (1, 2.0, 180, 0), *((1, 2.0, 90, phi) for phi in THREE)),
    "trigonal prism": sphere("D3h", *((1, 2.1, theta, phi) for theta in (PRISM_DEG, 180 - PRISM_DEG) for phi in THREE)),
    "dioxo pentagonal bipyramid": sphere(
        "D5h", (2, 1.76, 0, 0), (2, 1.76, 180, 0), *((1, 2.41, 90, phi) for phi in FIVE)
    ),
    "linear dioxo": sphere("D∞h", (1, 1.76, 0, 0), (1, 1.76, 180, 0)),
    "cis-dioxo": sphere("C2v", (2, 1.7, 52, 0), (2, 1.7, 52, 180), (1, 2.3, 128, 90), (1, 2.3, 128, 270)),
}


def displaced(ideal: Sphere, rms_A: float, rng: np.random.Generator) -> np.ndarray:
    """Positions in a random orientation; the displacement vector of each donor from the metal has that rms length."""
    noise = rng.normal(0.0, rms_A / np.sqrt(3.0), ideal.positions_A.shape)
    noise[0] = 0.0
    turn, _ = np.linalg.qr(rng.normal(size=(3, 3)))
    return (ideal.positions_A + noise) @ turn.T
