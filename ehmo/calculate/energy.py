"""Total energy of a fragment and its gradient, without any analysis of bonds."""

from __future__ import annotations

from basis_params import ModelSettings, ParameterTable
from ehmo.calculate.numbers import Solution, channel_constants, channel_scale, checked_plan, solved, threads_for
from ehmo.electronic.energy import interaction_gradient, overlap_weights, smearing_entropy_eV, state_charges
from ehmo.orbitals.overlap_gradient import overlap_gradient
from ehmo.orbitals.pairs import OrbitalPlan
from ehmo.orbitals.two_body import separated_atoms_eV, two_body
from ehmo.records.arrays import FloatArray
from ehmo.records.energy import FragmentEnergy
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options


def fragment_energy(
    fragment: Fragment,
    table: ParameterTable,
    settings: ModelSettings,
    options: Options | None = None,
    *,
    gradient: bool = False,
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
    gradient : bool
        Whether the derivative by the positions is wanted too.

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
        slope = None
        if gradient:
            slope = electronic_gradient(plan, fragment, settings, solution, charges) + repulsion.gradient(plan)
    return FragmentEnergy(
        electronic_eV=solution.state.energy_eV,
        repulsion_eV=float(repulsion.energies_eV.sum()),
        atoms_eV=separated_atoms_eV(fragment.symbols, table),
        entropy_eV=smearing_entropy_eV(solution.state),
        charges=charges,
        smearing_eV=solution.state.smearing_eV,
        gradient_eV_per_A=slope,
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
