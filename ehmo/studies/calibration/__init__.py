"""Calibration of a parameter set: least squares of chosen parameters against chosen observables."""

from __future__ import annotations

from ehmo.studies.calibration.progress import Progress, read_progress
from ehmo.studies.calibration.run import calibrate
from ehmo.studies.calibration.spec import read_spec

__all__ = ["Progress", "calibrate", "read_progress", "read_spec"]
