"""A calibration as text for a terminal and as JSON."""

from __future__ import annotations

import json
from collections.abc import Sequence

from ehmo import __version__
from ehmo.errors import visible
from ehmo.records.calibration import UNITS, Calibration, Fitted, QuantityErrors
from ehmo.records.table import aligned
from ehmo.report.cautions import CAUTIONS
from ehmo.report.text import sentence_lines

SCHEMA = "ehmo calibration 1"
WORST_SHOWN = 5


def calibration_text(calibration: Calibration) -> str:
    """Whole calibration as text.

    Parameters
    ----------
    calibration : Calibration

    Returns
    -------
    text : str
    """
    spec, fit = calibration.spec, calibration.fit
    species = len({row.observable.species for row in calibration.fitted})
    sections = [
        [
            f"{visible(spec.place)}: set {visible(spec.name)} (edition {visible(spec.edition)}) "
            f"from {visible(spec.base)}",
            f"{len(spec.parameters)} parameters, {len(calibration.fitted)} observables of {species} species, "
            f"cost {fit.cost:.2f} after {fit.evaluations} calculations of the set",
        ],
        _errors(calibration.errors(), spec.base, spec.name),
        _parameters(calibration),
        _worst(calibration),
        sentence_lines("To doubt", calibration.warnings) if calibration.warnings else [],
        sentence_lines("Cautions", CAUTIONS),
    ]
    return "\n\n".join("\n".join(section) for section in sections if section) + "\n"


def _errors(errors: Sequence[QuantityErrors], base: str, name: str) -> list[str]:
    rows = [["mean difference", "values", "species", visible(base), visible(name), "species left out"]]
    for row in errors:
        unit = UNITS[row.quantity]
        rows.append(
            [
                f"{row.quantity}/{unit}" if unit else row.quantity,
                str(row.count),
                str(row.species),
                *(_number(value, row.quantity) for value in (row.base, row.trained, row.left_out)),
            ]
        )
    return aligned(rows, (1, 2, 3, 4, 5))


def _number(value: float | None, quantity: str) -> str:
    if value is None:
        return "-"
    return f"{value:.0f}" if UNITS[quantity] == "cm-1" else f"{value:.3f}"  # type: ignore[index]


def _parameters(calibration: Calibration) -> list[str]:
    if not calibration.spec.parameters:
        return []
    rows = [["parameter", "start", "fitted", "sd", "unit"]]
    for place, parameter in enumerate(calibration.spec.parameters):
        value, sd = calibration.fit.values[place], calibration.fit.covariance[place, place] ** 0.5
        unit = "change/eV" if parameter.kind == "h_ii" else "ln factor" if parameter.kind == "zeta" else parameter.unit
        rows.append([parameter.name, f"{parameter.start:.3f}", f"{value:.3f}", f"{sd:.3f}", unit])
    return aligned(rows, (1, 2, 3))


def _worst(calibration: Calibration) -> list[str]:
    """Observables that the fitted set misses most, in standard deviations."""
    known = [row for row in calibration.fitted if row.trained is not None]
    known.sort(key=lambda row: -abs(_miss(row)))
    rows = [["misses most", "published", "fitted", "species left out"]]
    for row in known[:WORST_SHOWN]:
        quantity = row.observable.quantity
        numbers = (row.observable.value, row.trained, row.left_out)
        rows.append([visible(row.observable.name), *(_number(number, quantity) for number in numbers)])
    return aligned(rows, (1, 2, 3)) if len(rows) > 1 else []


def _miss(row: Fitted) -> float:
    assert row.trained is not None
    return (row.trained - row.observable.value) / row.observable.sd


def calibration_json(calibration: Calibration) -> str:
    """Whole calibration as JSON text.

    Parameters
    ----------
    calibration : Calibration

    Returns
    -------
    text : str
    """
    spec, fit = calibration.spec, calibration.fit
    content = {
        "schema": SCHEMA,
        "program_version": __version__,
        "specification": {
            "source": spec.place,
            "sha256": spec.sha256,
            "set": spec.name,
            "edition": spec.edition,
            "base": spec.base,
        },
        "cost": fit.cost,
        "evaluations": fit.evaluations,
        "parameters": [
            {
                "name": parameter.name,
                "unit": parameter.unit,
                "start": parameter.start,
                "prior_sd": parameter.sd,
                "lowest": parameter.lowest,
                "highest": parameter.highest,
                "fitted": float(fit.values[place]),
                "sd": float(fit.covariance[place, place] ** 0.5),
            }
            for place, parameter in enumerate(spec.parameters)
        ],
        "covariance": fit.covariance.tolist(),
        "mean_differences": [
            {
                "quantity": row.quantity,
                "unit": UNITS[row.quantity],
                "values": row.count,
                "species": row.species,
                "base": row.base,
                "fitted": row.trained,
                "left_out": row.left_out,
            }
            for row in calibration.errors()
        ],
        "observables": [
            {
                "species": row.observable.species,
                "structure": row.observable.structure,
                "quantity": row.observable.quantity,
                "of": row.observable.of,
                "unit": UNITS[row.observable.quantity],
                "value": row.observable.value,
                "sd": row.observable.sd,
                "source": row.observable.source,
                "read_or_memory": row.observable.provenance,
                "base": row.base,
                "fitted": row.trained,
                "left_out": row.left_out,
            }
            for row in calibration.fitted
        ],
        "warnings": list(calibration.warnings),
        "cautions": list(CAUTIONS),
    }
    return json.dumps(content, indent=1, ensure_ascii=False, allow_nan=False) + "\n"
