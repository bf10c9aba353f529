"""Symmetry, ladder, terms, bands and magnetism as plain data for the JSON document."""

from __future__ import annotations

from typing import Any

from ehmo.records.bands import BandFit
from ehmo.records.ligand_field import LadderLevel
from ehmo.records.multiplets import GTensor, Magnetism, Terms
from ehmo.records.report import BondReport
from ehmo.records.site import MetalSite, ShellConstants
from ehmo.records.symmetry import Symmetry
from ehmo.report.spread_document import band_spread, level_spread
from ehmo.units import PER_CM_PER_EV


def symmetry_part(report: BondReport) -> dict[str, Any]:
    """Groups of the whole molecule and of each sphere."""
    whole = report.molecule_symmetry
    return {
        "molecule": None if whole is None else _symmetry(whole),
        "spheres": [
            {
                "metal": site.metal,
                **_symmetry(site.symmetry),
                "shapes": [{"shape": shape.shape, "measure": shape.measure} for shape in site.shapes],
            }
            for site in report.sites
        ],
    }


def _symmetry(symmetry: Symmetry) -> dict[str, Any]:
    return {
        "point_group": symmetry.group.name,
        "rms_A": symmetry.rms_A,
        "continuous_symmetry_measure": symmetry.continuous_measure,
        "axes": symmetry.axes,
        "setting": symmetry.group.setting,
        "atoms": symmetry.atoms,
        "symmetrised_position_A": symmetry.symmetrised_A,
    }


def ladder_part(report: BondReport, site: MetalSite) -> dict[str, Any]:
    """Ladder of one metal with its ligand-field parameters, or the reason why there is none."""
    ladder, parameters = site.ladder, site.parameters
    part: dict[str, Any] = {
        "metal": site.metal,
        "bond_valence_sum": site.bond_valence_sum,
        "withheld": site.ladder_withheld or None,
        "shell": None,
        "selection": None,
        "levels": [],
        "field_eV": None,
        "reference_eV": None,
        "crystal_field_per_cm": None,
        "angular_overlap": [],
        "undetermined": [],
        "misfit_per_cm": None,
    }
    if ladder is None:
        return part
    lowest = ladder.levels[0].energy_eV
    part |= {
        "shell": ladder.shell,
        "selection": ladder.selection,
        "field_eV": ladder.field_eV,
        "reference_eV": ladder.reference_eV,
        "levels": [
            {
                "irrep": _level_irrep(report, level),
                "function": level.function,
                "function_share": level.function_share,
                "energy_eV": level.energy_eV,
                "above_lowest_per_cm": (level.energy_eV - lowest) * PER_CM_PER_EV,
                "orbital": level.orbital,
                "electrons": level.electrons,
                "metal_share": level.metal_share,
                "donor_share": level.donor_share,
                "overlap_population": level.overlap_population,
                "inverted": level.inverted,
                "partner_share": level.partner_share,
                "spread": level_spread(report, site, place),
            }
            for place, level in enumerate(ladder.levels)
        ],
    }
    if parameters is not None:
        part |= {
            "crystal_field_per_cm": parameters.crystal_field_per_cm or None,
            "angular_overlap": [
                {
                    "kind": item.kind,
                    "symmetry": item.symmetry,
                    "value_per_cm": None if item.value_eV is None else item.value_eV * PER_CM_PER_EV,
                }
                for item in parameters.angular_overlap
            ],
            "undetermined": list(parameters.undetermined),
            "misfit_per_cm": parameters.rms_per_cm,
        }
    return part


def _level_irrep(report: BondReport, level: LadderLevel) -> str | None:
    """Irrep of the orbital; where several metals share the orbitals, of the level's functions at the metal."""
    if report.irreps is None or level.orbital is None:
        return level.irrep or None
    return report.irreps.labels[level.orbital]


def spectroscopy_part(report: BondReport) -> dict[str, Any]:
    """Ground term, terms, bands, g tensor and magnetism."""
    spectrum = report.spectroscopy
    magnetism = spectrum.magnetism
    return {
        "ground_term": spectrum.ground_term or None,
        "shell_constants": None if spectrum.constants is None else _constants(spectrum.constants),
        "terms": [] if spectrum.terms is None else _terms(spectrum.terms),
        "bands": [
            {
                "wavenumber_per_cm": band.wavenumber_per_cm,
                "kind": band.kind,
                "direction": band.direction,
                "to_metal": band.to_metal,
                "transition": band.transition,
                "upper_term": band.upper_term or None,
                "degeneracy": band.degeneracy,
                "spin_allowed": band.spin_allowed,
                "dipole_allowed": band.dipole_allowed,
                "polarisation": band.polarisation or None,
                "oscillator_strength": band.oscillator_strength,
                "spread": band_spread(report, place),
            }
            for place, band in enumerate(spectrum.bands)
        ],
        "g_tensor": None if magnetism is None else _g_tensor(magnetism.g_tensor),
        "magnetism": None if magnetism is None else _magnetism(magnetism, spectrum.first_order_g),
        "band_fit": None if spectrum.fit is None else _fit(spectrum.fit, spectrum.fitted_magnetism),
        "spectroscopy_withheld": list(spectrum.withheld),
    }


def _constants(constants: ShellConstants) -> dict[str, Any]:
    return {
        "ion": constants.ion,
        "racah_B_per_cm": constants.racah_B_per_cm,
        "racah_C_per_cm": constants.racah_C_per_cm,
        "F2_per_cm": constants.F2_per_cm,
        "F4_per_cm": constants.F4_per_cm,
        "F6_per_cm": constants.F6_per_cm,
        "zeta_per_cm": constants.zeta_per_cm,
        "repulsion_factor": constants.repulsion_factor,
        "momentum_factor": constants.momentum_factor,
        "sources": list(constants.sources),
    }


def _terms(terms: Terms) -> list[dict[str, Any]]:
    return [
        {
            "label": term.label,
            "energy_per_cm": term.energy_per_cm,
            "degeneracy": term.degeneracy,
            "irrep_share": term.share,
            "parent": term.parent,
            "configuration": dict(term.configuration),
            "configuration_share": term.configuration_share,
        }
        for term in terms.terms
    ]


def _g_tensor(tensor: GTensor | None) -> dict[str, Any] | None:
    if tensor is None:
        return None
    return {"values": tensor.values, "axes": tensor.axes, "effective_spin": tensor.effective_spin}


def _magnetism(magnetism: Magnetism, first_order_g: tuple[float, float] | None) -> dict[str, Any]:
    splitting = magnetism.zero_field_splitting
    return {
        "temperature_K": magnetism.temperature_K,
        "spin": magnetism.spin,
        "spin_only_moment_bohr_magnetons": magnetism.spin_only_moment,
        "effective_moment_bohr_magnetons": magnetism.effective_moment,
        "D_per_cm": None if splitting is None else splitting.D_per_cm,
        "E_per_cm": None if splitting is None else splitting.E_per_cm,
        "zero_field_axes": None if splitting is None else splitting.axes,
        "doublet_g_tensor": _g_tensor(magnetism.doublet_g_tensor),
        "first_order_g": None
        if first_order_g is None
        else {"parallel": first_order_g[0], "perpendicular": first_order_g[1]},
        "withheld": list(magnetism.withheld),
    }


def _fit(fit: BandFit, magnetism: Magnetism | None) -> dict[str, Any]:
    return {
        "field_eV": fit.field_eV,
        "fitted_g_tensor": None if magnetism is None else _g_tensor(magnetism.g_tensor),
        "assignments": [
            {
                "observed_per_cm": item.observed_per_cm,
                "computed_per_cm": item.computed_per_cm,
                "fitted_per_cm": item.fitted_per_cm,
                "upper_term": item.upper_term,
            }
            for item in fit.assignments
        ],
        "parameters": [
            {
                "name": item.name,
                "computed_per_cm": item.computed_per_cm,
                "fitted_per_cm": item.fitted_per_cm,
                "width_per_cm": item.width_per_cm,
                "determined": item.determined,
            }
            for item in fit.parameters
        ],
        "undetermined": list(fit.undetermined),
    }
