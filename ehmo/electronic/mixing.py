"""Acceleration of a fixed-point iteration."""

from __future__ import annotations

from collections import deque

import numpy as np

from ehmo.records.arrays import FloatArray

_REPEATED = 1e-10
"""Steps that add less than this share of a new direction are dropped."""


class AndersonMixer:
    """Anderson's extrapolation of x -> f(x) from the last few pairs.

    Parameters
    ----------
    start : (n,) ndarray
        First x.
    damping : float
        Share of the residual that enters the next x.
    depth : int
        Pairs kept.

    References
    ----------
    .. [1] anderson-1965: D. G. Anderson, J. Assoc. Comput. Mach. 12, 547 (1965).
    """

    def __init__(self, start: FloatArray, *, damping: float = 0.5, depth: int = 5) -> None:
        self.value = start
        self._damping = damping
        self._steps: deque[tuple[FloatArray, FloatArray]] = deque(maxlen=depth)
        self._last: tuple[FloatArray, FloatArray] | None = None

    def update(self, image: FloatArray) -> None:
        """Take f(value) and move `value` to the next guess."""
        value, residual = self.value, image - self.value
        if self._last is not None:
            self._steps.append((value - self._last[0], residual - self._last[1]))
        self._last = value, residual
        if self._steps:
            value_steps = np.array([step[0] for step in self._steps])
            residual_steps = np.array([step[1] for step in self._steps])
            weights = np.linalg.lstsq(residual_steps.T, residual, rcond=_REPEATED)[0]
            value = value - weights @ value_steps
            residual = residual - weights @ residual_steps
        self.value = value + self._damping * residual
