"""Energies of the terms for a stack of ligand fields."""

from __future__ import annotations

import numpy as np

from ehmo.analysis.multiplets.groups import label_group
from ehmo.analysis.multiplets.irreps import component_sets, irrep_of_states, term_basis
from ehmo.analysis.multiplets.shells import check_shell
from ehmo.analysis.multiplets.spin_adapted import spin_spaces
from ehmo.harmonics import harmonic_rotations
from ehmo.records.arrays import FloatArray
from ehmo.records.symmetry import PointGroup
from ehmo.units import PER_CM_PER_EV


def term_energies(
    fields_eV: FloatArray,
    n_electrons: int,
    integrals_per_cm: FloatArray,
    group: PointGroup | None,
    axes: FloatArray,
) -> dict[tuple[int, str], FloatArray]:
    """Energies of the terms that `multiplet_terms` finds, for many fields at once.

    Parameters
    ----------
    fields_eV : (n_fields, 2l+1, 2l+1) ndarray
        Ligand fields among the real harmonics [eV].
    n_electrons : int
    integrals_per_cm : (n_fields, l) ndarray
        Slater integrals F^2, F^4, (F^6) that go with each field [cm^-1].
    group : PointGroup or None
        Group of the labels.
    axes : (3, 3) ndarray
        Rows are the group's x, y, z in the coordinates of the harmonics.

    Returns
    -------
    energies : dict of (int, str) to (n_fields, n_terms) ndarray
        By 2S + 1 and irrep; the terms of each by rising energy, from the barycentre of the shell [cm^-1].

    Raises
    ------
    MultipletError
        As `multiplet_terms`.
    """
    n_fields, n_orbitals = fields_eV.shape[:2]
    l = (n_orbitals - 1) // 2
    check_shell(l, n_electrons)
    labels = label_group(group)
    turn = harmonic_rotations(np.asarray(axes, dtype=np.float64).T[None], l)[0]
    fields = turn.T @ (fields_eV * PER_CM_PER_EV) @ turn
    fields -= np.trace(fields, axis1=1, axis2=2)[:, None, None] / n_orbitals * np.eye(n_orbitals)
    energies: dict[tuple[int, str], FloatArray] = {}
    for space in spin_spaces(l, n_electrons):
        basis = term_basis(labels, space)
        matrices = (fields.reshape(n_fields, -1) @ space.generators).reshape(n_fields, space.size, space.size)
        matrices += np.tensordot(integrals_per_cm, space.repulsion, axes=1)
        values, _, shares = basis.solve(matrices)
        irreps = np.array([irrep_of_states(own, basis.counts) for own in shares])
        order = np.argsort(irreps, axis=1, kind="stable")
        # Every field has as many states of each irrep, so that sorted by irrep all make the same sets.
        sorted_irreps = np.take_along_axis(irreps, order, axis=1)[0]
        _, starts = component_sets(sorted_irreps, basis.dimensions)
        sizes = basis.dimensions[sorted_irreps[starts]]
        means = np.add.reduceat(np.take_along_axis(values, order, axis=1), starts, axis=1) / sizes
        for number, irrep in enumerate(basis.irreps):
            energies[space.two_s + 1, irrep] = means[:, sorted_irreps[starts] == number]
    return energies
