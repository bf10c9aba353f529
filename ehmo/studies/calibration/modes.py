"""Which stretching mode a published wavenumber means."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ehmo.records.stretching import StretchingModes

PHASES = {" in phase": True, " out of phase": False}


def kind_and_phase(of: str) -> tuple[str, bool | None]:
    """Kind of donor, or bond, of an observable, and whether its bonds move in phase; None for a length.

    Examples
    --------
    >>> kind_and_phase("oxo out of phase")
    ('oxo', False)
    """
    for ending, in_phase in PHASES.items():
        if of.endswith(ending):
            return of.removesuffix(ending), in_phase
    return of, None


def phase_wavenumber(modes: StretchingModes, places: Sequence[int], *, in_phase: bool) -> float:
    """Wavenumber of the mode in which some bonds stretch together, or the mean of those in which they do not.

    Parameters
    ----------
    modes : StretchingModes
    places : sequence of int
        The bonds.
    in_phase : bool

    Returns
    -------
    wavenumber : float
        NaN for modes out of phase of a single bond [cm^-1].
    """
    parts = modes.vectors[:, list(places)]
    together = parts.sum(axis=1) ** 2 / len(places)
    if in_phase:
        return float(modes.wavenumbers_per_cm[np.argmax(together)])
    apart = (parts**2).sum(axis=1) - together
    chosen = np.argsort(-apart, kind="stable")[: len(places) - 1]
    return float(modes.wavenumbers_per_cm[chosen].mean()) if len(chosen) else float("nan")
