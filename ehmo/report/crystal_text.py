"""What a structure file holds, as a numbered list."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from typing import Final

import numpy as np

from ehmo.errors import visible
from ehmo.records.crystal import CrystalContents, CrystalSpecies, MetalDonorUnit
from ehmo.records.fragment import Fragment
from ehmo.records.table import aligned
from ehmo.records.wording import signed
from ehmo.structure.species import shown_ion

WIDTH = 100
_LABEL = 14
_NUMBERS: Final = (2, 3, 4, 5)


def contents_text(contents: CrystalContents, first: int = 1) -> str:
    """List of what a crystal holds.

    Parameters
    ----------
    contents : CrystalContents
    first : int
        Number of its first entry.

    Returns
    -------
    text : str
    """
    lines = [visible(contents.source)]
    if contents.title:
        lines += textwrap.wrap(f"Title: {visible(contents.title)}", WIDTH, subsequent_indent="  ")
    lines.append(_cell_line(contents))
    number = first
    for molecule in contents.molecules:
        charge = molecule.fragment.charge
        known = (
            f"charge {signed(charge)}, {molecule.fragment.charge_reason}"
            if charge is not None
            else "charge not settled"
        )
        lines += ["", *_wrapped(f"{number}  molecule {molecule.name}, {molecule.multiplicity} in the cell; {known}")]
        lines += _unit_lines(molecule.units)
        number += 1
    for network in contents.networks:
        copies = f", {network.formula_units} formula unit{'s' * (network.formula_units > 1)} in a cell"
        copies += "" if network.multiplicity == 1 else f", {network.multiplicity} such {network.word}s"
        of_what = f" of one {network.word} in a cell" if network.charge else ""
        known = "" if network.charge is None else f"; charge {signed(network.charge)}{of_what}, {network.charge_reason}"
        runs = "1 direction" if network.dimension == 1 else f"{network.dimension} directions"
        lines += [
            "",
            *_wrapped(f"{number}  {network.word} {network.reduced_formula} (runs on in {runs}){copies}{known}"),
        ]
        lines += _unit_lines(network.units)
        number += 1
    if contents.species:
        lines += ["", "Without metals", *aligned(_species_rows(contents.species), numeric=(2,), indent="   ")]
    for heading, sentences in (("Hydrogens", contents.missing_hydrogens), ("Done with the file", contents.notes)):
        if sentences:
            lines += ["", heading]
            for sentence in sentences:
                lines += textwrap.wrap(visible(sentence), WIDTH, initial_indent="  - ", subsequent_indent="    ")
    return "\n".join(lines) + "\n"


def frames_text(fragments: Sequence[Fragment]) -> str:
    """List of the structures of a file without crystals."""
    rows = [["", "formula", "charge", "unpaired", "title"]]
    for number, fragment in enumerate(fragments, start=1):
        unpaired = fragment.unpaired_electrons
        title = visible(fragment.title)
        rows.append(
            [
                str(number),
                fragment.formula,
                "?" if fragment.charge is None else signed(fragment.charge),
                "?" if unpaired is None else str(unpaired),
                title if len(title) <= 60 else f"{title[:57]}...",
            ]
        )
    return "\n".join(aligned(rows, numeric=(0, 2, 3))) + "\n"


def _cell_line(contents: CrystalContents) -> str:
    lengths = np.linalg.norm(contents.cell_A, axis=1)
    unit = contents.cell_A / lengths[:, None]
    angles = [float(np.degrees(np.arccos(np.clip(unit[a] @ unit[b], -1, 1)))) for a, b in ((1, 2), (0, 2), (0, 1))]
    return (
        f"Cell {' '.join(f'{n:.3f}' for n in lengths)} Å, {' '.join(f'{a:.2f}' for a in angles)} degrees;"
        f" {len(contents.symbols)} atoms in the ordered model"
    )


def _wrapped(text: str) -> list[str]:
    return textwrap.wrap(visible(text), WIDTH, subsequent_indent="   ")


def _unit_lines(units: Sequence[MetalDonorUnit]) -> list[str]:
    rows = [["bond", "kind", "length/Å", "bond valence", "at the metal", "in the cell"]]
    rows += [
        [
            f"{_short(unit.metal)}-{_short(unit.donor)}",
            str(unit.kind) + (f", {unit.n_metals} metals" if unit.n_metals > 1 else ""),
            f"{unit.length_A:.3f}",
            "" if unit.bond_valence is None else f"{unit.bond_valence:.2f}",
            str(unit.per_metal),
            str(unit.multiplicity),
        ]
        for unit in units
    ]
    return aligned(rows, numeric=_NUMBERS, indent="     ") if units else []


def _short(label: str) -> str:
    text = visible(label)
    return text if len(text) <= _LABEL else f"{text[: _LABEL - 3]}..."


def _species_rows(species: Sequence[CrystalSpecies]) -> list[list[str]]:
    rows = [["formula", "name", "in the cell", "remarks"]]
    for one in species:
        remarks = []
        if one.charge is None:
            remarks.append("charge unknown")
        if one.missing_hydrogens:
            remarks.append(f"{one.missing_hydrogens} hydrogens of each not in the file")
        if not one.in_model:
            remarks.append("on sites left out of the model")
        if one.dimension:
            remarks.append(f"bonds run on in {one.dimension} directions")
        rows.append([shown_ion(one.formula, one.charge), one.name, f"{one.count:.4g}", "; ".join(remarks)])
    return rows
