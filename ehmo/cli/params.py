"""``ehmo params``: the parameter sets, their rows and their audits."""

from __future__ import annotations

import argparse
import re
import textwrap
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from ehmo.errors import ParameterError, visible
from ehmo.records.table import aligned

if TYPE_CHECKING:
    from basis_params import PairRepulsion, ParameterTable


def add_command(commands: Any) -> None:
    """Add the command to the program's parser."""
    parser = commands.add_parser(
        "params",
        help="list, show or check parameter sets",
        description="Parameter sets: shipped ones by name, your own by file.",
    )
    actions = parser.add_subparsers(metavar="ACTION", required=True)
    listed = actions.add_parser("list", help="names of the shipped sets and the elements they cover")
    listed.set_defaults(handler=run_list)
    shown = actions.add_parser("show", help="rows of a set, hardness of its atoms, references")
    shown.add_argument("set", metavar="NAME|FILE", help="shipped set or table file")
    shown.add_argument("elements", metavar="ELEMENT", nargs="*", help="only these elements")
    shown.set_defaults(handler=run_show)
    checked = actions.add_parser("check", help="audit a set against norms and free atoms")
    checked.add_argument("set", metavar="NAME|FILE", help="shipped set or table file")
    checked.set_defaults(handler=run_check)


def run_list(_: argparse.Namespace) -> str:
    """Shipped sets, one paragraph each."""
    import basis_params

    lines = []
    for name in basis_params.available_sets():
        table = basis_params.load_set(name)
        lines.append(f"{table.name} (edition {table.edition}): {_settings_text(table)}")
        lines += textwrap.wrap(
            f"{len(table.elements)} elements: {' '.join(table.elements)}",
            98,
            initial_indent="  ",
            subsequent_indent="  ",
        )
    return "\n".join(lines) + "\n"


def run_show(chosen: argparse.Namespace) -> str:
    """Header, notes and rows of a set."""
    from ehmo.orbitals.parameters import load_parameters

    table = load_parameters(chosen.set)
    elements = chosen.elements or list(table.elements)
    missing = [symbol for symbol in elements if symbol not in table.elements]
    if missing:
        raise ParameterError(
            f"the set {table.name} has no {', '.join(missing)}",
            mend=f"choose from {' '.join(table.elements)}",
        )
    rows = [["element", "valence e", "shell", "H_ii/eV", "zeta/bohr^-1 (c)", "source", "origin"]]
    for symbol in elements:
        element = table.elements[symbol]
        for shell in element.shells:
            functions = "  ".join(f"{zeta:g} ({c:g})" for zeta, c in zip(shell.zetas, shell.coefficients, strict=True))
            source = visible(f"{shell.source_key}, {shell.locator}" if shell.locator else shell.source_key)
            rows.append(
                [
                    symbol,
                    str(element.valence_electrons),
                    shell.label,
                    f"{shell.h_ii_eV:.3f}",
                    functions,
                    source,
                    shell.provenance,
                ]
            )
    head = [
        f"{visible(table.name)} (edition {visible(table.edition)}), {visible(table.origin)}: {_settings_text(table)}"
    ]
    if table.inherited:
        head.append(f"not stated in the table, taken from the standard set: {', '.join(table.inherited)}")
    shown = [note for note in table.notes if not (found := _OUTLIER.match(note)) or found[1] in elements]
    notes = [line for note in shown for line in textwrap.wrap(visible(note), 100, subsequent_indent="  ")]
    pairs = [term for term in table.repulsion.values() if {term.first, term.second} <= set(elements)]
    keys = sorted(
        {shell.source_key for symbol in elements for shell in table.elements[symbol].shells}
        | {term.source_key for term in pairs}
    )
    sections = [
        _COLUMNS,
        _pairs_text(pairs),
        _atoms_text(elements),
        _references_text(keys),
        ["Notes", *notes] if notes else [],
    ]
    lines = [line for section in sections if section for line in ("", *section)]
    return "\n".join([*head, "", *aligned(rows, numeric=(1, 3)), *lines]) + "\n"


_OUTLIER = re.compile(r"Audit outlier: (\w+) ")

_CHECKS = [
    "norm: integral of the squared function, 1. radius: mean radius, energy: H_ii, both against the orbital of a",
    "  computed free atom. ionisation: highest filled shell against the measured ionisation energy.",
    "range, softness: of a two-body term, middle of its lengths against covalent radii, 1/B against closed shells.",
    "Functions meant for molecules are tighter and deeper than those of free atoms, empty p shells most of all:",
    "  the audits find wrong digits, exponents and elements; an outlier is a question, not a verdict.",
]

_COLUMNS = [
    "valence e: electrons the neutral atom brings. H_ii: minus the valence-state ionisation energy. zeta: exponent",
    "  of each Slater function, c its coefficient. origin: how the figure came into the table, read in the source,",
    "  from memory, or derived by a script.",
]


def _pairs_text(pairs: Sequence[PairRepulsion]) -> list[str]:
    """Two-body terms, if the set has any for these elements."""
    rows = [["pair", "A/eV", "B/Å^-1", "bonds/Å", "source", "origin"]]
    rows += [
        [
            term.label,
            f"{term.amplitude_eV:.6g}",
            f"{term.decay_per_A:.5g}",
            f"{term.lowest_A:.2f} to {term.highest_A:.2f}",
            visible(f"{term.source_key}, {term.locator}"),
            term.provenance,
        ]
        for term in pairs
    ]
    if not pairs:
        return []
    return [
        "Two-body repulsion A exp(-B R), with the range of bond lengths for which energies are calibrated",
        *aligned(rows, numeric=(1, 2)),
    ]


def _atoms_text(elements: Sequence[str]) -> list[str]:
    """Hardness of the elements, which the charge model adds to the set."""
    import basis_params

    rows = [["element", "I/eV", "A/eV", "U/eV"]]
    for symbol in elements:
        atom = basis_params.atom(symbol)
        affinity = "-" if atom.electron_affinity_eV is None else f"{atom.electron_affinity_eV:.3f}"
        rows.append([symbol, f"{atom.ionisation_energy_eV:.3f}", affinity, f"{atom.hardness_U_eV:.3f}"])
    return [
        "Hardness U = I - A of the neutral atoms, for self-consistent charges (the same in every set; A below 0",
        "  or unknown counts as 0)",
        *aligned(rows, numeric=(1, 2, 3)),
    ]


def _references_text(keys: Sequence[str]) -> list[str]:
    """What the source keys stand for, as far as they are known."""
    import basis_params

    known = basis_params.references()
    width = max(len(key) for key in keys)
    lines = []
    for key in keys:
        text = known[key].text if key in known else "given by the table alone"
        hanging = " " * (width + 2)
        lines += textwrap.wrap(f"{visible(key):<{width}}  {text}", 100, subsequent_indent=hanging)
    return ["References", *lines]


def run_check(chosen: argparse.Namespace) -> str:
    """Outcome of the audits, with every value outside its bounds."""
    from basis_params.audits import audit
    from ehmo.orbitals.parameters import load_parameters

    table = load_parameters(chosen.set)
    report = audit(table)
    counts = [["check", "ok", "outlier", "no reference"]]
    for check in dict.fromkeys(row.check for row in report.rows):
        by_status = [row.status for row in report.rows if row.check == check]
        counts.append([check, *(str(by_status.count(status)) for status in ("ok", "outlier", "no reference"))])
    outliers = [
        [
            row.element,
            row.shell,
            row.check,
            f"{row.value:.3f}",
            f"{row.reference:.3f}",
            f"{row.ratio:.2f}",
            f"{row.bounds[0]:g} to {row.bounds[1]:g}",
        ]
        for row in report.rows
        if row.status == "outlier"
    ]
    lines = [f"{visible(table.name)} (edition {visible(table.edition)}), {visible(table.origin)}"]
    lines += aligned(counts, numeric=(1, 2, 3), indent="  ")
    if outliers:
        heading = ["element", "shell", "check", "table", "free atom", "ratio", "bounds"]
        lines += ["", "Outside the bounds of table/free atom (radius in bohr, energy and ionisation in eV):"]
        lines += aligned([heading, *outliers], numeric=(3, 4, 5), indent="  ")
    else:
        lines += ["", "Nothing is outside the bounds."]
    lines += ["", *_CHECKS]
    return "\n".join(lines) + "\n"


def _settings_text(table: ParameterTable) -> str:
    settings = table.settings
    channels = [
        f"{name} {value:g}"
        for name, value in (
            ("K_sigma", settings.K_sigma),
            ("K_pi", settings.K_pi),
            ("K_delta", settings.K_delta),
        )
        if value is not None
    ]
    decay = [f"K_decay {settings.K_decay_per_A:g} per Å"] if settings.K_decay_per_A else []
    weighting = "weighted" if settings.weighting else "not weighted"
    charge = f"charge weight lambda {settings.lambda_:g}"
    return ", ".join([f"K {settings.K:g} ({weighting})", *channels, *decay, charge])
