"""Energies along a scan, where the set is calibrated for them: which points, the minimum, its stretching modes."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace
from itertools import pairwise

import numpy as np
from numpy.polynomial import Polynomial

from basis_params import ParameterTable
from ehmo.calculate.energy import energy_model, state_energy
from ehmo.errors import EhmoError
from ehmo.records.arrays import FloatArray
from ehmo.records.coordination import Coordination
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options
from ehmo.records.report import BondReport
from ehmo.records.scan import ScanMinimum, ScannedMode, ScanPlan, ScanPoint
from ehmo.records.stretching import StretchingModes
from ehmo.studies.scan.plan import displaced
from ehmo.studies.stretching import atom_masses, stretching_modes
from ehmo.units import NEWTON_PER_M_PER_EV_A2

FIT_POINTS = 7
FEWEST_POINTS = 5
FIT_DEGREE = 4
"""The minimum is that of a quartic through the seven points (at least five) nearest to the lowest one."""

LEAST_SHARE = 0.02
"""Modes with a smaller squared part of the scanned bond are left out."""

SAME_WAVENUMBER_PER_CM = 0.5
"""Modes closer than this count as degenerate [cm^-1]."""

WHAT = "energy, minimum, force constant and wavenumber"


def why_no_energy(fragment: Fragment, plan: ScanPlan, table: ParameterTable, options: Options) -> str:
    """Why a scan gives no energy at all; empty if it gives them where the lengths lie in the calibrated range."""
    if plan.coordinate != "length":
        return f"{WHAT}: two-body terms are calibrated for bond lengths, not for angles"
    metal, donor = (fragment.symbols[atom] for atom in plan.atoms)
    if table.pair_repulsion(metal, donor) is None:
        return f"{WHAT}: the set {table.name} is not calibrated for {metal}-{donor}"
    if energy_model(table, options).settings != table.settings or options.charge_model == "fixed":
        return f"{WHAT}: the set {table.name} is calibrated with its own constants and self-consistent charges"
    return ""


def point_energy(plan: ScanPlan, value: float, report: BondReport, table: ParameterTable) -> float | None:
    """Energy of a point above the separated neutral atoms; None outside the calibrated range [eV]."""
    term = table.pair_repulsion(*(report.fragment.symbols[atom] for atom in plan.atoms[:2]))
    if term is None or not term.covers(value):
        return None
    return state_energy(report.fragment, table, report.state, report.populations.charges).free_eV


def outside_range(plan: ScanPlan, fragment: Fragment, table: ParameterTable) -> str:
    """Which part of the scan lies outside the calibrated range, in words; empty if none does."""
    term = table.pair_repulsion(*(fragment.symbols[atom] for atom in plan.atoms[:2]))
    if term is None:
        return ""
    outside = [value for value in plan.values if not term.covers(value)]
    if not outside:
        return ""
    return (
        f"energy at {len(outside)} of {len(plan.values)} points: the set {table.name} is calibrated for {term.label} "
        f"from {term.lowest_A:g} to {term.highest_A:g} Å"
    )


def same_state(before: ScanPoint, after: ScanPoint) -> bool:
    """Whether two points fill the same levels, followed by their character, by whole electrons or not alike."""
    if len(before.followed) != len(after.followed) or bool(before.smearing_eV) != bool(after.smearing_eV):
        return False
    filled = before.occupations[before.followed] - after.occupations[after.followed]
    return bool((np.abs(filled) <= 0.5).all())


def minimum(
    points: Sequence[ScanPoint],
    fragment: Fragment,
    coordination: Coordination,
    plan: ScanPlan,
    table: ParameterTable,
    options: Options,
    isotopes: Mapping[str, int],
) -> tuple[ScanMinimum | None, str]:
    """Minimum of the energy with its force constant and stretching modes, or the reason why there is none.

    Parameters
    ----------
    points : sequence of ScanPoint
        In the order of the plan.
    fragment : Fragment
        Start.
    coordination : Coordination
    plan : ScanPlan
    table : ParameterTable
    options : Options
    isotopes : mapping of str to int
        See `atom_masses`.

    Returns
    -------
    minimum : ScanMinimum or None
    reason : str
        Empty if there is a minimum.
    """
    what = "minimum, force constant and wavenumber"
    with_energy = sorted((point for point in points if point.energy_eV is not None), key=lambda point: point.value)
    if len(with_energy) < FEWEST_POINTS:
        return None, f"{what}: {len(with_energy)} points with an energy, fewer than {FEWEST_POINTS}"
    lowest = min(range(len(with_energy)), key=lambda k: _energy(with_energy[k]))
    if lowest in (0, len(with_energy) - 1):
        return None, f"{what}: the energy is lowest at the end of the range, {with_energy[lowest].value:.3f} Å"
    start = min(max(lowest - FIT_POINTS // 2, 0), max(len(with_energy) - FIT_POINTS, 0))
    near = with_energy[start : start + FIT_POINTS]
    if not all(same_state(a, b) for a, b in pairwise(near)):
        return None, f"{what}: the filling changes next to the lowest point, {with_energy[lowest].value:.3f} Å"
    length, energy, curvature, rms = quartic_minimum(
        np.array([point.value for point in near]), np.array([_energy(point) for point in near])
    )
    if not curvature > 0:
        return None, f"{what}: the points about {with_energy[lowest].value:.3f} Å make no minimum"
    found = ScanMinimum(
        length,
        energy,
        curvature * NEWTON_PER_M_PER_EV_A2,
        tuple(point.value for point in near),
        rms,
        (),
        tuple(sorted(isotopes.items())),
    )
    nearest = min(near, key=lambda point: abs(point.value - length))
    if nearest.positions_A is not None:
        fragment = replace(fragment, positions_A=nearest.positions_A)
    masses = atom_masses(fragment, isotopes)
    try:
        modes = _modes(displaced(fragment, plan, length), coordination, plan, table, options, masses)
    except EhmoError as error:
        return found, f"stretching wavenumber: {error.fault}"
    return replace(found, modes=modes), ""


def _energy(point: ScanPoint) -> float:
    assert point.energy_eV is not None
    return point.energy_eV


def quartic_minimum(lengths_A: FloatArray, energies_eV: FloatArray) -> tuple[float, float, float, float]:
    """Minimum of the quartic through some points, by least squares.

    Parameters
    ----------
    lengths_A, energies_eV : (n,) ndarray
        At least five points about the minimum.

    Returns
    -------
    length, energy, curvature, rms : float
        [angstrom], [eV], second derivative [eV/angstrom^2] and rms distance of the points [eV]; the curvature is NaN
        if the quartic has no minimum between the points.
    """
    fitted = Polynomial.fit(lengths_A, energies_eV, FIT_DEGREE)
    roots = fitted.deriv().roots()
    real = roots[np.abs(roots.imag) < 1e-9].real
    inside = [r for r in real if lengths_A.min() <= r <= lengths_A.max() and fitted.deriv(2)(r) > 0]
    rms = float(np.sqrt(np.mean((fitted(lengths_A) - energies_eV) ** 2)))
    if not inside:
        return float("nan"), float("nan"), float("nan"), rms
    best = min(inside, key=lambda r: float(fitted(r)))
    return float(best), float(fitted(best)), float(fitted.deriv(2)(best)), rms


def _modes(
    fragment: Fragment,
    coordination: Coordination,
    plan: ScanPlan,
    table: ParameterTable,
    options: Options,
    masses_u: FloatArray,
) -> tuple[ScannedMode, ...]:
    """Stretching modes with a part in the scanned bond, over all bonds that the set is calibrated for."""
    model = energy_model(table, options)
    positions, symbols, labels = fragment.positions_A, fragment.symbols, fragment.labels
    bonds = [
        bond
        for bond in coordination.bonds
        if (bond.metal, bond.donor) == plan.atoms
        or model.calibrated(
            symbols[bond.metal],
            symbols[bond.donor],
            float(np.linalg.norm(positions[bond.donor] - positions[bond.metal])),
        )
    ]
    place = next(k for k, bond in enumerate(bonds) if (bond.metal, bond.donor) == plan.atoms)
    modes = stretching_modes(fragment, coordination, bonds, model, masses_u)
    return modes_of_bond(modes, place, tuple(f"{labels[bond.metal]}-{labels[bond.donor]}" for bond in bonds))


def modes_of_bond(modes: StretchingModes, place: int, bond_labels: tuple[str, ...]) -> tuple[ScannedMode, ...]:
    """Modes with a part in one bond; of a degenerate set the combination with all of that part.

    Parameters
    ----------
    modes : StretchingModes
    place : int
        The bond.
    bond_labels : tuple of str

    Returns
    -------
    modes : tuple of ScannedMode
    """
    found = []
    wavenumbers = modes.wavenumbers_per_cm
    starts = [
        0,
        *(k for k in range(1, len(wavenumbers)) if wavenumbers[k - 1] - wavenumbers[k] > SAME_WAVENUMBER_PER_CM),
    ]
    for first, stop in pairwise([*starts, len(wavenumbers)]):
        parts = modes.vectors[first:stop, place]
        share = float(parts @ parts)
        if share < LEAST_SHARE:
            continue
        stretches = parts @ modes.stretches[first:stop]
        stretches /= np.linalg.norm(stretches)
        found.append(
            ScannedMode(
                float(wavenumbers[first:stop].mean()),
                float(modes.reduced_masses_u[first:stop].mean()),
                share,
                tuple(zip(bond_labels, (float(part) for part in stretches), strict=True)),
            )
        )
    return tuple(found)
