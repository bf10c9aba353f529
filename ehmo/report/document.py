"""The bond report as a JSON document; README describes its fields."""

from __future__ import annotations

import json
import re
from collections.abc import Mapping, Sequence
from math import isfinite
from typing import Any, Final

from ehmo import __version__
from ehmo.records.reactivity import DonorReactivity
from ehmo.records.report import BondReport
from ehmo.report.cautions import CAUTIONS
from ehmo.report.ladder_document import ladder_part, spectroscopy_part, symmetry_part
from ehmo.report.population_document import irrep_populations, orbital_shells, overlap_parts, shell_parts
from ehmo.report.spread_document import atom_spread, bond_spread, health_part, orbital_spread, spread_part

SCHEMA = "ehmo bond report 1"
"""Name and version of the document; the version rises when a field changes its meaning."""


def bond_document(report: BondReport) -> dict[str, Any]:
    """Bond report as plain data: dictionaries, lists, numbers and text, NaN as None.

    Parameters
    ----------
    report : BondReport
        Result of a calculation.

    Returns
    -------
    document : dict
        Ready for `json.dumps`.
    """
    plain: dict[str, Any] = plain_data(
        {
            "schema": SCHEMA,
            "program_version": __version__,
            "fragment": _fragment(report),
            "method": _method(report),
            "symmetry": symmetry_part(report),
            "oxidation_state": report.electrons.metal_oxidation_total if len(report.sites) == 1 else None,
            "d_count": report.electrons.d_electrons,
            "orbitals": _orbitals(report),
            "atoms": _atoms(report),
            "populations_by_irrep": irrep_populations(report),
            "ligands": _ligands(report),
            "bonds": [_bond(report, place) for place in report.distinct_bonds()],
            "ladder": [ladder_part(report, site) for site in report.sites],
            **spectroscopy_part(report),
            "local_frames": [
                {
                    "metal": frame.metal,
                    "axes": frame.axes,
                    "z_reason": frame.z_reason,
                    "x_reason": frame.x_reason,
                }
                for frame in report.coordination.frames
            ],
            "health": health_part(report),
            "spread": spread_part(report.spread),
            "assumptions": list(report.assumptions),
            "warnings": list(report.warnings),
            "cautions": list(CAUTIONS),
        }
    )
    return plain


def json_text(reports: Sequence[BondReport], refused: Mapping[str, str] | None = None) -> str:
    """JSON text of one report, or of several as ``{"schema", "reports"}``, with what could not be calculated.

    Parameters
    ----------
    reports : sequence of BondReport
    refused : mapping of str to str, optional
        Reason by source, for molecules of a crystal without a report.

    Returns
    -------
    text : str
    """
    documents = [bond_document(report) for report in reports]
    whole: dict[str, Any] = {"schema": SCHEMA, "reports": documents}
    if refused:
        whole["not_reported"] = [{"source": source, "reason": reason} for source, reason in refused.items()]
    elif len(documents) == 1:
        whole = documents[0]
    return harmless(json.dumps(whole, indent=1, ensure_ascii=False, allow_nan=False)) + "\n"


def harmless(text: str) -> str:
    """JSON text with every character that steers a terminal written as an escape."""
    return _STEERING.sub(lambda found: f"\\u{ord(found[0]):04x}", text)


_STEERING = re.compile("[\x7f-\x9f\u200e\u200f\u2028-\u202e\u2066-\u2069]")


def _fragment(report: BondReport) -> dict[str, Any]:
    fragment = report.fragment
    return {
        "source": fragment.source,
        "title": fragment.title,
        "formula": fragment.formula,
        "charge": fragment.charge,
        "charge_reason": report.electrons.charge_reason,
        "unpaired_electrons": fragment.unpaired_electrons,
        "unpaired_reason": report.electrons.unpaired_reason,
        "metal_oxidation_total": report.electrons.metal_oxidation_total,
        "d_electrons": report.electrons.d_electrons,
        "multiplicity": None if fragment.crystal is None else fragment.crystal.multiplicity,
        "atoms": [
            {"label": label, "symbol": symbol, "position_A": position, "site_label": site}
            for label, symbol, position, site in zip(
                fragment.labels,
                fragment.symbols,
                fragment.positions_A,
                [None] * len(fragment) if fragment.crystal is None else fragment.crystal.labels,
                strict=True,
            )
        ],
    }


def _method(report: BondReport) -> dict[str, Any]:
    method = report.method
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
        "energy_eV": report.state.energy_eV,
    }


def _orbitals(report: BondReport) -> list[dict[str, Any]]:
    # Lists first: taking single numbers out of arrays is slow.
    composition = report.populations.orbital_shares.tolist()
    overlap, energies = report.orbital_overlap().tolist(), report.state.energies_eV.tolist()
    occupations = report.state.occupations.sum(axis=0).tolist()
    irreps, shells = report.orbital_irreps, orbital_shells(report)
    return [
        {
            "energy_eV": energies[k],
            "irrep": None if irreps is None else irreps.labels[k] or None,
            "irrep_share": None if irreps is None else irreps.label_shares[k],
            "occupation": occupations[k],
            "metal_share": composition[k][0],
            "donor_share": composition[k][1],
            "other_share": composition[k][2],
            "metal_donor_overlap_population_per_two_electrons": overlap[k],
            "shell_shares": shells[k],
            "spread": orbital_spread(report, k),
        }
        for k in range(len(composition))
    ]


def _atoms(report: BondReport) -> list[dict[str, Any]]:
    populations = report.populations
    net = populations.atom_overlap.diagonal()
    return [
        {
            "label": label,
            "mulliken_charge": populations.charges[k],
            "gross_population": report.basis.core_charges[k] - populations.charges[k],
            "net_population": net[k],
            "spin_population": populations.spin[k],
            "shells": shell_parts(report, k),
            "spread": atom_spread(report, k),
        }
        for k, label in enumerate(report.fragment.labels)
    ]


def _ligands(report: BondReport) -> list[dict[str, Any]]:
    return [
        {
            "formula": ligand.formula,
            "atoms": list(ligand.atoms),
            "donors": list(ligand.donors),
            "metals": list(ligand.metals),
            "charge": ligand.charge,
            "charge_reason": ligand.charge_reason,
        }
        for ligand in report.coordination.ligands
    ]


def _bond(report: BondReport, place: int) -> dict[str, Any]:
    bond, orders, formal = report.coordination.bonds[place], report.orders[place], report.formal_orders[place]
    crystal = report.fragment.crystal
    return {
        "metal": bond.metal,
        "donor": bond.donor,
        "label": report.bond_label(bond),
        "kind": str(bond.kind),
        "length_A": bond.length_A,
        "per_metal": None if crystal is None else crystal.bonds_per_metal(bond.metal, bond.donor),
        "multiplicity": None if crystal is None else crystal.bond_multiplicity(bond.metal, bond.donor),
        "bond_valence": bond.bond_valence,
        "overlap_population": orders.overlap_population,
        **overlap_parts(report, place),
        "mayer": orders.mayer,
        "wiberg": orders.wiberg,
        "formal_order": None if formal is None else float(formal.order),
        "formal_order_fraction": None if formal is None else str(formal.order),
        "formal_order_words": None if formal is None else formal.words,
        "formal_order_rule": (formal.rule or None) if formal is not None else None,
        "reactivity": next((_reactivity(reading) for reading in report.reactivity if reading.bond == place), None),
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
        "spread": bond_spread(report, place),
    }


def _reactivity(reading: DonorReactivity) -> dict[str, Any]:
    return {
        "leaning": reading.leaning,
        "homo_share": reading.homo_share,
        "lumo_share": reading.lumo_share,
        "pi_star_eV": reading.pi_star_eV,
        "pi_star_gap_eV": reading.pi_star_gap_eV,
    }


_PLAIN: Final = frozenset({str, int, bool, type(None)})


def plain_data(value: Any) -> Any:
    """Arrays to lists, NaN to None, numbers to Python's own."""
    # A report holds thousands of numbers: what stays as it is is told without a call. x - x is 0 where x is finite.
    if isinstance(value, dict):
        return {
            key: item if type(item) in _PLAIN or (type(item) is float and item - item == 0.0) else plain_data(item)
            for key, item in value.items()
        }
    if isinstance(value, (list, tuple)):
        return [
            item if type(item) in _PLAIN or (type(item) is float and item - item == 0.0) else plain_data(item)
            for item in value
        ]
    if hasattr(value, "tolist"):
        return plain_data(value.tolist())
    if isinstance(value, float) and not isfinite(value):
        return None
    return value
