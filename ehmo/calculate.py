"""From a fragment and a parameter set to a bond report: the one place where the numeric boxes meet."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from functools import lru_cache

import numpy as np
from threadpoolctl import ThreadpoolController

import basis_params
from basis_params import ModelSettings, ParameterTable
from ehmo.analysis import analyse_bonding
from ehmo.conventions import FRONTIER_TOLERANCE_EV, atom_label
from ehmo.electronic.charges import (
    ElectronCount,
    charge_interaction,
    fixed_charges,
    self_consistent_charges,
)
from ehmo.electronic.eigen import overlap_spectrum
from ehmo.electronic.hamiltonian import wolfsberg_helmholz
from ehmo.errors import EhmoError, InputError, LimitError
from ehmo.orbitals.overlap import ChannelScale, overlap_matrix, scaled_overlap_matrices
from ehmo.orbitals.pairs import OrbitalPlan, orbital_plan
from ehmo.orbitals.parameters import load_parameters
from ehmo.records.arrays import FloatArray
from ehmo.records.bonding import BondOrders, Populations
from ehmo.records.coordination import Coordination, ElectronAssignment
from ehmo.records.electronic import NO_ELECTRON, ElectronicState, OverlapSpectrum
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options
from ehmo.records.report import BondReport, Method
from ehmo.records.wording import signed
from ehmo.structure import assign_electrons, perceive

_THREADS_PAY_FROM = 400
"""Below this many functions a second BLAS thread costs more than it brings."""

_LARGEST_CONSTANT = 10.0
"""Far above any K, decay or lambda in use; beyond lie slips of the pen and numbers that overflow."""


@dataclass(frozen=True, slots=True, eq=False)
class Bonding:
    """The numeric result on a fragment whose bonds and electrons are known."""

    plan: OrbitalPlan
    overlap: OverlapSpectrum
    state: ElectronicState
    populations: Populations
    orders: tuple[BondOrders, ...]


def bond_report(
    fragment: Fragment, params: str | ParameterTable = "standard", options: Options | None = None
) -> BondReport:
    """Bond report of a fragment.

    Parameters
    ----------
    fragment : Fragment
        Atoms; charge and unpaired electrons if known.
    params : str or ParameterTable
        Name of a shipped set, path of a table, or a loaded table.
    options : Options, optional
        Choices that override the fragment and the set.

    Returns
    -------
    report : BondReport

    Raises
    ------
    EhmoError
        If the fragment has no metal or no donors, if charge and spin do not fit, if the set lacks an element, or
        if the charges do not converge; the message names the mend.
    """
    options = options or Options()
    table = params if isinstance(params, ParameterTable) else load_parameters(params)
    settings = effective_settings(table.settings, options)
    try:
        return _report(fragment, table, settings, options)
    except EhmoError as error:
        error.place = error.place or fragment.source
        raise


def _report(fragment: Fragment, table: ParameterTable, settings: ModelSettings, options: Options) -> BondReport:
    coordination = perceive(fragment)
    electrons = assign_electrons(fragment, coordination, options.charge, options.unpaired_electrons)
    fragment = fragment.with_electrons(electrons.charge, electrons.unpaired_electrons)
    bonding = calculate_bonding(fragment, coordination, table, settings, options)
    return BondReport(
        fragment=fragment,
        coordination=coordination,
        electrons=electrons,
        method=_method(table, settings, bonding),
        basis=bonding.plan.basis,
        overlap=bonding.overlap.matrix,
        state=bonding.state,
        populations=bonding.populations,
        orders=bonding.orders,
        assumptions=_assumptions(fragment, coordination, table, electrons),
        warnings=coordination.warnings + _electronic_warnings(fragment, coordination, bonding),
    )


def effective_settings(settings: ModelSettings, options: Options) -> ModelSettings:
    """Settings of the set with the constants that the options override; refused outside any sensible range."""
    names = ("K", "weighting", "K_sigma", "K_pi", "K_delta", "K_decay_per_A", "lambda_")
    chosen = {name: getattr(options, name) for name in names if getattr(options, name) is not None}
    combined = replace(settings, **chosen)
    for name in names:
        value = getattr(combined, name)
        if value is not None and not 0 <= value <= _LARGEST_CONSTANT:
            raise InputError(
                f"{name.rstrip('_')} is {value:g}",
                mend=f"give the option or the table a number from 0 to {_LARGEST_CONSTANT:g}",
            )
    return combined


def calculate_bonding(
    fragment: Fragment,
    coordination: Coordination,
    table: ParameterTable,
    settings: ModelSettings,
    options: Options,
) -> Bonding:
    """Overlap, Hamiltonian, orbitals, populations and bond orders.

    Parameters
    ----------
    fragment : Fragment
        Atoms with charge and unpaired electrons set.
    coordination : Coordination
        Its metal-donor bonds.
    table : ParameterTable
        Shells of its elements.
    settings : ModelSettings
        Constants of the Hamiltonian; those of the table unless overridden.
    options : Options
        Charge model and limits.

    Returns
    -------
    bonding : Bonding

    Raises
    ------
    EhmoError
        See `bond_report`.
    """
    if fragment.charge is None or fragment.unpaired_electrons is None:
        raise InputError("charge and unpaired electrons are not set", mend="set them with Fragment.with_electrons")
    plan = orbital_plan(fragment.symbols, table)
    if len(plan.basis) > options.max_functions:
        raise LimitError(
            f"{len(plan.basis)} basis functions, more than the limit of {options.max_functions}",
            mend="cut the fragment, or raise the limit with --max-functions",
        )
    with _threads_for(len(plan.basis)):
        overlap, hamiltonian = _matrices(plan, fragment, settings)
        spectrum = overlap_spectrum(overlap, plan.basis)
        total = round(float(plan.basis.core_charges.sum())) - fragment.charge
        count = ElectronCount(total, fragment.unpaired_electrons)
        if options.charge_model == "fixed":
            state = fixed_charges(hamiltonian, overlap, plan.basis, count)
        else:
            hardness = np.array([basis_params.atom(symbol).hardness_U_eV for symbol in fragment.symbols])
            interaction = charge_interaction(fragment.positions_A, hardness, settings.lambda_)
            state = self_consistent_charges(
                hamiltonian, overlap, plan.basis, count, interaction, max_iterations=options.max_iterations
            )
        populations, orders = analyse_bonding(coordination.bonds, fragment.positions_A, plan.basis, spectrum, state)
    return Bonding(plan, spectrum, state, populations, orders)


def _matrices(plan: OrbitalPlan, fragment: Fragment, settings: ModelSettings) -> tuple[FloatArray, FloatArray]:
    """Overlap and fixed Hamiltonian; channels are scaled apart only where the set says so."""
    by_channel = _channel_constants(settings)
    if len(set(by_channel)) == 1 and not settings.K_decay_per_A:
        overlap = overlap_matrix(plan, fragment.positions_A)
        scaled = None
    else:
        radii = tuple(basis_params.atom(symbol).covalent_radius_A for symbol in fragment.symbols)
        scale = ChannelScale(by_channel, settings.K_decay_per_A, radii)
        overlap, scaled = scaled_overlap_matrices(plan, fragment.positions_A, scale)
    hamiltonian = wolfsberg_helmholz(
        plan.basis, overlap, by_channel[0], weighting=settings.weighting, scaled_overlap=scaled
    )
    return overlap, hamiltonian


def _channel_constants(settings: ModelSettings) -> tuple[float, float, float, float]:
    """K of sigma, pi, delta and phi; phi follows the general K."""
    sigma, pi, delta = (
        settings.K if constant is None else constant for constant in (settings.K_sigma, settings.K_pi, settings.K_delta)
    )
    return sigma, pi, delta, settings.K


@lru_cache(maxsize=1)
def _thread_controller() -> ThreadpoolController:
    # Finding the thread pools takes milliseconds, limiting them microseconds: look once.
    return ThreadpoolController()


@contextmanager
def _threads_for(n_functions: int) -> Iterator[None]:
    if n_functions >= _THREADS_PAY_FROM:
        yield
    else:
        with _thread_controller().limit(limits=1):
            yield


def _method(table: ParameterTable, settings: ModelSettings, bonding: Bonding) -> Method:
    sigma, pi, delta, _ = _channel_constants(settings)
    return Method(
        parameter_set=table.name,
        edition=table.edition,
        parameter_sha256=table.content_sha256,
        parameter_origin=table.origin,
        charge_model=bonding.state.charge_model,
        K=settings.K,
        K_sigma=sigma,
        K_pi=pi,
        K_delta=delta,
        weighting=settings.weighting,
        K_decay_per_A=settings.K_decay_per_A,
        lambda_=settings.lambda_,
        iterations=bonding.state.iterations,
        charge_residual=bonding.state.charge_residual,
        smearing_eV=bonding.state.smearing_eV,
        smallest_overlap_eigenvalue=float(bonding.overlap.eigenvalues[0]),
    )


def _assumptions(
    fragment: Fragment, coordination: Coordination, table: ParameterTable, electrons: ElectronAssignment
) -> tuple[str, ...]:
    said = [
        *fragment.notes,
        f"charge {signed(electrons.charge)}: {electrons.charge_reason}",
        f"unpaired electrons {electrons.unpaired_electrons}: {electrons.unpaired_reason}",
        *_ligand_charges(fragment, coordination),
    ]
    if table.inherited:
        keys = ", ".join(table.inherited)
        said.append(f"the table {table.name} does not state {keys}: taken from the standard set")
    return tuple(said)


def _ligand_charges(fragment: Fragment, coordination: Coordination) -> tuple[str, ...]:
    """Formal charge of each kind of ligand, with the donors or first atoms that carry it."""
    carriers: dict[tuple[str, int | None], list[str]] = {}
    for ligand in coordination.ligands:
        named = ligand.donors or ligand.atoms[:1]
        carriers.setdefault((ligand.formula, ligand.charge), []).append("/".join(fragment.labels[i] for i in named))
    parts = [f"{formula} {signed(charge)} ({', '.join(atoms)})" for (formula, charge), atoms in carriers.items()]
    return (f"ligand charges by counting: {', '.join(parts)}",) if parts else ()


def _electronic_warnings(fragment: Fragment, coordination: Coordination, bonding: Bonding) -> tuple[str, ...]:
    return tuple(
        warning
        for warning in (
            _frontier_warning(bonding.state),
            _spin_warning(fragment, coordination, bonding),
        )
        if warning
    )


def _electrons(count: float) -> str:
    return f"{count:g} electron{'' if round(count, 6) == 1 else 's'}"


def _frontier_warning(state: ElectronicState) -> str:
    occupations = state.occupations.sum(axis=0)
    part = (state.occupations > NO_ELECTRON) & (state.occupations < 1 - NO_ELECTRON)
    shared = np.flatnonzero(part.any(axis=0))
    if len(shared):
        levels = ", ".join(str(k + 1) for k in shared)
        if state.smearing_eV:
            held = _electrons(round(float(occupations[shared].sum()), 1))
            return (
                f"orbitals {levels} cross as the charges settle: they share {held} by a filling smeared over "
                f"{state.smearing_eV:g} eV; the ground state is nearly degenerate and may distort"
            )
        return (
            f"orbitals {levels} are degenerate and share {_electrons(occupations[shared].sum())} evenly: "
            "the ground state may distort"
        )
    lumo = state.lumo
    if lumo is None:
        return ""
    gap = state.energies_eV[lumo] - state.energies_eV[lumo - 1]
    if gap < FRONTIER_TOLERANCE_EV:
        return (
            f"orbitals {lumo} and {lumo + 1} at the frontier are only {gap:.3f} eV apart: another filling is as likely"
        )
    return ""


def _spin_warning(fragment: Fragment, coordination: Coordination, bonding: Bonding) -> str:
    unpaired = fragment.unpaired_electrons
    if not unpaired:
        return ""
    on_metal = bonding.populations.spin[list(coordination.metals)].sum() / unpaired
    if on_metal >= 0.5:
        return ""
    difference = bonding.state.occupations[0] - bonding.state.occupations[1]
    worst = int((difference * (1 - bonding.populations.orbital_shares[:, 0])).argmax())
    coefficients = bonding.state.coefficients[:, worst]
    gross = coefficients * (bonding.overlap.matrix @ coefficients)
    atom = int(np.add.reduceat(gross, bonding.plan.basis.atom_start[:-1]).argmax())
    return (
        f"only {100 * on_metal:.0f} % of the unpaired density is on the metal: orbital {worst + 1} holds an unpaired "
        f"electron and has its largest part on {atom_label(fragment.symbols[atom], atom)}; check the spin state"
    )
