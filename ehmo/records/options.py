"""Choices of a calculation that the user can make."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, get_args

from ehmo.errors import InputError

ChargeModel = Literal["fixed", "self-consistent"]


@dataclass(frozen=True, slots=True)
class Options:
    """Settings of one calculation; None leaves the choice to the file or the parameter set.

    Attributes
    ----------
    charge, unpaired_electrons : int or None
        Override the file; a guess with its reasoning if neither says.
    charge_model : {"self-consistent", "fixed"}
        Whether the atoms' charges act back on their orbital energies.
    K, K_sigma, K_pi, K_delta, K_decay_per_A, lambda_ : float or None
        Override the constants of the parameter set.
    weighting : bool or None
        Overrides whether K is weighted.
    oxidation_state : int or None
        Overrides that of counting, for a fragment with one metal.
    racah_B_per_cm : float or None
        Overrides the reduced free-ion value [cm^-1].
    observed_bands_per_cm : tuple of float
        Observed bands within the d (f) shell, to be assigned and fitted [cm^-1].
    observed_terms : tuple of str
        Upper term of each observed band, empty where the order of energy assigns it; no entry at all means that
        for every band.
    max_iterations : int
        Diagonalisations allowed for self-consistent charges.
    max_functions : int
        Basis functions allowed; time grows with their cube.
    """

    charge: int | None = None
    unpaired_electrons: int | None = None
    charge_model: ChargeModel = "self-consistent"
    K: float | None = None
    weighting: bool | None = None
    K_sigma: float | None = None
    K_pi: float | None = None
    K_delta: float | None = None
    K_decay_per_A: float | None = None
    lambda_: float | None = None
    oxidation_state: int | None = None
    racah_B_per_cm: float | None = None
    observed_bands_per_cm: tuple[float, ...] = ()
    observed_terms: tuple[str, ...] = ()
    max_iterations: int = 100
    max_functions: int = 4000

    def __post_init__(self) -> None:
        known = get_args(ChargeModel)
        if self.charge_model not in known:
            raise InputError(f"unknown charge model {self.charge_model!r}", mend=f"use {' or '.join(known)}")
        if self.unpaired_electrons is not None and self.unpaired_electrons < 0:
            raise InputError("unpaired electrons cannot be negative", mend="give 0 or more")
        if self.racah_B_per_cm is not None and not 0 < self.racah_B_per_cm < 1e5:
            raise InputError(f"Racah B is {self.racah_B_per_cm:g}", mend="give a positive number of cm-1, such as 700")
        for name in ("max_iterations", "max_functions"):
            if getattr(self, name) < 1:
                raise InputError(f"{name} must be at least 1", mend="give a positive number")
