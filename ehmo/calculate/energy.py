"""Total energy of a fragment and its gradient, without any analysis of bonds."""

from __future__ import annotations

from dataclasses import dataclass, replace

from basis_params import ModelSettings, ParameterTable
from ehmo.calculate.numbers import (
    Solution,
    channel_constants,
    channel_scale,
    checked_plan,
    effective_settings,
    solved,
    threads_for,
)
from ehmo.electronic.energy import (
    dipole_moment,
    interaction_gradient,
    overlap_weights,
    smearing_entropy_eV,
    state_charges,
)
from ehmo.orbitals.dipole import dipole_integrals
from ehmo.orbitals.overlap_gradient import overlap_gradient
from ehmo.orbitals.pairs import OrbitalPlan, orbital_plan
from ehmo.orbitals.two_body import TwoBody, separated_atoms_eV, two_body
from ehmo.records.arrays import FloatArray
from ehmo.records.electronic import ElectronicState
from ehmo.records.energy import FragmentEnergy
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options


@dataclass(frozen=True, slots=True)
class EnergyModel:
    """What fixes the energy of a geometry: parameters, constants of the Hamiltonian, charge model.

    Attributes
    ----------
    table : ParameterTable
    settings : ModelSettings
        Constants of the table unless the options override them.
    options : Options
    """

    table: ParameterTable
    settings: ModelSettings
    options: Options

    def energy(self, fragment: Fragment, *, gradient: bool = False, dipole: bool = False) -> FragmentEnergy:
        """`fragment_energy` of this model."""
        return fragment_energy(fragment, self.table, self.settings, self.options, gradient=gradient, dipole=dipole)

    def calibrated(self, symbol: str, other: str, distance_A: float) -> bool:
        """Whether the set has a two-body term for these elements whose range holds the distance."""
        term = self.table.pair_repulsion(symbol, other)
        return term is not None and term.covers(distance_A)


def energy_model(table: ParameterTable, options: Options | None = None) -> EnergyModel:
    """Model of a parameter set.

    Parameters
    ----------
    table : ParameterTable
    options : Options, optional
        Choices that override the set.

    Returns
    -------
    model : EnergyModel

    Raises
    ------
    InputError
        If a constant lies outside any sensible range.
    """
    options = options or Options()
    return EnergyModel(table, effective_settings(table.settings, options), options)


def fragment_energy(
    fragment: Fragment,
    table: ParameterTable,
    settings: ModelSettings,
    options: Options | None = None,
    *,
    gradient: bool = False,
    dipole: bool = False,
) -> FragmentEnergy:
    """Energy above the separated neutral atoms: electrons with their charges, and two-body repulsion.

    Parameters
    ----------
    fragment : Fragment
        Atoms with charge and unpaired electrons set; no metal is needed.
    table : ParameterTable
        Shells and two-body terms.
    settings : ModelSettings
        Constants of the Hamiltonian; those of the table unless overridden, see `effective_settings`.
    options : Options, optional
        Charge model and limits.
    gradient, dipole : bool
        Whether the derivative by the positions and the dipole moment are wanted too.

    Returns
    -------
    energy : FragmentEnergy

    Raises
    ------
    EhmoError
        See `calculate_bonding`.

    References
    ----------
    .. [1] anderson-1974: electrons from extended Hückel, repulsion between neutral atoms.
    """
    options = options or Options()
    plan = checked_plan(fragment, table, options)
    with threads_for(len(plan.basis)):
        solution = solved(plan, fragment, settings, options)
        charges = state_charges(solution.state, solution.overlap, plan.basis)
        repulsion = two_body(plan, table, fragment.positions_A)
        found = _parts(fragment, table, solution.state, charges, repulsion)
        if gradient:
            slope = electronic_gradient(plan, fragment, settings, solution, charges) + repulsion.gradient(plan)
            found = replace(found, gradient_eV_per_A=slope)
        if dipole:
            integrals = dipole_integrals(plan, table, fragment.positions_A, solution.overlap)
            moment = dipole_moment(solution.state, plan.basis, fragment.positions_A, integrals)
            found = replace(found, dipole_e_A=moment)
    return found


def state_energy(
    fragment: Fragment, table: ParameterTable, state: ElectronicState, charges: FloatArray
) -> FragmentEnergy:
    """Energy of orbitals that are there already, such as those of a report.

    Parameters
    ----------
    fragment : Fragment
    table : ParameterTable
        Set that the orbitals were made with.
    state : ElectronicState
    charges : (n_atoms,) ndarray
        Its Mulliken charges [e].

    Returns
    -------
    energy : FragmentEnergy
    """
    repulsion = two_body(orbital_plan(fragment.symbols, table), table, fragment.positions_A)
    return _parts(fragment, table, state, charges, repulsion)


def _parts(
    fragment: Fragment, table: ParameterTable, state: ElectronicState, charges: FloatArray, repulsion: TwoBody
) -> FragmentEnergy:
    return FragmentEnergy(
        electronic_eV=state.energy_eV,
        repulsion_eV=float(repulsion.energies_eV.sum()),
        atoms_eV=separated_atoms_eV(fragment.symbols, table),
        entropy_eV=smearing_entropy_eV(state),
        charges=charges,
        smearing_eV=state.smearing_eV,
    )


def electronic_gradient(
    plan: OrbitalPlan, fragment: Fragment, settings: ModelSettings, solution: Solution, charges: FloatArray
) -> FloatArray:
    """(n_atoms, 3) derivative of the electronic (free) energy by the positions [eV/angstrom]."""
    state, interaction = solution.state, solution.interaction_eV
    potential = None if interaction is None else -interaction @ charges
    plain, scaled = overlap_weights(state, plan.basis, potential, weighting=settings.weighting)
    scale = channel_scale(fragment.symbols, settings)
    if scale is None:
        plain += channel_constants(settings)[0] * scaled
        gradient = overlap_gradient(plan, fragment.positions_A, plain)
    else:
        gradient = overlap_gradient(plan, fragment.positions_A, plain, scale=scale, scaled_weights=scaled)
    if interaction is not None:
        gradient += interaction_gradient(fragment.positions_A, interaction, charges, settings.lambda_)
    return gradient
