"""Periodic calculations of ``ehmo bond``: crystals whose metals are in chains, layers or frameworks."""

from __future__ import annotations

import argparse
from collections.abc import Sequence
from typing import TYPE_CHECKING

from ehmo.cli.output import write_whole
from ehmo.cli.pages import check_page, write_crystal_page
from ehmo.cli.papers import check_paper_options, paper_text
from ehmo.errors import InputError

if TYPE_CHECKING:
    from ehmo.calculate.crystal import CrystalOptions
    from ehmo.records.crystal import CrystalContents
    from ehmo.records.fragment import Fragment
    from ehmo.records.options import Options


def add_crystal_options(parser: argparse.ArgumentParser) -> None:
    """Options of a periodic calculation."""
    group = parser.add_argument_group("extended structures")
    group.add_argument(
        "--mesh", metavar="A,B,C", help="k-points along each reciprocal vector (default: by the size of the cell)"
    )
    group.add_argument(
        "--path",
        metavar="NAMES|auto",
        help="also bands along a path of special points such as GXMG, or the standard one of the lattice",
    )
    group.add_argument(
        "--cluster",
        type=float,
        metavar="RADIUS",
        help="in place of the crystal, a hydrogen-saturated cluster of this radius round each distinct metal [Å]",
    )


def refuse_crystal_options(chosen: argparse.Namespace) -> None:
    """Refuse options of extended structures where the file has none.

    Raises
    ------
    InputError
        If one was given.
    """
    given = [name for name in ("mesh", "path", "cluster") if getattr(chosen, name) is not None]
    if given:
        raise InputError(
            f"--{given[0]} is for extended structures, and molecules are calculated here",
            place=chosen.file,
            mend="leave it out, or pick an extended structure (--list shows what the file holds)",
        )


def clusters(crystals: Sequence[CrystalContents], chosen: argparse.Namespace) -> list[Fragment]:
    """Clusters round the metals of some crystals."""
    from ehmo.structure.cluster import metal_clusters

    return [fragment for contents in crystals for fragment in metal_clusters(contents, chosen.cluster)]


def one_set(chosen: argparse.Namespace) -> str:
    """Set for crystals and batches, where one serves all: the one that was named, else `standard`."""
    return "standard" if chosen.params == "auto" else str(chosen.params)


def extended_report(crystals: Sequence[CrystalContents], chosen: argparse.Namespace, options: Options) -> str:
    """Text for the terminal on each crystal; the JSON document goes to its file, or replaces the text."""
    from ehmo.calculate.crystal_report import crystal_report

    _refuse_molecular_options(chosen)
    check_paper_options(chosen)
    from ehmo.orbitals.parameters import load_parameters

    if chosen.page is not None:
        check_page(chosen, len(crystals), "choose one with --pick (--list shows them)")
    table, crystal = load_parameters(one_set(chosen)), crystal_options(chosen)
    reports = [crystal_report(contents, table, options, crystal) for contents in crystals]
    if chosen.page is not None:
        write_crystal_page(chosen, reports[0], table)
    if chosen.json is not None:
        from ehmo.report.bands_document import crystal_json

        document = crystal_json(reports)
        if chosen.json == "-":
            return document
        write_whole(chosen.json, document)
    for_paper = paper_text(reports, [table] * len(reports), chosen)
    if for_paper is not None:
        return for_paper
    from ehmo.report.bands_text import crystal_text

    rule = "\n" + "=" * 100 + "\n\n"
    return rule.join(crystal_text(report) for report in reports)


def _refuse_molecular_options(chosen: argparse.Namespace) -> None:
    for name in ("oxidation_state", "spread", "scan"):
        if getattr(chosen, name, None) is not None:
            raise InputError(
                f"--{name.replace('_', '-')} is for molecules, and the crystal is calculated as a whole",
                place=chosen.file,
                mend="leave it out, or cut a cluster with --cluster",
            )


def crystal_options(chosen: argparse.Namespace) -> CrystalOptions:
    """Options record of the parsed words.

    Raises
    ------
    InputError
        If the mesh is not three positive whole numbers.
    """
    from ehmo.calculate.crystal import CrystalOptions

    return CrystalOptions(
        mesh=mesh_counts(chosen.mesh), path=chosen.path or None, cations_basis=chosen.cations == "basis"
    )


def mesh_counts(text: str | None) -> tuple[int, int, int] | None:
    """Counts of a mesh of words such as ``4,4,4``.

    Raises
    ------
    InputError
        If they are not three positive whole numbers.
    """
    if text is None:
        return None
    words = [word.strip() for word in text.split(",")]
    if len(words) != 3 or not all(word.isascii() and word.isdigit() and 0 < int(word) < 1000 for word in words):
        raise InputError(f"--mesh {text!r} is no mesh", mend="give three positive numbers such as 4,4,4")
    return int(words[0]), int(words[1]), int(words[2])
