"""Absorption bands, and a fit of the ligand field to observed ones."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from ehmo.records.arrays import FloatArray

BandKind = Literal["d-d", "f-f", "charge transfer"]

TransferDirection = Literal["LMCT", "MLCT", "intraligand", "metal-centred"]
"""Where an electron goes: ligand to metal, metal to ligand, within the ligands, or within the metal."""


@dataclass(frozen=True, slots=True)
class Band:
    """One absorption band.

    Attributes
    ----------
    kind : {"d-d", "f-f", "charge transfer"}
    wavenumber_per_cm : float
        Energy above the ground term [cm^-1].
    transition : str
        Orbitals between which the electron moves, such as ``b2 to e``.
    upper_term : str
        Such as ``2E``; empty where the excited configuration makes many.
    degeneracy : int
        Degeneracy factor: components that add to the intensity.
    spin_allowed, dipole_allowed : bool
    polarisation : str
        Axes along which it is allowed, such as ``x, y``.
    oscillator_strength : float or None
        None where nothing but vibrations or spin-orbit coupling lends it intensity.
    orbitals : tuple of (int, int) or None
        For charge transfer: first orbital of the set that gives and of the one that takes the electron.
    direction : TransferDirection or None
        For charge transfer: by the metal shares of both sets.
    to_metal : float or None
        For charge transfer: part of the electron that moves onto the metal, negative if it leaves it.
    """

    kind: BandKind
    wavenumber_per_cm: float
    transition: str
    upper_term: str
    degeneracy: int
    spin_allowed: bool
    dipole_allowed: bool
    polarisation: str
    oscillator_strength: float | None
    orbitals: tuple[int, int] | None = None
    direction: TransferDirection | None = None
    to_metal: float | None = None


@dataclass(frozen=True, slots=True)
class FittedParameter:
    """One parameter of the fit to observed bands.

    Attributes
    ----------
    name : str
        Level of the field, counted from the lowest computed one, or ``B``.
    computed_per_cm, fitted_per_cm, width_per_cm : float
        Start, result and its standard deviation [cm^-1].
    determined : bool
        Whether the bands narrow the width well below the allowed one.
    """

    name: str
    computed_per_cm: float
    fitted_per_cm: float
    width_per_cm: float
    determined: bool


@dataclass(frozen=True, slots=True)
class BandAssignment:
    """One observed band with the term that it is assigned to.

    Attributes
    ----------
    observed_per_cm, computed_per_cm, fitted_per_cm : float
        Observed, and the term's energy before and after the fit [cm^-1].
    upper_term : str
    """

    observed_per_cm: float
    computed_per_cm: float
    fitted_per_cm: float
    upper_term: str


@dataclass(frozen=True, slots=True, eq=False)
class BandFit:
    """Ligand field that reproduces observed bands, as close to the computed one as they let it.

    Attributes
    ----------
    assignments : tuple of BandAssignment
    parameters : tuple of FittedParameter
    undetermined : tuple of str
        Combinations of parameters that the bands leave where they were.
    field_eV : (n, n) ndarray
        Fitted field in the local axes [eV].
    repulsion_scale : float
        Factor of the repulsion.
    """

    assignments: tuple[BandAssignment, ...]
    parameters: tuple[FittedParameter, ...]
    undetermined: tuple[str, ...]
    field_eV: FloatArray
    repulsion_scale: float
