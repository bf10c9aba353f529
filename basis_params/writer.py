"""Writer of parameter tables in CSV form."""

from __future__ import annotations

import csv
import io

from basis_params.model import ElementParameters, ParameterTable, Shell
from basis_params.reader import COLUMNS, OPTIONAL_COLUMNS, SETTING_KEYS
from basis_params.repulsion import repulsion_line


def format_table(table: ParameterTable) -> str:
    """Return the table as CSV text that reads back to equal content."""
    settings = table.settings
    out = io.StringIO()
    out.write(f"# name = {table.name}\n# edition = {table.edition}\n")
    for key in SETTING_KEYS:
        value = getattr(settings, "lambda_" if key == "lambda" else key)
        text = ("no", "yes")[value] if key == "weighting" else "K" if value is None else repr(value)
        out.write(f"# {key} = {text}\n")
    out.writelines(f"# {key}_sd = {value!r}\n" for key, value in settings.sd.items())
    out.writelines(f"{repulsion_line(term)}\n" for term in table.repulsion.values())
    out.writelines(f"# {note}\n" for note in table.notes)
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow([*COLUMNS, *OPTIONAL_COLUMNS])
    for element in table.elements.values():
        for shell in element.shells:
            writer.writerow(_cells(element, shell))
    return out.getvalue()


def _cells(element: ElementParameters, shell: Shell) -> list[str | int | float]:
    contraction: list[str | float] = [x for pair in zip(shell.zetas, shell.coefficients, strict=True) for x in pair]
    contraction += [""] * (6 - len(contraction))
    spread: list[str | float] = ["" if sd is None else sd for sd in (shell.h_ii_sd_eV, shell.zeta_sd)]
    return [
        element.symbol,
        element.valence_electrons,
        shell.n,
        "spdf"[shell.l],
        shell.h_ii_eV,
        *contraction[:4],
        shell.source_key,
        shell.locator,
        shell.provenance,
        *contraction[4:],
        *spread,
    ]
