"""Calibration of a parameter set: least squares of chosen parameters against chosen observables."""
