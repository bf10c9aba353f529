"""The whole way from a fragment to its bond report."""

from __future__ import annotations

from dataclasses import replace

from basis_params import ModelSettings, ParameterTable
from ehmo.analysis.reactivity import donor_reactivity
from ehmo.calculate.health import health_of, health_warnings
from ehmo.calculate.numbers import Bonding, calculate_bonding, channel_constants, effective_settings
from ehmo.calculate.orbital_labels import molecule_irreps, parted_orbitals, sphere_irreps
from ehmo.calculate.remarks import assumptions, electronic_warnings, site_warnings, spectrum_warnings
from ehmo.calculate.sites import metal_sites, molecule_symmetry, site_formal_orders
from ehmo.calculate.spectroscopy import spectroscopy
from ehmo.calculate.spin import settled_spin
from ehmo.errors import EhmoError, InputError
from ehmo.orbitals.parameters import AUTOMATIC, parameters_for, spin_parameters
from ehmo.records.coordination import Coordination, ElectronAssignment
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options
from ehmo.records.report import BondReport, Method
from ehmo.records.symmetry import Symmetry
from ehmo.structure import assign_electrons, perceive


def bond_report(
    fragment: Fragment, params: str | ParameterTable = AUTOMATIC, options: Options | None = None
) -> BondReport:
    """Bond report of a fragment.

    Parameters
    ----------
    fragment : Fragment
        Atoms; charge and unpaired electrons if known.
    params : str or ParameterTable
        Name of a shipped set, path of a table, or a loaded table; "auto" takes the calibrated set where it has every
        element, else `standard`.
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
    table = parameters_for(params, fragment.symbols)
    settings = effective_settings(table.settings, options)
    try:
        return _report(fragment, table, settings, options)
    except EhmoError as error:
        error.place = error.place or fragment.source
        raise


def _report(fragment: Fragment, table: ParameterTable, settings: ModelSettings, options: Options) -> BondReport:
    coordination = perceive(fragment)
    if options.oxidation_state is not None and len(coordination.metals) > 1:
        raise InputError(
            f"one oxidation state for {len(coordination.metals)} metals", mend="leave out --oxidation-state"
        )
    electrons = assign_electrons(
        fragment, coordination, options.charge, options.unpaired_electrons, options.oxidation_state
    )
    fragment = fragment.with_electrons(electrons.charge, electrons.unpaired_electrons)
    if not electrons.spin_candidates:
        return known_report(fragment, coordination, electrons, table, settings, options)
    first = spin_parameters(table)
    constants = settings if first is table else effective_settings(first.settings, options)
    bonding: Bonding | None = calculate_bonding(fragment, coordination, first, constants, options)
    assert bonding is not None
    settled = settled_spin(fragment, coordination, electrons, bonding)
    if first is not table:
        reason = f"{settled.unpaired_reason} (ladder of the set {first.name})"
        settled = replace(settled, unpaired_reason=reason)
    if first is not table or settled.unpaired_electrons != electrons.unpaired_electrons:
        fragment, bonding = fragment.with_electrons(settled.charge, settled.unpaired_electrons), None
    return known_report(fragment, coordination, settled, table, settings, options, bonding)


def known_report(
    fragment: Fragment,
    coordination: Coordination,
    electrons: ElectronAssignment,
    table: ParameterTable,
    settings: ModelSettings,
    options: Options,
    bonding: Bonding | None = None,
) -> BondReport:
    """Report of a fragment whose bonds, charge and spin are known.

    Parameters
    ----------
    fragment : Fragment
        With charge and unpaired electrons set.
    coordination : Coordination
        Its bonds; a scan keeps those of its start.
    electrons : ElectronAssignment
        Where charge and spin come from.
    table : ParameterTable
    settings : ModelSettings
        Constants of the Hamiltonian.
    options : Options
    bonding : Bonding, optional
        Numeric result on the same input, if there is one already.

    Returns
    -------
    report : BondReport

    Raises
    ------
    EhmoError
        See `bond_report`.
    """
    if bonding is None:
        bonding = calculate_bonding(fragment, coordination, table, settings, options)
    sites = metal_sites(fragment, coordination, electrons, bonding)
    irreps = sphere_irreps(sites, bonding)
    parted = None
    if irreps is not None:
        parted = parted_orbitals(fragment, coordination, sites[0].symmetry, irreps, bonding)
    if parted is not None:
        bonding = parted
        sites = metal_sites(fragment, coordination, electrons, bonding)
        irreps = sphere_irreps(sites, bonding)
    whole = molecule_symmetry(fragment)
    spectrum = spectroscopy(fragment, coordination, sites, irreps, bonding, table, options)
    health = health_of(coordination, bonding)
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
        molecule_symmetry=whole,
        sites=sites,
        irreps=irreps,
        molecule_irreps=molecule_irreps(whole, bonding) if irreps is None else None,
        formal_orders=site_formal_orders(fragment, coordination, sites),
        reactivity=donor_reactivity(
            coordination.bonds,
            bonding.orders,
            bonding.plan.basis,
            bonding.overlap.matrix,
            bonding.state,
            bonding.populations,
        ),
        spectroscopy=spectrum,
        health=health,
        assumptions=assumptions(fragment, coordination, table, electrons),
        warnings=(
            *fragment.doubts,
            *coordination.warnings,
            *electronic_warnings(fragment, coordination, electrons, bonding),
            *health_warnings(fragment, coordination, health),
            *site_warnings(fragment, coordination, sites, electrons.metal_oxidation_total),
            *spectrum_warnings(spectrum),
        ),
    )


def brief_report(
    fragment: Fragment,
    coordination: Coordination,
    electrons: ElectronAssignment,
    table: ParameterTable,
    settings: ModelSettings,
    options: Options,
    symmetries: tuple[Symmetry, ...],
    *,
    charge_transfer: bool = True,
) -> BondReport:
    """Report with orders, ladders, terms and bands only, for studies that repeat one geometry many times.

    Symmetry of the whole molecule, formal orders, reactivity and magnetism are left out.

    Parameters
    ----------
    fragment, coordination, electrons, table, settings, options
        As in `known_report`.
    symmetries : tuple of Symmetry
        Of the spheres, see `sphere_symmetries`.
    charge_transfer : bool
        Whether charge-transfer bands are wanted.

    Returns
    -------
    report : BondReport

    Raises
    ------
    EhmoError
        See `bond_report`.
    """
    bonding = calculate_bonding(fragment, coordination, table, settings, options)
    sites = metal_sites(fragment, coordination, electrons, bonding, symmetries)
    irreps = sphere_irreps(sites, bonding)
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
        molecule_symmetry=None,
        sites=sites,
        irreps=irreps,
        formal_orders=(None,) * len(coordination.bonds),
        reactivity=(),
        spectroscopy=spectroscopy(
            fragment,
            coordination,
            sites,
            irreps,
            bonding,
            table,
            options,
            magnetism=False,
            charge_transfer=charge_transfer,
        ),
        health=health_of(coordination, bonding),
        assumptions=(),
        warnings=(),
    )


def _method(table: ParameterTable, settings: ModelSettings, bonding: Bonding) -> Method:
    sigma, pi, delta, _ = channel_constants(settings)
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
