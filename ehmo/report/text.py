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
from ehmo.records.reactivity import REACTIVITY_LIMITS, DonorReactivity
from ehmo.records.report import BondReport
from ehmo.records.site import MetalSite
from ehmo.records.table import aligned
from ehmo.records.wording import (
    BOND_NUMBERS,
    PARTIAL_CHANNEL,
    bond_rows,
    channels_in_words,
    electrons_in_words,
    with_deviation,
)
from ehmo.report.cautions import CAUTIONS
from ehmo.report.ladder_text import ladder_lines, orbital_irrep, short_spectrum_lines
from ehmo.report.spread_text import spread_lines
from ehmo.structure.elements import F_BLOCK, with_state

WIDTH = 100
_FRONTIER = 6

ORBITAL_NUMBERS = (0, 2, 3, 4, 5, 6, 7)
"""Columns of `orbital_rows` that hold numbers."""


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
        heading_lines(report),
        *(_bonds_of(report, site.metal) for site in report.distinct_sites()),
        _words(report),
        _hybrids(report),
        _charges(report),
        _frontier(report),
        *(ladder_lines(report, site) for site in report.distinct_sites()),
        short_spectrum_lines(report),
        spread_lines(report),
        sentence_lines("Assumed", report.assumptions),
        sentence_lines("To doubt", report.warnings or ("nothing in particular, beyond the cautions below",)),
        sentence_lines("Cautions", CAUTIONS),
    ]
    return "\n\n".join("\n".join(section) for section in sections if section) + "\n"


def heading_lines(report: BondReport) -> list[str]:
    """Source, electrons, method, and each metal with its sphere."""
    fragment, method = report.fragment, report.method
    charges = (
        "fixed charges"
        if method.charge_model == "fixed"
        else f"self-consistent charges (lambda {method.lambda_:g}, converged in {method.iterations} iterations)"
    )
    return [
        visible(fragment.source) or "fragment",
        *textwrap.wrap(f"Title: {visible(fragment.title)}" if fragment.title else "", WIDTH, subsequent_indent="  "),
        f"{fragment.formula}, {electrons_in_words(fragment)}{_metals_in_all(report)}",
        f"Extended Hückel, set {visible(method.parameter_set)} ({visible(method.edition)}), {charges}",
        *_molecule_lines(report),
        *(line for site in report.distinct_sites() for line in _site_lines(report, site)),
    ]


def _molecule_lines(report: BondReport) -> list[str]:
    whole = report.molecule_symmetry
    return [] if whole is None else [f"Whole molecule {whole.group.name} within {whole.rms_A:.2f} Å"]


def _metals_in_all(report: BondReport) -> str:
    total, metals = report.electrons.metal_oxidation_total, report.coordination.metals
    if total is None or len(metals) == 1:
        return ""
    return f"; metals {total:+d} in all by counting, {total / len(metals):+.2f} each on the average"


def _site_lines(report: BondReport, site: MetalSite) -> list[str]:
    return textwrap.wrap(site_in_words(report, site), WIDTH, subsequent_indent="  ")


def site_in_words(report: BondReport, site: MetalSite) -> str:
    """Oxidation state, bond valences, group and shape of one metal."""
    symbol, said = report.fragment.symbols[site.metal], []
    if site.oxidation_state is not None:
        configuration = "" if site.d_count is None else f" {'f' if symbol in F_BLOCK else 'd'}{site.d_count}"
        said.append(f"{with_state(symbol, site.oxidation_state)}{configuration} by counting")
    if site.bond_valence_sum is not None:
        said.append(f"bond-valence sum {site.bond_valence_sum:.2f}")
    symmetry = site.symmetry
    said.append(
        f"sphere {symmetry.group.name} within {symmetry.rms_A:.2f} Å (symmetry measure "
        f"{symmetry.continuous_measure:.2f})"
    )
    if site.shapes:
        said.append(f"nearest shape {site.shapes[0].shape} ({site.shapes[0].measure:.1f})")
    return f"{', '.join(_alike(report, site.metal))}: {'; '.join(said)}"


def _alike(report: BondReport, atom: int) -> list[str]:
    """Labels of the atoms that crystal symmetry makes of one."""
    labels, crystal = report.fragment.labels, report.fragment.crystal
    return [labels[atom]] if crystal is None else [labels[other] for other in crystal.equivalent_atoms(atom)]


def axes_in_words(report: BondReport) -> list[str]:
    """Local axes of each distinct metal, in words."""
    labels, shown = report.fragment.labels, {site.metal for site in report.distinct_sites()}
    frames = [frame for frame in report.coordination.frames if frame.metal in shown]
    return [f"Axes of {labels[f.metal]}: z {f.z_reason}, x {f.x_reason}" for f in frames]


def _bonds_of(report: BondReport, metal: int) -> list[str]:
    labels, crystal = report.fragment.labels, report.fragment.crystal
    places = [k for k in report.distinct_bonds() if report.coordination.bonds[k].metal == metal]
    bonds = [report.coordination.bonds[k] for k in places]
    rows = bond_rows(
        bonds,
        [report.orders[k] for k in places],
        [report.formal_orders[k] for k in places],
        labels,
        None if report.spread is None else [report.spread.bonds[k] for k in places],
    )
    numeric: Sequence[int] = BOND_NUMBERS
    if crystal is not None:
        counts = [("per metal", "in the cell")] + [
            (
                str(crystal.bonds_per_metal(bond.metal, bond.donor)),
                str(crystal.bond_multiplicity(bond.metal, bond.donor)),
            )
            for bond in bonds
        ]
        rows = [[*row[:3], *count, *row[3:]] for row, count in zip(rows, counts, strict=True)]
        numeric = range(2, 9)
    return [f"Bonds of {labels[metal]}", *aligned(rows, numeric=numeric, indent="  ")]


def _words(report: BondReport) -> list[str]:
    """Multiple bonds in words: by counting, by calculation, and how the donor leans."""
    said, notes = multiple_bonds_in_words(report)
    if not said:
        return []
    lines = [
        line
        for sentence in said
        for line in textwrap.wrap(sentence, WIDTH, initial_indent="  ", subsequent_indent="    ")
    ]
    wrapped = [
        line for note in notes for line in textwrap.wrap(note, WIDTH, initial_indent="  ", subsequent_indent="  ")
    ]
    return ["Multiple bonds in words", *lines, *wrapped]


def multiple_bonds_in_words(report: BondReport) -> tuple[list[str], list[str]]:
    """One sentence for each bond that may be multiple, or for several with the same, and notes on how to read them.

    Parameters
    ----------
    report : BondReport

    Returns
    -------
    said, notes : list of str
    """
    readings = {reading.bond: reading for reading in report.reactivity}
    said: dict[str, list[str]] = {}
    rules = []
    for place in report.distinct_bonds():
        bond, orders, formal = report.coordination.bonds[place], report.orders[place], report.formal_orders[place]
        if not bond.may_be_multiple and (formal is None or formal.order == 1):
            continue
        counted = "no order by counting without a ladder" if formal is None else f"{formal.words} by counting"
        sentence = f"{counted}; {channels_in_words(orders.channels)} by calculation"
        if place in readings:
            sentence += f"; {_leaning(readings[place])}"
        said.setdefault(sentence, []).append(report.bond_label(bond))
        if formal is not None and formal.rule:
            rules.append(formal.rule)
    notes = [f"Counting: {rule}." for rule in dict.fromkeys(rules)]
    sentences = [f"{', '.join(labels)}: {sentence}" for sentence, labels in said.items()]
    return sentences, [*notes, REACTIVITY_LIMITS] if readings and said else notes


def _leaning(reading: DonorReactivity) -> str:
    gap = (
        ""
        if reading.pi_star_gap_eV is None
        else f", pi* {reading.pi_star_gap_eV:.1f} eV above its highest filled level"
    )
    leaning = "between nucleophilic and electrophilic" if reading.leaning == "between" else reading.leaning
    return (
        f"donor {leaning} (charge {reading.charge:+.2f}, p share of HOMO {100 * reading.homo_share:.0f} %, "
        f"of LUMO {100 * reading.lumo_share:.0f} %{gap})"
    )


def _hybrids(report: BondReport) -> list[str]:
    """Make-up of the channels of the bonds that may be multiple; those of equal bonds stand once."""
    made: dict[tuple[tuple[str, ...], ...], list[str]] = {}
    for place in report.distinct_bonds():
        bond, orders = report.coordination.bonds[place], report.orders[place]
        if bond.may_be_multiple:
            cells = tuple(
                (channel.type, f"{channel.weight:.2f}", *hybrid_cells(report, bond, channel))
                for channel in orders.channels
                if channel.weight >= PARTIAL_CHANNEL
            )
            made.setdefault(cells, []).append(report.bond_label(bond))
    rows = [["bond", "channel", "weight", "metal hybrid", "donor hybrid"]]
    for cells, labels in made.items():
        alike = f" and {len(labels) - 1} alike" if len(labels) > 1 else ""
        rows += [[labels[0] + alike, *row] for row in cells]
    return ["What the channels are made of", *aligned(rows, numeric=(2,), indent="  ")] if len(rows) > 1 else []


def hybrid_cells(report: BondReport, bond: MetalDonorBond, channel: BondChannel) -> list[str]:
    """Shells in the metal and in the donor hybrid."""
    cells = []
    for atom, hybrid in ((bond.metal, channel.metal_hybrid), (bond.donor, channel.donor_hybrid)):
        shares = sorted(report.hybrid_composition(atom, hybrid).items(), key=lambda item: -item[1])
        cells.append(", ".join(f"{100 * share:.0f} % {shell}" for shell, share in shares if share >= 0.005))
    return cells


def _charges(report: BondReport) -> list[str]:
    heading = "Mulliken charges (positive = electron poor)"
    return [heading, *aligned(charge_rows(report), numeric=(1, 2), indent="  ")]


def charge_rows(report: BondReport) -> list[list[str]]:
    """Heading, and one row for each metal and donor and for the rest."""
    unpaired = bool(report.fragment.unpaired_electrons)
    crystal = report.fragment.crystal
    listed = sorted({*report.coordination.metals, *(bond.donor for bond in report.coordination.bonds)})
    rows = [["atom", "charge/e", *(["unpaired/e"] if unpaired else [])]]
    for atom in listed:
        if crystal is not None and crystal.first_equivalent(atom) != atom:
            continue
        deviation = None if report.spread is None else float(report.spread.charges[atom])
        charge = with_deviation(f"{report.populations.charges[atom]:+.2f}", deviation, 2)
        row = [", ".join(_alike(report, atom)), charge]
        rows.append([*row, f"{report.populations.spin[atom]:.2f}"] if unpaired else row)
    rest = np.delete(np.arange(len(report.fragment)), listed)
    if len(rest):
        row = ["all others", f"{report.populations.charges[rest].sum():+.2f}"]
        rows.append([*row, f"{report.populations.spin[rest].sum():.2f}"] if unpaired else row)
    return rows


def _frontier(report: BondReport) -> list[str]:
    """Orbitals round the highest one that holds electrons, topmost first."""
    state = report.state
    top, bottom = min(state.homo + _FRONTIER, len(state.energies_eV) - 1), max(state.homo - _FRONTIER, -1)
    judged = "the idealised sphere" if report.molecule_irreps is None else "the whole molecule"
    heading = f"Frontier orbitals (overlap population for two electrons, positive = bonding; irreps of {judged})"
    rows = orbital_rows(report, range(top, bottom, -1))
    return [heading, *axes_in_words(report), *aligned(rows, numeric=ORBITAL_NUMBERS, indent="  ")]


def orbital_rows(report: BondReport, shown: Sequence[int]) -> list[list[str]]:
    """Heading, and one row for each of some orbitals."""
    state = report.state
    composition, overlap = 100 * report.populations.orbital_shares, report.orbital_overlap()
    filling = state.occupations.sum(axis=0)
    gross = local_gross_populations(shown, state.coefficients, report.overlap, report.basis, report.coordination)
    rows = [
        [
            "orbital",
            "irrep",
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
            orbital_irrep(report, k),
            f"{state.energies_eV[k]:.2f}",
            f"{filling[k]:g}" if filling[k] in (0, 1, 2) else f"{filling[k]:.2f}",
            *(f"{share:z.0f}" for share in composition[k]),
            f"{overlap[k]:+z.2f}",
            _leading_part(report, gross[:, place]),
        ]
        for place, k in enumerate(shown)
    ]
    return rows


def _leading_part(report: BondReport, gross: FloatArray) -> str:
    """Functions that carry an orbital, by gross population."""
    basis, labels = report.basis, report.fragment.labels
    leading = [int(i) for i in np.argsort(-gross)[:2] if gross[i] >= 0.1]
    return ", ".join(f"{100 * gross[i]:.0f} % {labels[basis.atom_of[i]]} {basis.function_label(i)}" for i in leading)


def sentence_lines(heading: str, sentences: Sequence[str]) -> list[str]:
    """Heading and one dashed, wrapped entry for each sentence."""
    lines = [heading]
    for sentence in sentences:
        lines += textwrap.wrap(visible(sentence), WIDTH, initial_indent="  - ", subsequent_indent="    ")
    return lines
