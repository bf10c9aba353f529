"""Irreps of the orbitals; accidentally degenerate ones are turned so that each belongs to one."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ehmo.analysis import analyse_bonding
from ehmo.analysis.bonded import bonded_functions
from ehmo.analysis.symmetry import functions_of_atoms, lowdin_rows, orbital_irreps, parting_turns
from ehmo.calculate.numbers import Bonding
from ehmo.conventions import DEGENERACY_TOLERANCE_EV
from ehmo.records.coordination import Coordination
from ehmo.records.fragment import Fragment
from ehmo.records.site import MetalSite
from ehmo.records.symmetry import OrbitalIrreps, Symmetry

_SAME_FILLING = 1e-6


def sphere_irreps(sites: tuple[MetalSite, ...], bonding: Bonding) -> OrbitalIrreps | None:
    """Irreps of all orbitals in the group of the idealised sphere; None for several metals."""
    if len(sites) > 1:
        return None
    symmetry, basis = sites[0].symmetry, bonding.plan.basis
    rows = functions_of_atoms(basis, symmetry.atoms)
    # The bonded rows are those of metal and donors in the order of the atoms.
    lowdin = bonding.bonded.lowdin_orbitals
    if len(lowdin) != len(rows):
        lowdin = lowdin_rows(bonding.overlap, rows, bonding.state.coefficients)
    return orbital_irreps(symmetry, basis, lowdin, bonding.state.energies_eV)


def molecule_irreps(symmetry: Symmetry | None, bonding: Bonding) -> OrbitalIrreps | None:
    """Irreps of all orbitals in the group of the whole molecule; None in C1 or without its symmetry."""
    if symmetry is None or symmetry.group.name == "C1":
        return None
    basis = bonding.plan.basis
    lowdin = lowdin_rows(bonding.overlap, functions_of_atoms(basis, symmetry.atoms), bonding.state.coefficients)
    return orbital_irreps(symmetry, basis, lowdin, bonding.state.energies_eV)


def parted_orbitals(
    fragment: Fragment, coordination: Coordination, symmetry: Symmetry, irreps: OrbitalIrreps, bonding: Bonding
) -> Bonding | None:
    """The same result with orbitals of one irrep each; None where they are so already.

    The solver returns any combination of orbitals that have one energy. Where these belong to several irreps, as the
    nonbonding f delta and f phi of a bare actinyl ion do, shares, dipoles and overlap populations orbital by orbital
    would mix them. Density, orders and charges do not depend on it.

    Parameters
    ----------
    fragment : Fragment
    coordination : Coordination
    symmetry : Symmetry
        Of the sphere.
    irreps : OrbitalIrreps
        Labels in its group.
    bonding : Bonding

    Returns
    -------
    bonding : Bonding or None
    """
    state, basis = bonding.state, bonding.plan.basis
    labels = np.array(irreps.labels)
    together = np.diff(state.energies_eV) <= DEGENERACY_TOLERANCE_EV
    if not (together & (labels[1:] != labels[:-1]) & (labels[1:] != "") & (labels[:-1] != "")).any():
        return None
    rows = lowdin_rows(bonding.overlap, functions_of_atoms(basis, symmetry.atoms), state.coefficients)
    coefficients = np.array(state.coefficients)
    for places, turn in parting_turns(symmetry, basis, rows, state.energies_eV):
        if np.ptp(state.occupations[:, places], axis=1).max() < _SAME_FILLING:
            coefficients[:, places] = coefficients[:, places] @ turn
    turned = replace(state, coefficients=coefficients)
    bonded = bonded_functions(coordination.bonds, basis, bonding.overlap, turned, coordination.metals)
    populations, orders = analyse_bonding(
        coordination.bonds, fragment.positions_A, basis, bonding.overlap, turned, bonded
    )
    return replace(bonding, state=turned, bonded=bonded, populations=populations, orders=orders)
