"""Populations by shell, function, orbital and irrep as plain data for the JSON document."""

from __future__ import annotations

from typing import Any

import numpy as np

from ehmo.analysis.population_parts import orbital_shell_shares, sums_by_irrep
from ehmo.records.arrays import FloatArray
from ehmo.records.report import BondReport

LISTED_SHARE = 0.005
"""Shares of shells below are not written."""

LISTED_POPULATION = 0.005
"""The same for electrons and overlap populations of single parts [e]."""

_DIGITS = 6  # decimals: enough to add up, and a third of the length


def shell_parts(report: BondReport, atom: int) -> list[dict[str, Any]]:
    """Gross and net population of each shell of an atom, and the gross population of its functions."""
    basis, populations = report.basis, report.populations
    net, gross = populations.shell_overlap.diagonal(), np.round(populations.gross, _DIGITS).tolist()
    parts = []
    for shell in np.flatnonzero(basis.shell_atom == atom).tolist():
        functions = np.flatnonzero(basis.shell_of == shell).tolist()
        parts.append(
            {
                "shell": basis.shell_label(shell),
                "gross_population": populations.gross[functions].sum(),
                "net_population": net[shell],
                "functions": {basis.function_label(i): gross[i] for i in functions},
            }
        )
    return parts


def orbital_shells(report: BondReport) -> list[dict[str, float]]:
    """Shells that each orbital is made of, largest first."""
    shares = orbital_shell_shares(report.state, report.overlap, report.basis)
    names = _shell_names(report)
    return _named(names, shares.T, LISTED_SHARE)


def irrep_populations(report: BondReport) -> list[dict[str, Any]] | None:
    """Electrons of each irrep and the shells that hold them; None without labels."""
    irreps = report.orbital_irreps
    if irreps is None:
        return None
    filling = report.state.occupations.sum(axis=0)
    shares = orbital_shell_shares(report.state, report.overlap, report.basis)
    held = sums_by_irrep(shares * filling, irreps.labels)
    populations = _named(_shell_names(report), np.array(list(held.values())), LISTED_POPULATION)
    return [
        {"irrep": irrep or None, "electrons": gross.sum(), "shell_populations": shells}
        for (irrep, gross), shells in zip(held.items(), populations, strict=True)
    ]


def overlap_parts(report: BondReport, place: int) -> dict[str, Any]:
    """Overlap population of one bond by pairs of shells, by irrep and by orbital."""
    basis, bond, orders = report.basis, report.coordination.bonds[place], report.orders[place]
    pairs = report.populations.shell_overlap
    by_shell = {
        f"{basis.shell_label(one)}-{basis.shell_label(other)}": round(float(pairs[one, other]), _DIGITS)
        for one in np.flatnonzero(basis.shell_atom == bond.metal).tolist()
        for other in np.flatnonzero(basis.shell_atom == bond.donor).tolist()
    }
    by_orbital = orders.orbital_overlap * report.state.occupations.sum(axis=0) / 2
    irreps = report.orbital_irreps
    by_irrep = None
    if irreps is not None:
        sums = {irrep: float(total) for irrep, total in sums_by_irrep(by_orbital, irreps.labels).items()}
        by_irrep = {
            irrep: round(total, _DIGITS) for irrep, total in sums.items() if irrep and abs(total) >= LISTED_POPULATION
        }
    return {
        "overlap_by_shells": by_shell,
        "overlap_by_irrep": by_irrep,
        "overlap_by_orbital": [
            {"orbital": int(k), "overlap_population": round(float(by_orbital[k]), _DIGITS)}
            for k in np.flatnonzero(np.abs(by_orbital) >= LISTED_POPULATION)
        ],
    }


def _shell_names(report: BondReport) -> list[str]:
    basis, labels = report.basis, report.fragment.labels
    return [f"{labels[atom]} {basis.shell_label(shell)}" for shell, atom in enumerate(basis.shell_atom.tolist())]


def _named(names: list[str], rows: FloatArray, least: float) -> list[dict[str, float]]:
    """Values of each row by name, largest first, without those below `least`."""
    sizes = np.abs(rows)
    order = np.argsort(-sizes, axis=-1, kind="stable")
    values = np.round(np.take_along_axis(rows, order, axis=-1), _DIGITS).tolist()
    counts = (sizes >= least).sum(axis=-1).tolist()
    return [
        {names[place]: value for place, value in zip(places[:count], found, strict=False)}
        for places, found, count in zip(order.tolist(), values, counts, strict=True)
    ]
