"""Fragment with known bonds and electrons -> orbitals, populations and bond orders."""

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
from ehmo.analysis.bonded import BondedFunctions, bonded_functions
from ehmo.electronic.charges import (
    ElectronCount,
    charge_interaction,
    fixed_charges,
    self_consistent_charges,
)
from ehmo.electronic.eigen import overlap_spectrum
from ehmo.electronic.hamiltonian import wolfsberg_helmholz
from ehmo.errors import InputError, LimitError
from ehmo.orbitals.overlap import ChannelScale, overlap_matrix, scaled_overlap_matrices
from ehmo.orbitals.pairs import OrbitalPlan, orbital_plan
from ehmo.orbitals.parameters import element_parameters
from ehmo.records.arrays import FloatArray
from ehmo.records.bonding import BondOrders, Populations
from ehmo.records.coordination import Coordination
from ehmo.records.electronic import ElectronicState, OverlapSpectrum
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options

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
    bonded: BondedFunctions
    populations: Populations
    orders: tuple[BondOrders, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Solution:
    """Orbitals of a fragment with the matrices they come from; no interaction where charges are fixed.

    Attributes
    ----------
    overlap : (n_ao, n_ao) ndarray
        S.
    interaction_eV : (n_atoms, n_atoms) ndarray or None
        lambda gamma [eV].
    state : ElectronicState
    """

    overlap: FloatArray
    interaction_eV: FloatArray | None
    state: ElectronicState


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
    plan = checked_plan(fragment, table, options)
    with threads_for(len(plan.basis)):
        solution = solved(plan, fragment, settings, options)
        spectrum = overlap_spectrum(solution.overlap, plan.basis)
        state = solution.state
        bonded = bonded_functions(coordination.bonds, plan.basis, spectrum, state, coordination.metals)
        populations, orders = analyse_bonding(
            coordination.bonds, fragment.positions_A, plan.basis, spectrum, state, bonded
        )
    return Bonding(plan, spectrum, state, bonded, populations, orders)


def checked_plan(fragment: Fragment, table: ParameterTable, options: Options) -> OrbitalPlan:
    """Plan of a fragment whose charge and spin are set and whose functions are within the limit.

    Raises
    ------
    EhmoError
        See `calculate_bonding`.
    """
    if fragment.charge is None or fragment.unpaired_electrons is None:
        raise InputError("charge and unpaired electrons are not set", mend="set them with Fragment.with_electrons")
    n_functions = _count_functions(fragment, table)
    if n_functions > options.max_functions:
        raise LimitError(
            f"{n_functions} basis functions, more than the limit of {options.max_functions}",
            mend="cut the fragment, or raise the limit with --max-functions",
        )
    return orbital_plan(fragment.symbols, table)


def solved(plan: OrbitalPlan, fragment: Fragment, settings: ModelSettings, options: Options) -> Solution:
    """Orbitals of a fragment, with the matrices that they come from.

    Raises
    ------
    EhmoError
        See `calculate_bonding`.
    """
    assert fragment.charge is not None and fragment.unpaired_electrons is not None
    overlap, hamiltonian = _matrices(plan, fragment, settings)
    total = round(float(plan.basis.core_charges.sum())) - fragment.charge
    count = ElectronCount(total, fragment.unpaired_electrons)
    if options.charge_model == "fixed":
        return Solution(overlap, None, fixed_charges(hamiltonian, overlap, plan.basis, count))
    hardness = np.array([basis_params.atom(symbol).hardness_U_eV for symbol in fragment.symbols])
    interaction = charge_interaction(fragment.positions_A, hardness, settings.lambda_)
    state = self_consistent_charges(
        hamiltonian, overlap, plan.basis, count, interaction, max_iterations=options.max_iterations
    )
    return Solution(overlap, interaction, state)


def _count_functions(fragment: Fragment, table: ParameterTable) -> int:
    """Basis functions of a fragment, counted before anything as large as their pairs is made."""
    sizes = {
        symbol: sum(2 * shell.l + 1 for shell in element_parameters(table, symbol).shells)
        for symbol in set(fragment.symbols)
    }
    return sum(sizes[symbol] for symbol in fragment.symbols)


def _matrices(plan: OrbitalPlan, fragment: Fragment, settings: ModelSettings) -> tuple[FloatArray, FloatArray]:
    """Overlap and fixed Hamiltonian."""
    scale = channel_scale(fragment.symbols, settings)
    if scale is None:
        overlap, scaled = overlap_matrix(plan, fragment.positions_A), None
    else:
        overlap, scaled = scaled_overlap_matrices(plan, fragment.positions_A, scale)
    hamiltonian = wolfsberg_helmholz(
        plan.basis, overlap, channel_constants(settings)[0], weighting=settings.weighting, scaled_overlap=scaled
    )
    return overlap, hamiltonian


def channel_scale(symbols: tuple[str, ...], settings: ModelSettings) -> ChannelScale | None:
    """Factors of the channels; None where one K serves all of them at every distance."""
    by_channel = channel_constants(settings)
    if len(set(by_channel)) == 1 and not settings.K_decay_per_A:
        return None
    radii = tuple(basis_params.atom(symbol).covalent_radius_A for symbol in symbols)
    return ChannelScale(by_channel, settings.K_decay_per_A, radii)


def channel_constants(settings: ModelSettings) -> tuple[float, float, float, float]:
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
def threads_for(n_functions: int) -> Iterator[None]:
    """Limit BLAS to one thread where a second one costs more than it brings."""
    if n_functions >= _THREADS_PAY_FROM:
        yield
    else:
        with _thread_controller().limit(limits=1):
            yield
