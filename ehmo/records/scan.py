"""A scan: one distance or angle changed step by step, everything else held."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from ehmo.records.arrays import FloatArray, IntArray, frozen_floats, frozen_ints

Coordinate = Literal["length", "angle"]


@dataclass(frozen=True, slots=True)
class ScanPlan:
    """What is scanned.

    Attributes
    ----------
    coordinate : {"length", "angle"}
    atoms : tuple of int
        Metal and donor of a length; donor, metal and donor of an angle.
    moved : tuple of int
        Atoms that move with the last atom.
    values : tuple of float
        Lengths [angstrom] or angles [degree].
    notes : tuple of str
        What was assumed, one sentence each.
    """

    coordinate: Coordinate
    atoms: tuple[int, ...]
    moved: tuple[int, ...]
    values: tuple[float, ...]
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class ScannedBond:
    """Numbers of one metal-donor bond at one point.

    Attributes
    ----------
    length_A : float
    overlap_population, mayer, wiberg : float
    formal_order : float or None
    sigma, pi, delta : float
        Sums of the channel weights of each symmetry.
    """

    length_A: float
    overlap_population: float
    mayer: float
    wiberg: float
    formal_order: float | None
    sigma: float
    pi: float
    delta: float


@dataclass(frozen=True, slots=True)
class ScannedLevel:
    """One level of the ladder at one point."""

    function: str
    irrep: str
    energy_eV: float
    electrons: float
    metal_share: float


@dataclass(frozen=True, slots=True, eq=False)
class ScanPoint:
    """Result at one value of the scanned coordinate.

    Attributes
    ----------
    value : float
        Length [angstrom] or angle [degree].
    fault : str
        Why there is no result; empty if there is one.
    energies_eV : (n_mo,) ndarray
        Orbital energies in the order of this point [eV].
    occupations : (n_mo,) ndarray
        Electrons in each orbital.
    irreps : tuple of str
        Label of each orbital.
    followed : (n_mo,) ndarray of int
        Orbital of this point that continues each orbital of the first point, by character.
    charges : (n_atoms,) ndarray
        Mulliken charges [e].
    bonds : tuple of ScannedBond
        In the order of the report's bonds.
    levels : tuple of ScannedLevel
        Ladder of a single metal, by rising energy.
    ground_term : str
    bands_per_cm : tuple of (str, float)
        Spin-allowed terms of the shell with their energies [cm^-1].
    iterations : int
    warnings : tuple of str
    """

    value: float
    fault: str
    energies_eV: FloatArray
    occupations: FloatArray
    irreps: tuple[str, ...]
    followed: IntArray
    charges: FloatArray
    bonds: tuple[ScannedBond, ...]
    levels: tuple[ScannedLevel, ...]
    ground_term: str
    bands_per_cm: tuple[tuple[str, float], ...]
    iterations: int
    warnings: tuple[str, ...]

    def __post_init__(self) -> None:
        n_mo = len(self.energies_eV)
        put = object.__setattr__
        put(self, "energies_eV", frozen_floats(self.energies_eV, (n_mo,), "energies_eV"))
        put(self, "occupations", frozen_floats(self.occupations, (n_mo,), "occupations"))
        put(self, "followed", frozen_ints(self.followed, (n_mo,), "followed"))
        put(self, "charges", frozen_floats(self.charges, (None,), "charges"))


@dataclass(frozen=True, slots=True, eq=False)
class Scan:
    """All points of a scan.

    Attributes
    ----------
    plan : ScanPlan
    labels : tuple of str
        Atom labels.
    bond_labels : tuple of str
        Label of each bond, such as ``V1-O2``.
    scanned_bond : int or None
        Place of the scanned bond; None for an angle.
    parameter_set, charge_model : str
    charge, unpaired_electrons : int
    points : tuple of ScanPoint
    crossings : tuple of str
        Where levels change places or the filling changes, in words.
    withheld : tuple of str
        What is not given, and why.
    """

    plan: ScanPlan
    labels: tuple[str, ...]
    bond_labels: tuple[str, ...]
    scanned_bond: int | None
    parameter_set: str
    charge_model: str
    charge: int
    unpaired_electrons: int
    points: tuple[ScanPoint, ...]
    crossings: tuple[str, ...]
    withheld: tuple[str, ...]
