"""Orbitals seen from the local frames of the metals."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ehmo.harmonics import harmonic_rotations
from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.coordination import Coordination


def local_gross_populations(
    orbitals: Sequence[int],
    coefficients: FloatArray,
    overlap: FloatArray,
    basis: Basis,
    coordination: Coordination,
) -> FloatArray:
    """Gross population of each function in some orbitals, with the functions turned into the local frames.

    Functions of a metal follow its own frame, those of any other atom the frame of the first metal it is bonded
    to, or else of the first metal. So 3dxy means the same in every orientation of the file.

    Parameters
    ----------
    orbitals : sequence of int
        Orbital indices.
    coefficients, overlap : (n_ao, n_ao) ndarray
        C and S.
    basis : Basis
        Functions.
    coordination : Coordination
        Local frames.

    Returns
    -------
    gross : (n_ao, len(orbitals)) ndarray
        Columns add up to 1.
    """
    chosen = coefficients[:, list(orbitals)]
    partner = overlap @ chosen
    axes = {frame.metal: frame.axes for frame in coordination.frames}
    frame_of = [coordination.metals[0]] * len(basis.symbols)
    for bond in reversed(coordination.bonds):
        frame_of[bond.donor] = bond.metal
    for metal in coordination.metals:
        frame_of[metal] = metal
    gross = np.empty_like(chosen)
    for metal in coordination.metals:
        # The local function is Y(A r) with the axes as rows of A, which is the image of Y under the turn A^T.
        turns = {l: harmonic_rotations(axes[metal].T[None], l)[0].T for l in set(basis.shell_l.tolist())}
        for shell, atom in enumerate(basis.shell_atom):
            if frame_of[atom] == metal:
                rows = slice(basis.shell_start[shell], basis.shell_start[shell] + 2 * basis.shell_l[shell] + 1)
                turn = turns[int(basis.shell_l[shell])]
                gross[rows] = (turn @ chosen[rows]) * (turn @ partner[rows])
    return gross
