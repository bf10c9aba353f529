"""The bond report as text for a terminal."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence

import numpy as np

from ehmo.analysis.local_frame import local_gross_populations
from ehmo.errors import visible
from ehmo.records.arrays import FloatArray
from ehmo.records.bonding import BondChannel
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.report import BondReport
from ehmo.records.table import aligned
from ehmo.records.wording import BOND_NUMBERS, PARTIAL_CHANNEL, bond_rows, electrons_in_words
from ehmo.report.cautions import CAUTIONS
from ehmo.structure.elements import F_BLOCK, with_state

WIDTH = 100
_FRONTIER = 6


def bond_text(report: BondReport) -> str:
    """Whole report as text.

    Parameters
    ----------
    report : BondReport
        Result of a calculation.

    Returns
    -------
    text : str
        Lines of at most about 100 characters, control characters of the source shown.
    """
    sections = [
        _heading(report),
        *(_bonds_of(report, metal) for metal in report.coordination.metals),
        _hybrids(report),
        _charges(report),
        _frontier(report),
        _sentences("Assumed", report.assumptions),
        _sentences("To doubt", report.warnings or ("nothing in particular, beyond the cautions below",)),
        _sentences("Cautions", CAUTIONS),
    ]
    return "\n\n".join("\n".join(section) for section in sections if section) + "\n"


def _count_in_words(report: BondReport) -> str:
    """Oxidation state and d count by textbook counting, where they can be told."""
    total, metals = report.electrons.metal_oxidation_total, report.coordination.metals
    if total is None:
        return ""
    if len(metals) > 1:
        return f"; metals {total:+d} in all by counting"
    symbol = report.fragment.symbols[metals[0]]
    count = report.electrons.d_electrons
    configuration = "" if count is None else f" {'f' if symbol in F_BLOCK else 'd'}{count}"
    return f"; {with_state(symbol, total)}{configuration} by counting"


def _axes(report: BondReport) -> list[str]:
    """Local axes of each metal, in words."""
    labels = report.fragment.labels
    return [f"Axes of {labels[f.metal]}: z {f.z_reason}, x {f.x_reason}" for f in report.coordination.frames]


def _heading(report: BondReport) -> list[str]:
    fragment, method = report.fragment, report.method
    charges = (
        "fixed charges"
        if method.charge_model == "fixed"
        else f"self-consistent charges (lambda {method.lambda_:g}, converged in {method.iterations} iterations)"
    )
    return [
        visible(fragment.source) or "fragment",
        *textwrap.wrap(f"Title: {visible(fragment.title)}" if fragment.title else "", WIDTH, subsequent_indent="  "),
        f"{fragment.formula}, {electrons_in_words(fragment)}{_count_in_words(report)}",
        f"Extended Hückel, set {visible(method.parameter_set)} ({visible(method.edition)}), {charges}",
    ]


def _bonds_of(report: BondReport, metal: int) -> list[str]:
    rows = bond_rows(report.coordination.bonds_of(metal), report.orders_of(metal), report.fragment.labels)
    return [f"Bonds of {report.fragment.labels[metal]}", *aligned(rows, numeric=BOND_NUMBERS, indent="  ")]


def _hybrids(report: BondReport) -> list[str]:
    """Make-up of the channels of the bonds that may be multiple."""
    rows = [["bond", "channel", "weight", "metal hybrid", "donor hybrid"]]
    for bond, orders in report.bonds():
        if bond.may_be_multiple:
            rows += [
                [
                    report.bond_label(bond),
                    channel.type,
                    f"{channel.weight:.2f}",
                    *_hybrid_cells(report, bond, channel),
                ]
                for channel in orders.channels
                if channel.weight >= PARTIAL_CHANNEL
            ]
    return ["What the channels are made of", *aligned(rows, numeric=(2,), indent="  ")] if len(rows) > 1 else []


def _hybrid_cells(report: BondReport, bond: MetalDonorBond, channel: BondChannel) -> list[str]:
    cells = []
    for atom, hybrid in ((bond.metal, channel.metal_hybrid), (bond.donor, channel.donor_hybrid)):
        shares = sorted(report.hybrid_composition(atom, hybrid).items(), key=lambda item: -item[1])
        cells.append(", ".join(f"{100 * share:.0f} % {shell}" for shell, share in shares if share >= 0.005))
    return cells


def _charges(report: BondReport) -> list[str]:
    unpaired = bool(report.fragment.unpaired_electrons)
    listed = sorted({*report.coordination.metals, *(bond.donor for bond in report.coordination.bonds)})
    rows = [["atom", "charge/e", *(["unpaired/e"] if unpaired else [])]]
    for atom in listed:
        row = [report.fragment.labels[atom], f"{report.populations.charges[atom]:+.2f}"]
        rows.append([*row, f"{report.populations.spin[atom]:.2f}"] if unpaired else row)
    rest = np.delete(np.arange(len(report.fragment)), listed)
    if len(rest):
        row = ["all others", f"{report.populations.charges[rest].sum():+.2f}"]
        rows.append([*row, f"{report.populations.spin[rest].sum():.2f}"] if unpaired else row)
    return ["Mulliken charges (positive = electron poor)", *aligned(rows, numeric=(1, 2), indent="  ")]


def _frontier(report: BondReport) -> list[str]:
    """Orbitals round the highest one that holds electrons, topmost first."""
    state = report.state
    composition, overlap = 100 * report.populations.orbital_shares, report.orbital_overlap()
    filling = state.occupations.sum(axis=0)
    shown = range(min(state.homo + _FRONTIER, len(filling) - 1), max(state.homo - _FRONTIER, -1), -1)
    gross = local_gross_populations(shown, state.coefficients, report.overlap, report.basis, report.coordination)
    rows = [
        [
            "orbital",
            "energy/eV",
            "electrons",
            "metal/%",
            "donors/%",
            "rest/%",
            "M-donor overlap pop.",
            "mostly",
        ]
    ]
    rows += [
        [
            str(k + 1),
            f"{state.energies_eV[k]:.2f}",
            f"{filling[k]:g}" if filling[k] in (0, 1, 2) else f"{filling[k]:.2f}",
            *(f"{share:z.0f}" for share in composition[k]),
            f"{overlap[k]:+z.2f}",
            _leading_part(report, gross[:, place]),
        ]
        for place, k in enumerate(shown)
    ]
    heading = "Frontier orbitals (overlap population for two electrons, positive = bonding)"
    return [heading, *_axes(report), *aligned(rows, numeric=range(7), indent="  ")]


def _leading_part(report: BondReport, gross: FloatArray) -> str:
    """Functions that carry an orbital, by gross population."""
    basis, labels = report.basis, report.fragment.labels
    leading = [int(i) for i in np.argsort(-gross)[:2] if gross[i] >= 0.1]
    return ", ".join(f"{100 * gross[i]:.0f} % {labels[basis.atom_of[i]]} {basis.function_label(i)}" for i in leading)


def _sentences(heading: str, sentences: Sequence[str]) -> list[str]:
    lines = [heading]
    for sentence in sentences:
        lines += textwrap.wrap(visible(sentence), WIDTH, initial_indent="  - ", subsequent_indent="    ")
    return lines
