"""An energy axis on paper that shortens stretches without levels."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from ehmo.records.arrays import FloatArray

EMPTY_EV: Final = 3.0
"""A stretch without levels that is longer than this is shortened [eV]."""

BREAK_EV: Final = 1.2
"""What a shortened stretch takes on paper [eV]."""

_MARGIN_EV = 0.35
_STEPS = (0.5, 1.0, 2.0, 5.0, 10.0)


@dataclass(frozen=True, slots=True, eq=False)
class EnergyAxis:
    """Energies to heights on paper.

    Attributes
    ----------
    stretches_eV : (n, 2) ndarray
        Lower and upper end of each stretch that is drawn to scale, lowest first [eV].
    starts_cm : (n,) ndarray
        Height of the lower end of each [cm].
    cm_per_eV : float
        Scale within a stretch.
    """

    stretches_eV: FloatArray
    starts_cm: FloatArray
    cm_per_eV: float

    def height_cm(self, energy_eV: float) -> float:
        """Height of an energy within one of the stretches, or at their nearest end [cm]."""
        low, high = self.stretches_eV.T
        k = int(np.argmin(np.maximum(np.maximum(low - energy_eV, energy_eV - high), 0.0)))
        inside = float(np.clip(energy_eV, low[k], high[k]))
        return float(self.starts_cm[k] + (inside - low[k]) * self.cm_per_eV)

    def holds(self, energy_eV: float) -> bool:
        """Whether an energy lies in a stretch drawn to scale."""
        low, high = self.stretches_eV.T
        return bool(((low <= energy_eV) & (energy_eV <= high)).any())

    def ends_cm(self) -> FloatArray:
        """(n, 2) heights of the ends of the stretches [cm]."""
        starts = self.starts_cm
        return np.stack([starts, starts + np.diff(self.stretches_eV, axis=1)[:, 0] * self.cm_per_eV], axis=1)

    def ticks_eV(self, nearest_cm: float = 0.7) -> list[float]:
        """Round energies within the stretches, at least so far apart [eV]."""
        usual = next((k for k, s in enumerate(_STEPS) if s * self.cm_per_eV >= nearest_cm), len(_STEPS) - 1)
        ticks: list[float] = []
        for low, high in self.stretches_eV:
            # A short stretch may hold none of the usual round energies.
            for step in reversed(_STEPS[: usual + 1]):
                found = step * np.arange(np.ceil(low / step), np.floor(high / step) + 1)
                if len(found):
                    ticks += found.tolist()
                    break
        return ticks


def energy_axis(energies_eV: Sequence[float], low_cm: float, high_cm: float) -> EnergyAxis:
    """Axis over some levels between two heights.

    Parameters
    ----------
    energies_eV : sequence of float
        Levels to be shown, at least one [eV].
    low_cm, high_cm : float
        Ends on paper [cm].

    Returns
    -------
    axis : EnergyAxis
    """
    levels = np.unique(np.asarray(energies_eV, dtype=np.float64))
    broken = np.flatnonzero(np.diff(levels) > EMPTY_EV)
    lows = levels[np.concatenate([[0], broken + 1])] - _MARGIN_EV
    highs = levels[np.concatenate([broken, [len(levels) - 1]])] + _MARGIN_EV
    lengths = highs - lows
    whole = lengths.sum() + BREAK_EV * len(broken)
    scale = (high_cm - low_cm) / whole
    starts = low_cm + scale * np.concatenate([[0.0], np.cumsum(lengths[:-1] + BREAK_EV)])
    return EnergyAxis(np.stack([lows, highs], axis=1), starts, float(scale))
