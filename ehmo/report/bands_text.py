"""The report on an extended structure as text for a terminal."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ehmo.errors import visible
from ehmo.records.arrays import FloatArray
from ehmo.records.crystal import MetalDonorUnit
from ehmo.records.crystal_report import CrystalReport
from ehmo.records.table import aligned
from ehmo.records.wording import PARTIAL_CHANNEL, channel_weights, channels_in_words
from ehmo.report.cautions import CAUTIONS
from ehmo.report.text import WIDTH, sentence_lines

BLOCK_GAP_EV = 0.3
"""Bands closer than this are listed as one block [eV]."""

_LABEL = 14
_SHOWN_SHARE = 0.03
_SHOWN_SHELLS = 4


def crystal_text(report: CrystalReport) -> str:
    """Whole report as text.

    Parameters
    ----------
    report : CrystalReport
        Result of a calculation.

    Returns
    -------
    text : str
        Lines of at most about 100 characters, control characters of the source shown.
    """
    sections = [
        _heading(report),
        _kind(report),
        _bonds(report),
        _words(report),
        _charges(report),
        _blocks(report),
        _path(report),
        _mesh(report),
        sentence_lines("Assumed", report.assumptions),
        sentence_lines("To doubt", report.warnings or ("nothing in particular, beyond the cautions below",)),
        sentence_lines("Cautions", CAUTIONS),
    ]
    return "\n\n".join("\n".join(section) for section in sections if section) + "\n"


def _heading(report: CrystalReport) -> list[str]:
    method = report.method
    charges = (
        "fixed charges"
        if method.charge_model == "fixed"
        else f"self-consistent charges (lambda {method.lambda_:g}, converged in {method.iterations} iterations)"
    )
    state = report.bonding.state
    return [
        visible(report.source) or "crystal",
        *textwrap.wrap(f"Title: {visible(report.title)}" if report.title else "", WIDTH, subsequent_indent="  "),
        *state_in_words(report).split("\n"),
        f"Periodic extended Hückel, set {visible(method.parameter_set)} ({visible(method.edition)}), {charges}",
        f"Mesh {state.mesh} with the zone centre, {len(state.mesh)} k-points by time reversal; "
        f"smallest overlap eigenvalue {state.smallest_overlap_eigenvalue:.1e}",
    ]


def state_in_words(report: CrystalReport) -> str:
    """Content of the calculated cell and, on a second line, its lengths and angles."""
    lengths = np.linalg.norm(report.cell_A, axis=1)
    unit = report.cell_A / lengths[:, None]
    angles = [np.degrees(np.arccos(np.clip(unit[a] @ unit[b], -1, 1))) for a, b in ((1, 2), (0, 2), (0, 1))]
    made = f"; {', '.join(report.networks)}" if report.networks else ""
    return (
        f"{report.formula} in the calculated cell, {report.bonding.electrons.total} valence electrons{made}\n"
        f"Cell {' '.join(f'{x:.3f}' for x in lengths)} Å, {' '.join(f'{x:.2f}' for x in angles)} degrees"
    )


def point_words(point: Sequence[float]) -> str:
    """Fractional k-point in brackets."""
    return "(" + ", ".join(f"{round(x, 3) + 0.0:g}" for x in point) + ")"


def _kind(report: CrystalReport) -> list[str]:
    return [line for said in kind_sentences(report) for line in textwrap.wrap(said, WIDTH, subsequent_indent="  ")]


def kind_sentences(report: CrystalReport) -> list[str]:
    """Insulator or metal with its edges, and energies, one sentence each."""
    state, gap = report.bonding.state, report.bonding.gap
    energy = f"Energy per cell {state.energy_eV:.4f} eV, of bands {state.band_energy_eV:.4f} eV"
    if gap is None:
        levels = sorted(set(np.round(state.filling.fermi_eV, 6)))
        words = " and ".join(f"{level:.2f}" for level in levels)
        smeared = f", filling smeared over {state.filling.smearing_eV:g} eV" if state.filling.smearing_eV else ""
        return [f"Metal on this mesh: no gap; Fermi level {words} eV{smeared}", energy]
    if gap.is_direct:
        where = f"direct, at k = {point_words(gap.direct_k)}"
    else:
        where = (
            f"indirect, from k = {point_words(gap.valence_k)} to {point_words(gap.conduction_k)}; smallest direct gap "
            f"{gap.direct_eV:.2f} eV at {point_words(gap.direct_k)}"
        )
    line = f"Insulator on this mesh: gap {gap.gap_eV:.2f} eV, {where}"
    edges = f"Highest filled level {gap.valence_eV:.2f} eV, lowest empty {gap.conduction_eV:.2f} eV"
    return [line, edges, energy]


def short_label(label: str) -> str:
    """Label from the file, made harmless and short."""
    text = visible(label)
    return text if len(text) <= _LABEL else f"{text[: _LABEL - 3]}..."


def unit_label(unit: MetalDonorUnit) -> str:
    """Bond by the labels of the file."""
    return f"{short_label(unit.metal)}-{short_label(unit.donor)}"


BOND_NUMBERS = (2, 3, 4, 5, 6)
CHARGE_NUMBERS = (1, 2, 3)
"""Columns of `crystal_bond_rows` and `crystal_charge_rows` that hold numbers."""


def _bonds(report: CrystalReport) -> list[str]:
    heading = "Metal-donor bonds of the asymmetric unit (labels of the file)"
    return [heading, *aligned(crystal_bond_rows(report), numeric=BOND_NUMBERS, indent="  ")]


def crystal_bond_rows(report: CrystalReport) -> list[list[str]]:
    """Heading, and one row for each bond of the asymmetric unit."""
    rows = [["bond", "kind", "length/Å", "per metal", "overlap pop.", "Mayer", "Wiberg", "channels, weights"]]
    rows += [
        [
            unit_label(unit),
            str(unit.kind) + (f", {unit.n_metals} metals" if unit.n_metals > 1 else ""),
            f"{unit.length_A:.3f}",
            str(unit.per_metal),
            f"{order.overlap_population:.2f}",
            f"{order.mayer:.2f}",
            f"{order.wiberg:.2f}",
            channel_weights(order.channels),
        ]
        for unit, order in report.bonds()
    ]
    return rows


def _words(report: CrystalReport) -> list[str]:
    lines = [
        line
        for said in pi_bonds_in_words(report)
        for line in textwrap.wrap(said, WIDTH, initial_indent="  ", subsequent_indent="    ")
    ]
    return ["Bonds with pi channels, strongest first, and the metal shells in them", *lines] if lines else []


def pi_bonds_in_words(report: CrystalReport) -> list[str]:
    """Bonds in words, strongest first, where more than a single bond shows."""
    ranked = sorted(enumerate(report.bonds()), key=lambda entry: -entry[1][1].mayer)
    sentences = []
    for place, (unit, order) in ranked:
        said = channels_in_words(order.channels)
        if "pi" not in said and "delta" not in said:
            continue
        made = "; ".join(
            f"{channel.type} {channel.weight:.2f} of {_metal_shells(report, place, channel.metal_hybrid)}"
            for channel in order.channels
            if channel.weight >= PARTIAL_CHANNEL
        )
        sentences.append(f"{unit_label(unit)}: {said} ({made})")
    return sentences


def _metal_shells(report: CrystalReport, place: int, hybrid: FloatArray) -> str:
    shares = report.hybrid_composition(report.bonding.bonds[place].metal, hybrid)
    ranked = sorted(shares.items(), key=lambda item: -item[1])
    return ", ".join(f"{100 * share:.0f} % {shell}" for shell, share in ranked if share >= 0.05)


def _charges(report: CrystalReport) -> list[str]:
    heading = "Mulliken charges (positive = electron poor)"
    return [heading, *aligned(crystal_charge_rows(report), numeric=CHARGE_NUMBERS, indent="  ")]


def crystal_charge_rows(report: CrystalReport) -> list[list[str]]:
    """Heading, and one row for each site."""
    charges, spin = report.bonding.charges, report.bonding.populations.spin
    unpaired = bool(report.bonding.electrons.unpaired)
    rows = [["site", "atoms", "charge/e", *(["unpaired/e"] if unpaired else [])]]
    for site in dict.fromkeys(report.sites.tolist()):
        members = np.flatnonzero(report.sites == site)
        row = [short_label(report.labels[members[0]]), str(len(members)), f"{charges[members].mean():+.2f}"]
        if unpaired:
            places = [report.bonding.place_of[int(atom)] for atom in members if int(atom) in report.bonding.place_of]
            row.append(f"{spin[places].mean():.2f}" if places else "")
        rows.append(row)
    return rows


@dataclass(frozen=True, slots=True, eq=False)
class BandBlock:
    """Bands that lie together on the mesh.

    Attributes
    ----------
    bands : slice
    lowest_eV, highest_eV : float
        [eV]
    electrons : float
        Per cell.
    shares : dict of str to float
        Part of each element's shell, such as ``{"O 2p": 0.8}``.
    overlap_population : float
        With all metal-donor bonds of the cell, every band counted with two electrons [e].
    """

    bands: slice
    lowest_eV: float
    highest_eV: float
    electrons: float
    shares: dict[str, float]
    overlap_population: float


def band_blocks(report: CrystalReport) -> list[BandBlock]:
    """Blocks of bands, lowest first, with what they are made of."""
    state, basis = report.bonding.state, report.bonding.basis
    low, high = state.energies_eV.min(axis=0), state.energies_eV.max(axis=0)
    starts = [0, *(n for n in range(1, len(low)) if low[n] - high[:n].max() > BLOCK_GAP_EV)]
    weights = state.mesh.weights
    overlap = weights @ report.metal_donor_overlap()
    shares = np.einsum("k,ksb->sb", weights, state.shell_shares)
    held = state.weighted_filling.sum(axis=0)
    names = [f"{basis.symbols[atom]} {basis.shell_label(shell)}" for shell, atom in enumerate(basis.shell_atom)]
    blocks = []
    for start, stop in zip(starts, [*starts[1:], len(low)], strict=True):
        parts: dict[str, float] = {}
        for name, part in zip(names, shares[:, start:stop].mean(axis=1), strict=True):
            parts[name] = parts.get(name, 0.0) + float(part)
        blocks.append(
            BandBlock(
                slice(start, stop),
                float(low[start:stop].min()),
                float(high[start:stop].max()),
                float(held[start:stop].sum()),
                dict(sorted(parts.items(), key=lambda item: -item[1])),
                float(overlap[start:stop].sum()),
            )
        )
    return blocks


def _blocks(report: CrystalReport) -> list[str]:
    heading = "Bands, topmost first (overlap population with two electrons in each band, positive = bonding)"
    return [heading, *aligned(block_rows(report), numeric=(0, 1, 2, 3, 4), indent="  ")]


def block_rows(report: CrystalReport) -> list[list[str]]:
    """Heading, and one row for each block of bands."""
    rows = [["from/eV", "to/eV", "bands", "electrons", "M-donor overlap pop.", "made of"]]
    for block in reversed(band_blocks(report)):
        leading = [(name, part) for name, part in block.shares.items() if part >= _SHOWN_SHARE][:_SHOWN_SHELLS]
        made = ", ".join(f"{100 * part:.0f} % {name}" for name, part in leading)
        rows.append(
            [
                f"{block.lowest_eV:.2f}",
                f"{block.highest_eV:.2f}",
                str(block.bands.stop - block.bands.start),
                f"{round(block.electrons, 3):g}",
                f"{block.overlap_population:+.2f}",
                made,
            ]
        )
    return rows


def _path(report: CrystalReport) -> list[str]:
    path, bands = report.bonding.path, report.bonding.electrons.by_spin[0]
    if path is None:
        return []
    top = max(min(int(np.ceil(bands)), path.energies_eV.shape[1] - 1), 1)
    rows = [["point", "k", "level below/eV", "level above/eV"]]
    rows += [
        [name, point_words(path.points[k]), f"{path.energies_eV[k, top - 1]:.2f}", f"{path.energies_eV[k, top]:.2f}"]
        for k, name in path.labels
    ]
    heading = (
        f"Along {path.path}: highest level that electrons reach by counting, and the next ({len(path.points)} points)"
    )
    return [heading, *aligned(rows, numeric=(2, 3), indent="  ")]


def _mesh(report: CrystalReport) -> list[str]:
    line = mesh_in_words(report)
    wrapped = textwrap.wrap(line, WIDTH, initial_indent="  ", subsequent_indent="  ")
    return ["Convergence with the mesh", *wrapped] if line else []


def mesh_in_words(report: CrystalReport) -> str:
    """What changes from a coarser mesh, in a sentence; empty if that was not asked."""
    change = report.bonding.mesh_change
    if change is None:
        return ""
    other = " x ".join(map(str, change.counts))
    gap = "" if change.gap_eV is None else f", the gap by {change.gap_eV:+.3f} eV"
    energy = 1000 * change.energy_per_atom_eV
    return (
        f"From a mesh of {other} the energy changes by {energy:+.2f} meV per atom, charges by up to "
        f"{change.largest_charge_e:.4f} e, orders by up to {change.largest_order:.4f}{gap}"
    )
