"""Spread and numerical health as plain data for the JSON document."""

from __future__ import annotations

from typing import Any

from ehmo.records.report import BondReport
from ehmo.records.site import MetalSite
from ehmo.records.spread import Spread


def health_part(report: BondReport) -> dict[str, Any]:
    """Numerical health; bonds by their place in the list of bonds."""
    health = report.health
    return {
        "smallest_overlap_eigenvalue": health.smallest_overlap_eigenvalue,
        "iterations": health.iterations,
        "charge_residual_e": health.charge_residual,
        "impossible_populations": [
            {"atom": item.atom, "shell": item.shell, "gross_population": item.population}
            for item in health.impossible_populations
        ],
        "negative_bonds": list(health.negative_bonds),
        "antibonding_shells": [
            {"bond": item.bond, "shell": item.shell, "overlap_population": item.overlap_population}
            for item in health.antibonding_shells
        ],
        "smallest_metal_share": health.smallest_metal_share,
        "frontier_gap_eV": health.frontier_gap_eV,
        "nearly_degenerate": health.nearly_degenerate,
        "smeared": health.smeared,
    }


def spread_part(spread: Spread | None) -> dict[str, Any] | None:
    """Draws and parameters behind the standard deviations."""
    if spread is None:
        return None
    return {
        "draws": spread.draws,
        "seed": spread.seed,
        "used": spread.used,
        "indefinite_overlap": spread.indefinite_overlap,
        "unsettled": spread.unsettled,
        "other_configuration": spread.other_configuration,
        "parameters": [
            {
                "name": parameter.name,
                "unit": parameter.unit or None,
                "value": parameter.value,
                "standard_deviation": parameter.sd,
                "stated": parameter.stated,
            }
            for parameter in spread.parameters
        ],
    }


def bond_spread(report: BondReport, place: int) -> dict[str, Any] | None:
    """Standard deviations of one bond, under the names of the numbers that they belong to."""
    if report.spread is None:
        return None
    own, channels = report.spread.bonds[place], report.orders[place].channels
    return {
        "overlap_population": own.overlap_population,
        "mayer": own.mayer,
        "wiberg": own.wiberg,
        "channels": [
            {"type": channel.type, "weight": weight}
            for channel, weight in zip(channels, own.channel_weights, strict=True)
        ],
        "sensitivity": [
            {"parameter": effect.parameter, "mayer_per_sd": effect.mayer_per_sd} for effect in own.sensitivity
        ],
    }


def atom_spread(report: BondReport, atom: int) -> dict[str, Any] | None:
    """Standard deviation of one charge."""
    return None if report.spread is None else {"mulliken_charge": report.spread.charges[atom]}


def orbital_spread(report: BondReport, orbital: int) -> dict[str, Any] | None:
    """Standard deviation of one orbital energy, orbitals in the order of their energies."""
    return None if report.spread is None else {"energy_eV": report.spread.orbital_energies_eV[orbital]}


def level_spread(report: BondReport, site: MetalSite, level: int) -> dict[str, Any] | None:
    """Standard deviations of one level of a ladder."""
    spreads = report.level_spreads(site)
    if not spreads:
        return None
    return {
        "energy_eV": spreads[level].energy_eV,
        "above_lowest_per_cm": spreads[level].above_lowest_per_cm,
    }


def band_spread(report: BondReport, band: int) -> dict[str, Any] | None:
    """Standard deviation of one band; None where it could not be followed."""
    deviation = None if report.spread is None else report.spread.bands_per_cm[band]
    return None if deviation is None else {"wavenumber_per_cm": deviation}
