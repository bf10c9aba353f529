"""The report on an extended structure as a JSON document; README describes its fields."""

from __future__ import annotations

import json
from collections.abc import Sequence
from typing import Any

import numpy as np

from ehmo import __version__
from ehmo.records.bonding import BondOrders
from ehmo.records.crystal import MetalDonorUnit
from ehmo.records.crystal_report import CrystalReport
from ehmo.report.bands_text import band_blocks
from ehmo.report.cautions import CAUTIONS
from ehmo.report.document import plain_data

SCHEMA = "ehmo crystal report 1"
"""Name and version of the document; the version rises when a field changes its meaning."""


def crystal_document(report: CrystalReport) -> dict[str, Any]:
    """Crystal report as plain data: dictionaries, lists, numbers and text, NaN as None.

    Parameters
    ----------
    report : CrystalReport
        Result of a calculation.

    Returns
    -------
    document : dict
        Ready for `json.dumps`.
    """
    document: dict[str, Any] = plain_data(
        {
            "schema": SCHEMA,
            "program_version": __version__,
            "crystal": _crystal(report),
            "method": _method(report),
            "mesh": _mesh(report),
            "filling": _filling(report),
            "gap": _gap(report),
            "atoms": _atoms(report),
            "bonds": [_bond(report, place, unit, orders) for place, (unit, orders) in enumerate(report.bonds())],
            "band_blocks": [
                {
                    "lowest_eV": block.lowest_eV,
                    "highest_eV": block.highest_eV,
                    "bands": block.bands.stop - block.bands.start,
                    "electrons": block.electrons,
                    "shell_shares": block.shares,
                    "metal_donor_overlap_population_per_two_electrons": block.overlap_population,
                }
                for block in band_blocks(report)
            ],
            "density_of_states": _density(report),
            "crystal_orbital_overlap_population": {
                "energy_eV": report.overlap_population.energies_eV,
                "broadening_eV": report.overlap_population.width_eV,
                "bonds": [np.round(curve, 6) for curve in report.overlap_population.values],
            },
            "path": _path(report),
            "mesh_convergence": _convergence(report),
            "assumptions": list(report.assumptions),
            "warnings": list(report.warnings),
            "cautions": list(CAUTIONS),
        }
    )
    return document


def crystal_json(reports: Sequence[CrystalReport]) -> str:
    """JSON text of one report, or of several as ``{"schema", "reports"}``."""
    documents = [crystal_document(report) for report in reports]
    whole = documents[0] if len(documents) == 1 else {"schema": SCHEMA, "reports": documents}
    return json.dumps(whole, indent=1, ensure_ascii=False, allow_nan=False) + "\n"


def _crystal(report: CrystalReport) -> dict[str, Any]:
    return {
        "source": report.source,
        "title": report.title,
        "networks": list(report.networks),
        "formula": report.formula,
        "cell_A": report.cell_A,
        "cells_in_the_cell_of_the_file": report.cell_ratio,
        "valence_electrons": report.bonding.electrons.total,
        "unpaired_electrons": report.bonding.electrons.unpaired,
    }


def _method(report: CrystalReport) -> dict[str, Any]:
    method, state = report.method, report.bonding.state
    return {
        "parameter_set": method.parameter_set,
        "parameter_edition": method.edition,
        "parameter_sha256": method.parameter_sha256,
        "parameter_origin": method.parameter_origin,
        "charge_model": method.charge_model,
        "converged": True,  # a calculation that does not converge raises instead of reporting
        "iterations": method.iterations,
        "charge_residual_e": method.charge_residual,
        "smearing_eV": method.smearing_eV,
        "K": method.K,
        "K_sigma": method.K_sigma,
        "K_pi": method.K_pi,
        "K_delta": method.K_delta,
        "K_decay_per_A": method.K_decay_per_A,
        "weighting": method.weighting,
        "lambda": method.lambda_,
        "smallest_overlap_eigenvalue": method.smallest_overlap_eigenvalue,
        "energy_eV": state.energy_eV,
        "band_energy_eV": state.band_energy_eV,
    }


def _mesh(report: CrystalReport) -> dict[str, Any]:
    state = report.bonding.state
    return {
        "counts": list(state.mesh.counts),
        "points": state.mesh.points,
        "weights": state.mesh.weights,
        "energies_eV": np.round(state.energies_eV, 8),
    }


def _filling(report: CrystalReport) -> dict[str, Any]:
    filling = report.bonding.state.filling
    return {
        "kind": "metal" if report.bonding.gap is None else "insulator",
        "fermi_eV": filling.fermi_eV,
        "smearing_eV": filling.smearing_eV,
    }


def _gap(report: CrystalReport) -> dict[str, Any] | None:
    gap = report.bonding.gap
    if gap is None:
        return None
    return {
        "gap_eV": gap.gap_eV,
        "direct": gap.is_direct,
        "direct_gap_eV": gap.direct_eV,
        "direct_k": list(gap.direct_k),
        "valence_eV": gap.valence_eV,
        "valence_k": list(gap.valence_k),
        "conduction_eV": gap.conduction_eV,
        "conduction_k": list(gap.conduction_k),
    }


def _atoms(report: CrystalReport) -> list[dict[str, Any]]:
    bonding = report.bonding
    starts = bonding.basis.atom_start[:-1]
    net = np.add.reduceat(bonding.populations.net, starts)
    entries = []
    for atom, label in enumerate(report.labels):
        place = bonding.place_of.get(atom)
        entries.append(
            {
                "site_label": label,
                "site": report.sites[atom],
                "symbol": report.symbols[atom],
                "position_A": report.positions_A[atom],
                "functions": place is not None,
                "mulliken_charge": bonding.charges[atom],
                "gross_population": None
                if place is None
                else bonding.basis.core_charges[place] - bonding.populations.charges[place],
                "net_population": None if place is None else net[place],
                "spin_population": None if place is None else bonding.populations.spin[place],
            }
        )
    return entries


def _bond(report: CrystalReport, place: int, unit: MetalDonorUnit, orders: BondOrders) -> dict[str, Any]:
    bond = report.bonding.bonds[place]
    return {
        "metal": bond.metal,
        "donor": bond.donor,
        "translation": list(bond.translation),
        "label": f"{unit.metal}-{unit.donor}",
        "kind": str(unit.kind),
        "metals_at_donor": unit.n_metals,
        "length_A": unit.length_A,
        "bond_valence": unit.bond_valence,
        "per_metal": unit.per_metal,
        "multiplicity": unit.multiplicity,
        "overlap_population": orders.overlap_population,
        "mayer": orders.mayer,
        "wiberg": orders.wiberg,
        "channels": [
            {
                "type": channel.type,
                "weight": channel.weight,
                "type_share": channel.shares.max(),
                "metal_hybrid": report.hybrid_composition(bond.metal, channel.metal_hybrid),
                "donor_hybrid": report.hybrid_composition(bond.donor, channel.donor_hybrid),
            }
            for channel in orders.channels
        ],
    }


def _density(report: CrystalReport) -> dict[str, Any]:
    """Projections by site and shell: symmetry-equivalent atoms count together."""
    basis, atoms = report.bonding.basis, report.bonding.atoms
    curves: dict[tuple[int, str], Any] = {}
    labels: dict[int, str] = {}
    for shell, place in enumerate(basis.shell_atom):
        atom = int(atoms[place])
        site = int(report.sites[atom])
        labels.setdefault(site, report.labels[atom])
        key = (site, basis.shell_label(shell))
        curves[key] = curves.get(key, 0) + report.density.values[shell]
    return {
        "energy_eV": report.density.energies_eV,
        "broadening_eV": report.density.width_eV,
        "total_per_eV": np.round(report.density.values.sum(axis=0), 6),
        "projections": [
            {"site_label": labels[site], "site": site, "shell": shell, "per_eV": np.round(curve, 6)}
            for (site, shell), curve in curves.items()
        ],
    }


def _path(report: CrystalReport) -> dict[str, Any] | None:
    path = report.bonding.path
    if path is None:
        return None
    return {
        "path": path.path,
        "points": path.points,
        "distance_per_A": path.distances,
        "labels": [{"point": k, "name": name} for k, name in path.labels],
        "energies_eV": np.round(path.energies_eV, 8),
    }


def _convergence(report: CrystalReport) -> dict[str, Any] | None:
    change = report.bonding.mesh_change
    if change is None:
        return None
    return {
        "other_counts": list(change.counts),
        "energy_per_atom_eV": change.energy_per_atom_eV,
        "largest_charge_e": change.largest_charge_e,
        "largest_order": change.largest_order,
        "gap_eV": change.gap_eV,
    }
