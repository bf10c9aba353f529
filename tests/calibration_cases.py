"""A small calibration for the tests: three vanadium species, and what a changed set gives for them.

The observables are not published: they are those of the set `standard` with three numbers changed, so that a fit that
starts from `standard` must find the changes again.
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import basis_params
from basis_params import ParameterTable
from ehmo import bond_report
from tests.published.structures import STRUCTURES

SPECIES = ("VO4 3-", "VOCl3", "[VOCl4]2-")
CHANGES = {"V 3d h_ii": 0.7, "K_pi": 1.85, "lambda": 0.9}

SPEC = """
name = "changed"
observables = ["observables.csv"]
structures = ["structures.xyz"]

[sd]
"Mayer order" = 0.01
charge = 0.02
"d-d band" = 200.0

[[fit]]
parameter = "h_ii"
of = ["V 3d"]
sd = 3.0

[[fit]]
parameter = "K_pi"
sd = 0.5

[[fit]]
parameter = "lambda"
sd = 0.5
"""

HEAD = "species,structure,quantity,of,value,sd,unit,source,read_or_memory"


def changed_set() -> ParameterTable:
    """The set `standard` with the changes."""
    base = basis_params.load_set("standard")
    vanadium = base.elements["V"]
    shells = tuple(
        replace(shell, h_ii_eV=shell.h_ii_eV + CHANGES["V 3d h_ii"]) if shell.label == "3d" else shell
        for shell in vanadium.shells
    )
    settings = replace(base.settings, K_pi=CHANGES["K_pi"], lambda_=CHANGES["lambda"])
    return replace(base, settings=settings, elements={**base.elements, "V": replace(vanadium, shells=shells)})


def observables() -> str:
    """Table of observables that the changed set gives."""
    table, lines = changed_set(), [HEAD]
    for name in SPECIES:
        report = bond_report(STRUCTURES[name].fragment(), table)
        for bond, orders in list(report.bonds())[:2]:
            lines.append(f"{name},{name},Mayer order,{report.bond_label(bond)},{orders.mayer:.12f},,,made here,derived")
        lines.append(f"{name},{name},charge,V1,{report.populations.charges[0]:.12f},,e,made here,derived")
        for band in report.spectroscopy.bands:
            if band.upper_term in {"2E", "2B1"}:
                wavenumber = f"{band.wavenumber_per_cm:.9f}"
                lines.append(f"{name},{name},d-d band,{band.upper_term},{wavenumber},,cm-1,made here,derived")
    return "\n".join(lines) + "\n"


def structures() -> str:
    """Frames of the species."""
    text = ""
    for name in SPECIES:
        species = STRUCTURES[name]
        text += f"{len(species.symbols)}\n{name} charge={species.charge} unpaired={species.unpaired_electrons}\n"
        for symbol, (x, y, z) in zip(species.symbols, species.positions_A, strict=True):
            text += f"{symbol} {x:.12f} {y:.12f} {z:.12f}\n"
    return text


def put_case(folder: Path, spec: str = SPEC) -> Path:
    """Write the case into a folder and give the path of its specification."""
    (folder / "observables.csv").write_text(observables())
    (folder / "structures.xyz").write_text(structures())
    path = folder / "case.toml"
    path.write_text(spec)
    return path
