"""What a calibration keeps of its way, so that a run that was stopped goes on."""

from __future__ import annotations

import json
import math
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray
from ehmo.records.calibration import CalibrationSpec, ElectronicFit

SCHEMA = "ehmo calibration progress 1"


@dataclass(eq=False)
class Progress:
    """How far a calibration has come.

    Attributes
    ----------
    sha256 : str
        Of the specification.
    values : (n_parameters,) ndarray or None
        Parameters of the last step; None before the first.
    fit : ElectronicFit or None
        Solution, once there is one.
    left_out : dict of str to (n_parameters,) ndarray
        Parameters fitted without each species that is done.
    """

    sha256: str
    values: FloatArray | None = None
    fit: ElectronicFit | None = None
    left_out: dict[str, FloatArray] = field(default_factory=dict)

    def text(self) -> str:
        """JSON text that `read_progress` takes."""
        fit = self.fit
        content: dict[str, Any] = {
            "schema": SCHEMA,
            "specification_sha256": self.sha256,
            "values": None if self.values is None else self.values.tolist(),
            "fit": None
            if fit is None
            else {
                "values": fit.values.tolist(),
                "covariance": fit.covariance.tolist(),
                "cost": fit.cost,
                "evaluations": fit.evaluations,
            },
            "left_out": {species: values.tolist() for species, values in self.left_out.items()},
        }
        return json.dumps(content, indent=1) + "\n"


def read_progress(text: str, place: str, spec: CalibrationSpec) -> Progress:
    """Progress of an earlier run of the same specification.

    Parameters
    ----------
    text : str
        JSON.
    place : str
        Path, for messages.
    spec : CalibrationSpec

    Returns
    -------
    progress : Progress

    Raises
    ------
    InputError
        If the text is no such progress, or that of another specification, set or training table.
    """
    mend = "give another file, or delete this one to start anew"
    try:
        content = json.loads(text)
        if content["schema"] != SCHEMA:
            raise ValueError
    except (ValueError, TypeError, KeyError, RecursionError):
        raise InputError("not the progress of a calibration", place=place, mend=mend) from None
    if content.get("specification_sha256") != spec.sha256:
        raise InputError("the progress of another specification, base or training set", place=place, mend=mend)
    n = len(spec.parameters)
    try:
        values, fit = content["values"], content["fit"]
        left_out = {str(name): _vector(value, n) for name, value in dict(content["left_out"]).items()}
        return Progress(
            spec.sha256,
            None if values is None else _vector(values, n),
            None
            if fit is None
            else ElectronicFit(
                _vector(fit["values"], n),
                np.array([_vector(row, n) for row in fit["covariance"]]).reshape(n, n),
                float(fit["cost"]),
                int(fit["evaluations"]),
            ),
            left_out,
        )
    except (ValueError, TypeError, KeyError):
        raise InputError("damaged", place=place, mend=mend) from None


def _vector(values: Any, n: int) -> FloatArray:
    found = np.array([float(value) for value in values], dtype=float)
    if len(found) != n or not all(math.isfinite(value) for value in found):
        raise ValueError
    return found
