"""Forces, force constants, equilibrium lengths and stretching modes along metal-donor bonds, from analytic gradients.

A bond is stretched by moving its ligand rigidly along it, see `rigid_group`. Every function takes the bonds of one
fragment and its energy model; none looks whether the model is calibrated for them.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np

import basis_params
from ehmo.calculate.energy import EnergyModel
from ehmo.errors import ConvergenceError, InputError
from ehmo.records.arrays import FloatArray
from ehmo.records.coordination import Coordination, MetalDonorBond
from ehmo.records.fragment import Fragment
from ehmo.records.stretching import StretchingModes
from ehmo.studies.displacement import rigid_group, stretch_directions, stretched
from ehmo.units import PER_CM_PER_ROOT_EV_A2_U

STEP_A = 0.005
"""Change of a length between two gradients; the error of the second derivative goes with its square [angstrom]."""

LENGTH_TOLERANCE_A = 1e-5
"""Change of a length below which it counts as settled [angstrom]."""

_LONGEST_STEP_A = 0.1
_MOST_STEPS = 40


def bond_forces(
    fragment: Fragment, coordination: Coordination, bonds: Sequence[MetalDonorBond], model: EnergyModel
) -> FloatArray:
    """Force on each bond, minus the derivative of the energy by its length.

    Parameters
    ----------
    fragment : Fragment
        With charge and unpaired electrons set.
    coordination : Coordination
    bonds : sequence of MetalDonorBond
    model : EnergyModel

    Returns
    -------
    forces : (n_bonds,) ndarray
        Positive where the bond would lengthen [eV/angstrom].

    Raises
    ------
    EhmoError
        See `fragment_energy`.
    """
    gradient = model.energy(fragment, gradient=True).gradient_eV_per_A
    forces: FloatArray = -np.tensordot(
        stretch_directions(fragment, coordination, bonds), np.asarray(gradient), axes=([1, 2], [0, 1])
    )
    return forces


def bond_force(fragment: Fragment, coordination: Coordination, bond: MetalDonorBond, model: EnergyModel) -> float:
    """`bond_forces` of a single bond [eV/angstrom]."""
    return float(bond_forces(fragment, coordination, [bond], model)[0])


def bond_force_constants(
    fragment: Fragment, coordination: Coordination, bonds: Sequence[MetalDonorBond], model: EnergyModel
) -> FloatArray:
    """Second derivatives of the energy by the lengths of some bonds, from central differences of `bond_forces`.

    Parameters
    ----------
    fragment, coordination, bonds, model
        As in `bond_forces`.

    Returns
    -------
    force_constants : (n_bonds, n_bonds) ndarray
        Symmetric [eV/angstrom^2].

    Raises
    ------
    EhmoError
        See `fragment_energy`.
    """
    constants = np.zeros((len(bonds), len(bonds)))
    for place in range(len(bonds)):
        change = np.zeros(len(bonds))
        change[place] = STEP_A
        longer, shorter = (
            bond_forces(stretched(fragment, coordination, bonds, sign * change), coordination, bonds, model)
            for sign in (1, -1)
        )
        constants[place] = (shorter - longer) / (2 * STEP_A)
    return (constants + constants.T) / 2


def bond_curvature(fragment: Fragment, coordination: Coordination, bond: MetalDonorBond, model: EnergyModel) -> float:
    """Second derivative of the energy by the length of a single bond [eV/angstrom^2]."""
    return float(bond_force_constants(fragment, coordination, [bond], model)[0, 0])


def equilibrium_change(
    fragment: Fragment, coordination: Coordination, bonds: Sequence[MetalDonorBond], model: EnergyModel
) -> float:
    """Common change of some lengths that takes the energy to its nearest minimum, everything else held.

    Parameters
    ----------
    fragment, coordination, bonds, model
        As in `bond_forces`; several bonds, such as the equal ones of a tetraoxo ion, change alike.

    Returns
    -------
    change : float
        [angstrom]

    Raises
    ------
    ConvergenceError
        If no minimum is found within reach.
    EhmoError
        See `fragment_energy`.
    """

    def force(change: float) -> float:
        moved = stretched(fragment, coordination, bonds, np.full(len(bonds), change))
        return float(bond_forces(moved, coordination, bonds, model).sum())

    change, here = 0.0, force(0.0)
    ahead = force(STEP_A)
    curvature = (here - ahead) / STEP_A
    for _ in range(_MOST_STEPS):
        # Uphill, or nearly flat: a bounded step along the force leaves the region.
        step = here / curvature if curvature > 0 else np.copysign(_LONGEST_STEP_A, here)
        step = float(np.clip(step, -_LONGEST_STEP_A, _LONGEST_STEP_A))
        if abs(step) < LENGTH_TOLERANCE_A and curvature > 0:
            return change + step
        there = force(change + step)
        curvature = (here - there) / step
        change, here = change + step, there
    raise ConvergenceError(
        f"no minimum along the bond within {_MOST_STEPS} steps", mend="start nearer to it, or take another set"
    )


def stretching_modes(
    fragment: Fragment,
    coordination: Coordination,
    bonds: Sequence[MetalDonorBond],
    model: EnergyModel,
    masses_u: FloatArray,
) -> StretchingModes:
    """Normal modes within the stretches of some bonds: every angle and every ligand rigid.

    F of `bond_force_constants` and Wilson's G: two stretches share the inverse mass of a common metal or donor times
    the cosine between them; a ligand that moves rigidly counts with its whole mass.

    Parameters
    ----------
    fragment, coordination, bonds, model
        As in `bond_forces`; best at a minimum.
    masses_u : (n_atoms,) ndarray
        Mass of each atom, see `atom_masses` [u].

    Returns
    -------
    modes : StretchingModes

    Raises
    ------
    EhmoError
        See `fragment_energy`.

    References
    ----------
    .. [1] wilson-1955: E. B. Wilson, J. C. Decius, P. C. Cross, Molecular Vibrations, McGraw-Hill 1955.
    """
    constants = bond_force_constants(fragment, coordination, bonds, model)
    return normal_modes(constants, wilson_G(fragment, coordination, bonds, masses_u))


def wilson_G(
    fragment: Fragment, coordination: Coordination, bonds: Sequence[MetalDonorBond], masses_u: FloatArray
) -> FloatArray:
    """(n_bonds, n_bonds) inverse kinetic matrix of the stretches [1/u]; see `stretching_modes`."""
    bodies = [(bond.metal,) for bond in bonds], [rigid_group(coordination, bond) for bond in bonds]
    units = np.array([fragment.positions_A[bond.donor] - fragment.positions_A[bond.metal] for bond in bonds])
    units /= np.linalg.norm(units, axis=1)[:, None]
    cosines = units @ units.T
    inverse = np.zeros((len(bonds), len(bonds)))
    for side in bodies:
        for i, one in enumerate(side):
            for j, other in enumerate(side):
                if one == other:
                    inverse[i, j] += cosines[i, j] / masses_u[list(one)].sum()
    return inverse


def normal_modes(force_constants: FloatArray, inverse_masses: FloatArray) -> StretchingModes:
    """Modes of F [eV/angstrom^2] and G [1/u], highest wavenumber first.

    References
    ----------
    .. [1] wilson-1955: secular equation of GF.
    """
    weights, axes = np.linalg.eigh(inverse_masses)
    root = (axes * np.sqrt(np.maximum(weights, 0.0))) @ axes.T
    squares, vectors = np.linalg.eigh(root @ force_constants @ root)
    order = np.argsort(-squares)
    squares, vectors = squares[order], vectors[:, order].T
    stretches = vectors @ root
    stretches = stretches / np.linalg.norm(stretches, axis=1)[:, None]
    effective = np.einsum("ki,ij,kj->k", stretches, force_constants, stretches)
    wavenumbers = np.sign(squares) * np.sqrt(np.abs(squares)) * PER_CM_PER_ROOT_EV_A2_U
    return StretchingModes(force_constants, wavenumbers, stretches, vectors, effective / squares)


def atom_masses(fragment: Fragment, isotopes: Mapping[str, int] | None = None) -> FloatArray:
    """Mass of each atom: standard atomic weights but for the isotopes named.

    Parameters
    ----------
    fragment : Fragment
    isotopes : mapping of str to int, optional
        Mass number by label of an atom such as ``O2``, or by element such as ``O`` for all of its atoms.

    Returns
    -------
    masses : (n_atoms,) ndarray
        [u]

    Raises
    ------
    InputError
        If there is no such atom or nuclide.
    """
    isotopes = isotopes or {}
    for name in isotopes:
        if name not in fragment.labels and name not in fragment.symbols:
            raise InputError(f"there is no atom {name} to give an isotope", mend="write labels or elements, as O2=18")
    masses = []
    for label, symbol in zip(fragment.labels, fragment.symbols, strict=True):
        try:
            masses.append(basis_params.atomic_mass(symbol, isotopes.get(label, isotopes.get(symbol))))
        except KeyError as fault:
            raise InputError(str(fault.args[0]), mend="write mass numbers, as O2=18") from None
    return np.array(masses)
