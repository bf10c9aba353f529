"""Acceleration of a fixed-point iteration."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]


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
    .. [1] anderson1965: D. G. Anderson, J. Assoc. Comput. Mach. 12, 547 (1965).
    """

    def __init__(self, start: FloatArray, *, damping: float = 0.3, depth: int = 6) -> None:
        self.value = start
        self._damping = damping
        self._depth = depth
        self._values: list[FloatArray] = []
        self._residuals: list[FloatArray] = []

    def update(self, image: FloatArray) -> None:
        """Take f(value) and move `value` to the next guess."""
        self._values = [*self._values[-self._depth :], self.value]
        self._residuals = [*self._residuals[-self._depth :], image - self.value]
        value, residual = self._values[-1], self._residuals[-1]
        if len(self._values) > 1:
            residual_steps = np.diff(self._residuals, axis=0).T
            value_steps = np.diff(self._values, axis=0).T
            weights = np.linalg.lstsq(residual_steps, residual, rcond=1e-12)[0]
            value = value - value_steps @ weights
            residual = residual - residual_steps @ weights
        self.value = value + self._damping * residual
