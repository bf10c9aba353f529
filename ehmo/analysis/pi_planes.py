"""The direction of the one pi function that bent imido, carbene and planar amido donors offer."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from basis_params import atom
from ehmo.records.arrays import FloatArray
from ehmo.records.coordination import Coordination, DonorKind, MetalDonorBond

_REACH = 1.25
"""Atoms of a ligand are bonded up to this multiple of the sum of their covalent radii (common practice)."""

_PLANAR_DEG = 345.0
"""Sum of the three angles at an amido nitrogen from which it counts as planar [degree]."""


def pi_normals(
    bonds: Sequence[MetalDonorBond], coordination: Coordination, symbols: Sequence[str], positions_A: FloatArray
) -> dict[int, FloatArray]:
    """Unit vector along the one pi function of each donor that offers one.

    A bent imido donor offers the function across its M-N-R plane, a carbene or planar amido donor that across the
    plane of its two substituents.

    Parameters
    ----------
    bonds : sequence of MetalDonorBond
        Bonds of one metal.
    coordination : Coordination
        Ligands of the fragment.
    symbols : sequence of str
        Chemical symbols.
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].

    Returns
    -------
    normals : dict of int to (3,) ndarray
        By place of the bond, in the coordinates' axes.
    """
    normals = {}
    for place, bond in enumerate(bonds):
        if bond.kind not in (DonorKind.IMIDO_BENT, DonorKind.CARBENE, DonorKind.AMIDO):
            continue
        towards = _substituents(bond, coordination.ligands[bond.ligand].atoms, symbols, positions_A)
        back = _unit(positions_A[bond.metal] - positions_A[bond.donor])
        if bond.kind is DonorKind.IMIDO_BENT and len(towards) == 1:
            normals[place] = _unit(np.cross(towards[0], back))
        elif len(towards) == 2 and (bond.kind is DonorKind.CARBENE or _planar(back, *towards)):
            normals[place] = _unit(np.cross(towards[0], towards[1]))
        elif len(towards) == 1 and bond.kind is DonorKind.CARBENE:
            normals[place] = _unit(np.cross(towards[0], back))
    return normals


def _substituents(
    bond: MetalDonorBond, ligand: Sequence[int], symbols: Sequence[str], positions_A: FloatArray
) -> list[FloatArray]:
    """Unit vectors from the donor to the atoms of its ligand bonded to it."""
    radius = atom(symbols[bond.donor]).covalent_radius_A
    vectors = [
        (positions_A[other] - positions_A[bond.donor], radius + atom(symbols[other]).covalent_radius_A)
        for other in ligand
        if other != bond.donor
    ]
    return [_unit(vector) for vector, radii in vectors if np.linalg.norm(vector) < _REACH * radii]


def _planar(*units: FloatArray) -> bool:
    a, b, c = units
    angles = np.degrees(np.arccos(np.clip([a @ b, b @ c, c @ a], -1.0, 1.0)))
    return float(angles.sum()) > _PLANAR_DEG


def _unit(vector: FloatArray) -> FloatArray:
    unit: FloatArray = vector / np.linalg.norm(vector)
    return unit
