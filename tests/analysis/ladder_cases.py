"""Ladders of the shared species, and ligand fields made up from angular-overlap parameters."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np

import basis_params
from ehmo.analysis.angular import donor_functions
from ehmo.analysis.ladder import ladders
from ehmo.analysis.pi_planes import pi_normals
from ehmo.calculate import Bonding, calculate_bonding
from ehmo.records.coordination import Coordination, MetalDonorBond
from ehmo.records.fragment import Fragment
from ehmo.records.ligand_field import Ladder, LadderLevel
from ehmo.records.options import Options
from ehmo.structure import assign_electrons, perceive
from tests.geometries import SPECIES

TETRAHEDRON = np.array([[1, 1, 1], [1, -1, -1], [-1, 1, -1], [-1, -1, 1]]) / np.sqrt(3)
OCTAHEDRON = np.array([[1, 0, 0], [-1, 0, 0], [0, 1, 0], [0, -1, 0], [0, 0, 1], [0, 0, -1]], dtype=float)


@dataclass(frozen=True)
class LadderCase:
    """One metal with its calculation and its ladder."""

    fragment: Fragment
    coordination: Coordination
    bonding: Bonding
    ladder: Ladder

    @property
    def bonds(self) -> tuple[MetalDonorBond, ...]:
        """Bonds of the metal."""
        return self.coordination.bonds_of(self.ladder.metal)

    @property
    def directions(self) -> np.ndarray:
        """Unit vectors to the donors in the local axes."""
        positions = self.fragment.positions_A
        vectors = positions[[bond.donor for bond in self.bonds]] - positions[self.ladder.metal]
        return (vectors / np.linalg.norm(vectors, axis=1)[:, None]) @ self.axes.T

    @property
    def axes(self) -> np.ndarray:
        """Local axes as rows."""
        return self.coordination.frames[0].axes

    @property
    def normals(self) -> dict[int, np.ndarray]:
        """Directions of single pi functions in the local axes."""
        found = pi_normals(self.bonds, self.coordination, self.fragment.symbols, self.fragment.positions_A)
        return {place: self.axes @ normal for place, normal in found.items()}


@cache
def ladder_case(name: str) -> LadderCase:
    """Calculation and ladder of a shared species with one metal."""
    fragment = SPECIES[name].fragment()
    table = basis_params.load_set("standard")
    coordination = perceive(fragment)
    electrons = assign_electrons(fragment, coordination)
    bonding = calculate_bonding(fragment, coordination, table, table.settings, Options())
    overlap = np.sum([orders.orbital_overlap for orders in bonding.orders], axis=0)
    (ladder,) = ladders(
        coordination.frames,
        bonding.plan.basis,
        bonding.bonded,
        bonding.state,
        overlap,
        counted_electrons=electrons.d_electrons,
    )
    return LadderCase(fragment, coordination, bonding, ladder)


def field_of(directions: np.ndarray, e_sigma: np.ndarray, e_pi: np.ndarray, l: int = 2) -> np.ndarray:
    """Angular-overlap matrix of donors with their parameters."""
    functions = donor_functions(directions, l)
    sigma = np.einsum("d,da,db->ab", e_sigma, functions[:, 0], functions[:, 0])
    return sigma + np.einsum("d,dpa,dpb->ab", e_pi, functions[:, 1:], functions[:, 1:])


def ladder_of_field(field: np.ndarray, electrons: tuple[float, ...] | None = None) -> Ladder:
    """Ladder whose effective matrix is given, levels filled as given from below."""
    energies, vectors = np.linalg.eigh(field)
    electrons = electrons or (0.0,) * len(energies)
    levels = tuple(
        LadderLevel("", 1.0, float(energy), k, filling, 1.0, 0.0, -0.1, False, 0.0)
        for k, (energy, filling) in enumerate(zip(energies, electrons, strict=True))
    )
    return Ladder(0, "3d", levels, field, vectors, 0.0, "made up")
