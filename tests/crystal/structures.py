"""Crystals built from published cells and coordinates, and helpers to list bonds and make supercells."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import product

import numpy as np

from ehmo.records.bloch import LatticeBond


@dataclass(frozen=True)
class Crystal:
    """Atoms of one cell."""

    symbols: tuple[str, ...]
    positions_A: np.ndarray
    cell_A: np.ndarray

    def vector(self, bond: LatticeBond) -> np.ndarray:
        """From metal to donor."""
        shift = np.array(bond.translation) @ self.cell_A
        return self.positions_A[bond.donor] + shift - self.positions_A[bond.metal]

    def supercell(self, counts: tuple[int, int, int]) -> Crystal:
        """Cell repeated; atom a of copy c has the number c * n + a."""
        copies = list(product(*map(range, counts)))
        positions = np.concatenate([self.positions_A + np.array(copy) @ self.cell_A for copy in copies])
        return Crystal(self.symbols * len(copies), positions, self.cell_A * np.array(counts)[:, None])

    def bond_in_supercell(self, bond: LatticeBond, counts: tuple[int, int, int]) -> LatticeBond:
        """The same bond, its metal in the first copy."""
        cells, inside = np.divmod(np.array(bond.translation), counts)
        copy = int(np.ravel_multi_index(tuple(inside), counts))
        return LatticeBond(bond.metal, copy * len(self.symbols) + bond.donor, tuple(int(c) for c in cells))


def by_operations(sites, operations, cell_A) -> Crystal:
    """Cell from the asymmetric unit; images that coincide count once."""
    symbols, fractions = [], []
    for symbol, site in sites:
        images: list[np.ndarray] = []
        for operation in operations:
            image = np.array(operation(*site)) % 1.0
            if not any(np.abs((image - other + 0.5) % 1.0 - 0.5).max() < 1e-3 for other in images):
                images.append(image)
        symbols += [symbol] * len(images)
        fractions += images
    cell = np.array(cell_A, dtype=float)
    return Crystal(tuple(symbols), np.array(fractions) @ cell, cell)


def metal_oxygen_bonds(crystal: Crystal, reach_A: float, donor: str = "O") -> list[LatticeBond]:
    """Contacts of every other element with the donors, shortest first."""
    bonds = []
    for metal, symbol in enumerate(crystal.symbols):
        if symbol == donor:
            continue
        for other, partner in enumerate(crystal.symbols):
            if partner != donor:
                continue
            for cell in product(range(-2, 3), repeat=3):
                bond = LatticeBond(metal, other, cell)
                if np.linalg.norm(crystal.vector(bond)) < reach_A:
                    bonds.append(bond)
    return sorted(bonds, key=lambda bond: round(float(np.linalg.norm(crystal.vector(bond))), 6))


V2O5 = by_operations(
    [
        ("V", (0.60123, 0.25, 0.10860)),
        ("O", (0.43090, 0.25, -0.00280)),
        ("O", (0.60450, 0.25, 0.46970)),
        ("O", (0.75, 0.25, 0.00080)),
    ],
    [
        lambda x, y, z: (x, y, z),
        lambda x, y, z: (0.5 - x, y, z),
        lambda x, y, z: (-x, 0.5 + y, -z),
        lambda x, y, z: (0.5 + x, -y, -z),
    ],
    np.diag([11.544, 3.571, 4.383]),
)
"""V2O5, Pmmn: J. Solid State Chem. 123, 317 (1996), table of sample IIb as deposited (COD 9012221; read)."""

MOO3 = by_operations(
    [
        ("Mo", (0.08669, 0.10164, 0.25)),
        ("O", (0.49940, 0.43513, 0.25)),
        ("O", (0.52120, 0.08657, 0.25)),
        ("O", (0.03730, 0.22140, 0.25)),
    ],
    [
        lambda x, y, z: (x, y, z),
        lambda x, y, z: (-x, -y, 0.5 + z),
        lambda x, y, z: (0.5 + x, 0.5 - y, -z),
        lambda x, y, z: (0.5 - x, 0.5 + y, 0.5 - z),
    ],
    np.diag([3.9628, 13.855, 3.6964]),
)
"""alpha-MoO3, Pbnm: L. Kihlborg, Ark. Kemi 21, 357 (1963), as deposited (AMCSD 0018982; read)."""

REO3 = Crystal(
    ("Re", "O", "O", "O"), 3.734 / 2 * np.array([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1.0]]), 3.734 * np.eye(3)
)
"""ReO3, Pm-3m: K. Meisel, Z. Anorg. Allg. Chem. 207, 121 (1932), as deposited (AMCSD 0016967; read)."""

TILTED = Crystal(
    ("V", "O", "O", "H"),
    np.array([[0.1, 0.2, 0.0], [0.3, 0.1, 1.6], [1.9, 0.4, -0.3], [2.6, 1.0, -0.6]]),
    np.array([[4.1, 0.0, 0.0], [0.7, 4.4, 0.0], [-0.5, 0.9, 4.9]]),
)
"""Made up: a cell without any symmetry."""
