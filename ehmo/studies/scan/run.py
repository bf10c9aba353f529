"""Running a scan point by point, with the levels followed by their character."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from itertools import pairwise

import numpy as np

from basis_params import ModelSettings, ParameterTable
from ehmo.calculate import effective_settings, known_report
from ehmo.errors import EhmoError
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.bonding import BondOrders
from ehmo.records.coordination import Coordination, ElectronAssignment
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options
from ehmo.records.report import BondReport
from ehmo.records.scan import Scan, ScannedBond, ScannedLevel, ScanPlan, ScanPoint
from ehmo.studies.scan.energies import minimum, outside_range, point_energy, why_no_energy
from ehmo.studies.scan.plan import check_contacts, displaced
from ehmo.studies.scan.relax import bonded_pairs, check_relaxable, left_range, relaxed
from ehmo.studies.stretching import atom_masses

SAME_VALUE = 1e-9
"""Points of an earlier run count as done if their value differs by less."""


def run_scan(
    fragment: Fragment,
    coordination: Coordination,
    electrons: ElectronAssignment,
    plan: ScanPlan,
    table: ParameterTable,
    options: Options,
    *,
    done: Sequence[ScanPoint] = (),
    on_point: Callable[[ScanPoint], None] | None = None,
    isotopes: Mapping[str, int] | None = None,
) -> Scan:
    """Report at each value of a scanned coordinate, with the energy where the set is calibrated for it.

    Bonds, charge and spin are those of the start. A point that fails says why, and the scan goes on.

    Parameters
    ----------
    fragment : Fragment
        With charge and unpaired electrons set.
    coordination : Coordination
        Bonds of the start.
    electrons : ElectronAssignment
    plan : ScanPlan
    table : ParameterTable
    options : Options
    done : sequence of ScanPoint
        Points of an earlier run, taken as they are.
    on_point : callable, optional
        Told of each new point.
    isotopes : mapping of str to int, optional
        Mass numbers by label or element, for the wavenumbers; see `atom_masses`.

    Returns
    -------
    scan : Scan

    Raises
    ------
    InputError
        If the rest is to be relaxed by a set without two-body terms for its bonds, or an isotope is unknown.
    """
    if plan.relaxed:
        check_relaxable(fragment, table)
    atom_masses(fragment, isotopes)
    start = empty_scan(fragment, coordination, electrons, plan, table, options)
    with_energy = not why_no_energy(fragment, plan, table, options)
    bonded = bonded_pairs(fragment)
    settings = effective_settings(table.settings, options)
    known = {round(point.value / SAME_VALUE): point for point in done if not point.fault}
    points: list[ScanPoint] = []
    before: BondReport | None = None
    order: IntArray | None = None
    for value in plan.values:
        point = known.get(round(value / SAME_VALUE))
        if point is None:
            try:
                place = displaced(fragment, plan, value)
                check_contacts(place, plan, bonded)
                if plan.relaxed:
                    place = relaxed(place, plan, value, table, options)
                report = known_report(place, _measured(coordination, place), electrons, table, settings, options)
            except EhmoError as error:
                point = failed_point(value, error.fault)
            else:
                order = _followed(before, report, order)
                point = _point(value, report, order)
                if with_energy:
                    point = replace(point, energy_eV=point_energy(plan, value, report, table))
                if plan.relaxed:
                    doubts = (*point.warnings, *left_range(place, table))
                    point = replace(point, positions_A=place.positions_A, warnings=doubts)
                before = report
            if on_point is not None:
                on_point(point)
        elif len(point.followed):
            # The orbitals of earlier points are not kept: follow on from their order by energy.
            before, order = None, point.followed
        points.append(point)
    scan = replace(start, points=tuple(points), crossings=_crossings(points))
    if not with_energy:
        return scan
    found, reason = minimum(points, fragment, coordination, plan, table, options, isotopes or {})
    withheld = (outside_range(plan, fragment, table), reason)
    return replace(scan, minimum=found, withheld=tuple(said for said in withheld if said))


def empty_scan(
    fragment: Fragment,
    coordination: Coordination,
    electrons: ElectronAssignment,
    plan: ScanPlan,
    table: ParameterTable,
    options: Options,
) -> Scan:
    """Scan without its points; see `run_scan`."""
    labels = fragment.labels
    reason = why_no_energy(fragment, plan, table, options)
    return Scan(
        plan=plan,
        labels=labels,
        bond_labels=tuple(f"{labels[bond.metal]}-{labels[bond.donor]}" for bond in coordination.bonds),
        scanned_bond=_scanned_bond(coordination, plan),
        parameter_set=table.name,
        charge_model=options.charge_model,
        charge=electrons.charge,
        unpaired_electrons=electrons.unpaired_electrons,
        points=(),
        crossings=(),
        withheld=(reason,) if reason else (),
        parameter_sha256=table.content_sha256,
        constants=_constants(effective_settings(table.settings, options)),
    )


def _constants(settings: ModelSettings) -> tuple[tuple[str, float | bool | None], ...]:
    names = ("K", "weighting", "K_sigma", "K_pi", "K_delta", "K_decay_per_A", "lambda_")
    return tuple((name.rstrip("_"), getattr(settings, name)) for name in names)


def failed_point(value: float, fault: str) -> ScanPoint:
    """Point without a result."""
    none = np.zeros(0)
    return ScanPoint(value, fault, none, none, (), np.zeros(0, dtype=np.intp), none, (), (), "", (), 0, ())


def _measured(coordination: Coordination, fragment: Fragment) -> Coordination:
    """Same bonds with the lengths of a displaced geometry; the local axes stay."""
    positions = fragment.positions_A
    bonds = tuple(
        replace(bond, length_A=float(np.linalg.norm(positions[bond.donor] - positions[bond.metal])))
        for bond in coordination.bonds
    )
    return replace(coordination, bonds=bonds)


def _followed(before: BondReport | None, now: BondReport, order: IntArray | None) -> IntArray:
    """Orbital of this point that continues each orbital of the first one.

    The overlap of old and new orbitals, with the mean of both overlap matrices, is assigned one to one.
    """
    n_mo = len(now.state.energies_eV)
    if before is None:
        return np.arange(n_mo) if order is None else order
    from scipy.optimize import linear_sum_assignment

    mean = (before.overlap + now.overlap) / 2
    likeness = (before.state.coefficients.T @ mean @ now.state.coefficients) ** 2
    _, partner = linear_sum_assignment(-likeness)
    assert order is not None
    followed: IntArray = partner.astype(np.intp)[order]
    return followed


def _point(value: float, report: BondReport, followed: IntArray) -> ScanPoint:
    spectrum, site = report.spectroscopy, report.sites[0]
    irreps = report.irreps.labels if report.irreps is not None else ("",) * len(report.basis)
    levels: tuple[ScannedLevel, ...] = ()
    if len(report.sites) == 1 and site.ladder is not None:
        levels = tuple(
            ScannedLevel(
                level.function,
                "" if level.orbital is None else irreps[level.orbital],
                level.energy_eV,
                level.electrons,
                level.metal_share,
            )
            for level in site.ladder.levels
        )
    return ScanPoint(
        value=value,
        fault="",
        energies_eV=report.state.energies_eV,
        occupations=report.state.occupations.sum(axis=0),
        irreps=irreps,
        followed=followed,
        charges=report.populations.charges,
        bonds=tuple(
            _bond(bond.length_A, orders, None if formal is None else float(formal.order))
            for (bond, orders), formal in zip(report.bonds(), report.formal_orders, strict=True)
        ),
        levels=levels,
        ground_term=spectrum.ground_term,
        bands_per_cm=tuple(
            (band.upper_term, band.wavenumber_per_cm)
            for band in spectrum.bands
            if band.kind != "charge transfer" and band.spin_allowed
        ),
        iterations=report.method.iterations,
        warnings=report.warnings,
        smearing_eV=report.state.smearing_eV,
    )


def _bond(length_A: float, orders: BondOrders, formal: float | None) -> ScannedBond:
    kinds: FloatArray = orders.channel_weights
    by_type = [float(kinds[orders.channel_shares.argmax(axis=1) == m].sum()) for m in range(3)]
    return ScannedBond(length_A, orders.overlap_population, orders.mayer, orders.wiberg, formal, *by_type)


def _scanned_bond(coordination: Coordination, plan: ScanPlan) -> int | None:
    if plan.coordinate != "length":
        return None
    return next(place for place, bond in enumerate(coordination.bonds) if (bond.metal, bond.donor) == plan.atoms)


def _crossings(points: Sequence[ScanPoint]) -> tuple[str, ...]:
    """Where the ladder changes its order, or the filling moves to other levels."""
    said = []
    good = [point for point in points if not point.fault]
    for before, after in pairwise(good):
        between = f"between {before.value:g} and {after.value:g}"
        if len(before.followed) == len(after.followed) and len(before.followed):
            filled = before.occupations[before.followed] - after.occupations[after.followed]
            changed = np.flatnonzero(np.abs(filled) > 0.5)
            if bool(before.smearing_eV) != bool(after.smearing_eV):
                said.append(f"{between} levels cross as the charges settle: whole electrons give way to shared ones")
            if len(changed):
                levels = ", ".join(
                    f"{after.followed[k] + 1} ({after.irreps[after.followed[k]] or '-'})" for k in changed
                )
                said.append(f"{between} the filling changes: orbitals {levels}")
        old, new = ([level.function for level in point.levels] for point in (before, after))
        if old != new and sorted(old) == sorted(new):
            said.append(f"{between} the ladder changes its order from {' < '.join(old)} to {' < '.join(new)}")
    return tuple(said)
