"""Files that a page carries."""

from __future__ import annotations

import base64
import re
import zlib
from collections.abc import Iterable, Sequence
from typing import Final

import numpy as np

from basis_params import ParameterTable
from ehmo.records.report import BondReport
from ehmo.report.bond_table import bond_table
from ehmo.report.cube import cube_text, xyz_text
from ehmo.report.document import json_text
from ehmo.report.formula import complex_formula
from ehmo.report.page.markup import Markup, data_address, element, markup
from ehmo.report.page.shown import ShownChannel, orbital_grid, orbital_values

MOST_CUBES: Final = 6
_CUBE_SPACING_A, _CUBE_POINTS = 0.26, 40_000


def file_stem(report: BondReport) -> str:
    """Start of the names of the files: the formula, in letters and digits."""
    return re.sub(r"[^A-Za-z0-9]+", "-", complex_formula(report)).strip("-")


def file_links(report: BondReport) -> Markup:
    """Links to JSON, CSV and XYZ, which need no script."""
    stem = file_stem(report)
    files = (
        ("JSON", "everything on this page and more, as data", f"{stem}.json", json_text([report]), "application/json"),
        ("CSV", "the bonds as a table", f"{stem}.csv", bond_table([report], "csv"), "text/csv"),
        ("XYZ", "the structure with charge and spin", f"{stem}.xyz", xyz_text(report.fragment), "chemical/x-xyz"),
    )
    return links_to(files)


def links_to(files: Iterable[tuple[str, str, str, str, str]]) -> Markup:
    """Links to files that stand in the page.

    Parameters
    ----------
    files : iterable of tuple
        Format, what the file holds, its name, its text, and its media type.

    Returns
    -------
    html : Markup
    """
    return markup(
        [
            element("li", element("a", f"{name} ({file})", href=data_address(text, kind), download=file), f": {words}")
            for name, words, file, text, kind in files
        ]
    )


def cube_orbitals(report: BondReport, channels: Sequence[ShownChannel]) -> list[int]:
    """Orbitals whose cube files a page carries: highest filled, lowest empty, and the main carriers of the chosen bond.

    The chosen bond is the one with the heaviest channels; the next ones follow while there is room.
    """
    found = [report.state.homo]
    if report.state.lumo is not None:
        found.append(report.state.lumo)
    bonds = report.coordination.bonds
    ranked = sorted(
        channels, key=lambda s: (not bonds[s.bond].may_be_multiple, bonds[s.bond].length_A, -s.channel.weight)
    )
    for shown in ranked:
        found += [k for carrier in shown.carriers[:1] for k in carrier.level.orbitals]
    return list(dict.fromkeys(found))[:MOST_CUBES]


def packed_cubes(report: BondReport, table: ParameterTable, orbitals: Sequence[int]) -> dict[str, str]:
    """Cube files by name, deflated and in base 64."""
    grid = orbital_grid(report, _CUBE_SPACING_A, _CUBE_POINTS)
    stem, irreps = file_stem(report), report.irreps
    files = {}
    for orbital, values in zip(orbitals, orbital_values(report, table, orbitals, grid), strict=True):
        irrep = irreps.labels[orbital] if irreps is not None else ""
        comment = f"{complex_formula(report)} orbital {orbital + 1} {irrep} {report.state.energies_eV[orbital]:.3f} eV"
        # Phases of orbitals are free; a fixed choice keeps the file the same from run to run.
        sign = np.copysign(1.0, values.flat[np.abs(values).argmax()])
        text = cube_text(report.fragment, grid, sign * values, comment.encode("ascii", "replace").decode("ascii"))
        files[f"{stem}-orbital-{orbital + 1}.cube"] = base64.b64encode(zlib.compress(text.encode(), 6)).decode("ascii")
    return files
