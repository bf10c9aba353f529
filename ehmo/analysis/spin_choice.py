"""The spin state that a ladder asks for: level energies against the energy of pairing electrons."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ehmo.records.ligand_field import Ladder, SpinChoice
from ehmo.units import PER_CM_PER_EV


def choose_spin(
    ladder: Ladder, n_electrons: int, candidates: Sequence[int], pairing_per_cm: float, source: str
) -> SpinChoice:
    """Number of unpaired electrons of lowest energy.

    Each candidate fills the levels from below, alpha and beta; its energy is the sum of the levels plus the pairing
    energy of each pair. The free ion's pairing energy is taken as it stands, since the ladder of an extended-Hückel
    calculation runs wide where covalency would lower both.

    Parameters
    ----------
    ladder : Ladder
        Levels of the metal.
    n_electrons : int
        d electrons by counting.
    candidates : sequence of int
        Numbers of unpaired electrons that parity and shell allow.
    pairing_per_cm : float
        Mean pairing energy of the ion [cm^-1].
    source : str
        Ion that it belongs to, for the reason in words.

    Returns
    -------
    choice : SpinChoice

    References
    ----------
    .. [1] griffith-1961: J. S. Griffith, The Theory of Transition-Metal Ions, Cambridge 1961, chapter 9 (from memory).
    """
    levels = np.array([level.energy_eV for level in ladder.levels]) * PER_CM_PER_EV
    levels -= levels[0]
    energies = {}
    for unpaired in candidates:
        n_alpha, n_beta = (n_electrons + unpaired) // 2, (n_electrons - unpaired) // 2
        energies[unpaired] = float(levels[:n_alpha].sum() + levels[:n_beta].sum() + n_beta * pairing_per_cm)
    ordered = sorted(energies, key=lambda unpaired: energies[unpaired])
    best = ordered[0]
    if len(ordered) == 1:
        return SpinChoice(best, "the only number that fits", float("inf"))
    margin = energies[ordered[1]] - energies[best]
    reason = (
        f"by the ladder against the pairing energy of {source}, {pairing_per_cm:.0f} cm-1: "
        f"{ordered[1]} unpaired lie {margin:.0f} cm-1 above"
    )
    return SpinChoice(best, reason, margin)
