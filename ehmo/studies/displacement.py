"""Ligands moved along their bonds."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.records.coordination import Coordination, MetalDonorBond
from ehmo.records.fragment import Fragment


def rigid_group(coordination: Coordination, bond: MetalDonorBond) -> tuple[int, ...]:
    """Atoms that move with the donor of a bond: its whole ligand, or the donor alone if it chelates or bridges."""
    ligand = coordination.ligands[bond.ligand]
    single = len(ligand.donors) == 1 and len(ligand.metals) == 1
    return ligand.atoms if single else (bond.donor,)


def stretch_directions(fragment: Fragment, coordination: Coordination, bonds: Sequence[MetalDonorBond]) -> FloatArray:
    """How the atoms move when each bond is stretched.

    Parameters
    ----------
    fragment : Fragment
    coordination : Coordination
    bonds : sequence of MetalDonorBond

    Returns
    -------
    directions : (n_bonds, n_atoms, 3) ndarray
        The unit vector of the bond for the atoms that move with its donor, else zero.
    """
    directions = np.zeros((len(bonds), len(fragment), 3))
    for place, bond in enumerate(bonds):
        along = fragment.positions_A[bond.donor] - fragment.positions_A[bond.metal]
        directions[place, list(rigid_group(coordination, bond))] = along / np.linalg.norm(along)
    return directions


def stretched(
    fragment: Fragment, coordination: Coordination, bonds: Sequence[MetalDonorBond], changes_A: FloatArray
) -> Fragment:
    """Fragment with each bond longer by its change, everything else held [angstrom]."""
    directions = stretch_directions(fragment, coordination, bonds)
    return replace(fragment, positions_A=fragment.positions_A + np.tensordot(changes_A, directions, axes=1))
