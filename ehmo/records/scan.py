"""A scan: one distance or angle changed step by step, everything else held."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from ehmo.records.arrays import FloatArray, IntArray, frozen_floats, frozen_ints
from ehmo.records.markup import html_sentences, html_table

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
    relaxed : bool
        Whether the rest of the molecule is relaxed at each value.
    """

    coordinate: Coordinate
    atoms: tuple[int, ...]
    moved: tuple[int, ...]
    values: tuple[float, ...]
    notes: tuple[str, ...] = ()
    relaxed: bool = False


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
    energy_eV : float or None
        Energy above the separated neutral atoms; None where the set is not calibrated [eV].
    smearing_eV : float
        Width of the filling, 0 for whole electrons [eV].
    positions_A : (n_atoms, 3) ndarray or None
        Coordinates of a relaxed point [angstrom].
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
    energy_eV: float | None = None
    smearing_eV: float = 0.0
    positions_A: FloatArray | None = None

    def __post_init__(self) -> None:
        n_mo = len(self.energies_eV)
        put = object.__setattr__
        put(self, "energies_eV", frozen_floats(self.energies_eV, (n_mo,), "energies_eV"))
        put(self, "occupations", frozen_floats(self.occupations, (n_mo,), "occupations"))
        put(self, "followed", frozen_ints(self.followed, (n_mo,), "followed"))
        put(self, "charges", frozen_floats(self.charges, (None,), "charges"))
        if self.positions_A is not None:
            put(self, "positions_A", frozen_floats(self.positions_A, (len(self.charges), 3), "positions_A"))


@dataclass(frozen=True, slots=True)
class ScannedMode:
    """A stretching mode with a part in the scanned bond; degenerate ones are one entry.

    Attributes
    ----------
    wavenumber_per_cm : float
        Harmonic [cm^-1].
    reduced_mass_u : float
        [u]
    share : float
        Share of the scanned bond; over all modes it adds up to 1.
    stretches : tuple of (str, float)
        Label and part of each bond, the scanned one positive.
    """

    wavenumber_per_cm: float
    reduced_mass_u: float
    share: float
    stretches: tuple[tuple[str, float], ...]


@dataclass(frozen=True, slots=True)
class ScanMinimum:
    """Minimum of the energy along a scanned length.

    Attributes
    ----------
    length_A : float
    energy_eV : float
        Above the separated neutral atoms [eV].
    force_constant_N_per_m : float
        Second derivative of the fitted polynomial [N/m].
    fitted : tuple of float
        Lengths of the points that the polynomial goes through [angstrom].
    fit_rms_eV : float
        Root mean square distance of the points from it [eV].
    modes : tuple of ScannedMode
        Highest wavenumber first.
    isotopes : tuple of (str, int)
        Atom or element, and mass number; standard atomic weights for the rest.
    """

    length_A: float
    energy_eV: float
    force_constant_N_per_m: float
    fitted: tuple[float, ...]
    fit_rms_eV: float
    modes: tuple[ScannedMode, ...]
    isotopes: tuple[tuple[str, int], ...] = ()


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
    minimum : ScanMinimum or None
        Where the set is calibrated for the scanned bond and the scan has one.
    parameter_sha256 : str
        Content hash of the set.
    constants : tuple of (str, float or bool or None)
        Constants of the Hamiltonian by name; None follows K.
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
    minimum: ScanMinimum | None = None
    parameter_sha256: str = ""
    constants: tuple[tuple[str, float | bool | None], ...] = ()

    def _repr_html_(self) -> str:
        """Points as a table for a notebook, with crossings and what is withheld."""
        place = self.scanned_bond or 0
        named, unit = "-".join(self.labels[atom] for atom in self.plan.atoms), "Å"
        unit = unit if self.plan.coordinate == "length" else "degree"
        heading = [f"{named}/{unit}", "overlap pop.", "Mayer", "sigma", "pi", "ground term", "energy/eV"]
        rows = [heading]
        for point in self.points:
            if point.fault:
                rows.append([f"{point.value:g}", "", "", "", "", point.fault, ""])
                continue
            bond = point.bonds[place]
            numbers = (bond.overlap_population, bond.mayer, bond.sigma, bond.pi)
            energy = "" if point.energy_eV is None else f"{point.energy_eV:.3f}"
            rows.append([f"{point.value:g}", *(f"{value:z.2f}" for value in numbers), point.ground_term, energy])
        label = self.bond_labels[place] if self.bond_labels else ""
        caption = f"scan of {named}, numbers of {label}; set {self.parameter_set}, {self.charge_model} charges"
        parts = [html_table(caption, rows, (0, 1, 2, 3, 4, 6)), html_sentences("Crossings", self.crossings, shown=True)]
        return "".join([*parts, html_sentences("Withheld", self.withheld), html_sentences("Assumed", self.plan.notes)])
