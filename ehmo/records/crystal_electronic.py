"""Bands of a crystal and what they mean: filling, populations, bond orders."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ehmo.records.arrays import FloatArray, IntArray, frozen_floats, frozen_ints
from ehmo.records.basis import Basis
from ehmo.records.bloch import KMesh, LatticeBond, MatrixArray
from ehmo.records.bonding import BondOrders

SMALLEST_GAP_EV = 0.02
"""Bands closer than this count as touching, and are filled by the smeared distribution [eV]."""


@dataclass(frozen=True, slots=True)
class CellElectrons:
    """Valence electrons of one cell.

    Attributes
    ----------
    total : int
        Electrons per cell.
    unpaired : int or None
        Alpha minus beta; None for as many of either spin, be it half an electron.
    """

    total: int
    unpaired: int | None = None

    @property
    def by_spin(self) -> tuple[float, float]:
        """Alpha and beta electrons."""
        unpaired = self.unpaired or 0
        return (self.total + unpaired) / 2, (self.total - unpaired) / 2


@dataclass(frozen=True, slots=True, eq=False)
class BandFilling:
    """Occupation of every band on a mesh.

    Attributes
    ----------
    occupations : (2, n_k, n_bands) ndarray
        Alpha and beta, between 0 and 1.
    fermi_eV : (2,) ndarray
        Fermi level of each spin: middle of the gap, or level of the smeared distribution [eV].
    smearing_eV : float
        Width of the Fermi-Dirac filling; 0 where every band is full or empty [eV].
    """

    occupations: FloatArray
    fermi_eV: FloatArray
    smearing_eV: float

    def __post_init__(self) -> None:
        put = object.__setattr__
        put(self, "occupations", frozen_floats(self.occupations, (2, None, None), "occupations"))
        put(self, "fermi_eV", frozen_floats(self.fermi_eV, (2,), "fermi_eV"))


@dataclass(frozen=True, slots=True)
class BandGap:
    """Gap between the highest filled and the lowest empty band, as far as the k-points show it.

    Attributes
    ----------
    valence_eV, conduction_eV : float
        Highest filled and lowest empty level [eV].
    valence_k, conduction_k : tuple of float
        Where they lie, in reciprocal vectors.
    direct_eV : float
        Smallest gap at one k-point [eV].
    direct_k : tuple of float
    """

    valence_eV: float
    conduction_eV: float
    valence_k: tuple[float, float, float]
    conduction_k: tuple[float, float, float]
    direct_eV: float
    direct_k: tuple[float, float, float]

    @property
    def gap_eV(self) -> float:
        """Smallest gap, between any two k-points [eV]."""
        return self.conduction_eV - self.valence_eV

    @property
    def is_direct(self) -> bool:
        """Whether no other pair of k-points has a smaller gap than one of them."""
        return self.direct_eV - self.gap_eV < 1e-4


@dataclass(frozen=True, slots=True, eq=False)
class BandState:
    """Bands on a mesh, their filling and energy.

    Attributes
    ----------
    mesh : KMesh
    energies_eV : (n_k, n_bands) ndarray
        Ascending at each k [eV].
    coefficients : tuple of (n_ao, n_bands) ndarray
        Per k: C^+ S C = 1.
    shell_shares : (n_k, n_shells, n_bands) ndarray
        Gross population of each shell in each band; the sum over shells is 1.
    filling : BandFilling
    energy_eV : float
        Per cell: sum of the occupied levels, plus the charge term where charges act back [eV].
    band_energy_eV : float
        Per cell: sum of the occupied levels [eV].
    charges : (n_atoms,) ndarray
        Core charge minus gross population [e].
    potential_eV : (n_atoms,) ndarray
        Shift of each atom's functions by the charges; zero for fixed charges [eV].
    charge_model : str
    iterations : int
    charge_residual : float
        Largest change of a charge in the last iteration [e].
    smallest_overlap_eigenvalue : float
        Over the mesh.
    """

    mesh: KMesh
    energies_eV: FloatArray
    coefficients: tuple[MatrixArray, ...]
    shell_shares: FloatArray
    filling: BandFilling
    energy_eV: float
    band_energy_eV: float
    charges: FloatArray
    potential_eV: FloatArray
    charge_model: str
    iterations: int
    charge_residual: float
    smallest_overlap_eigenvalue: float

    def __post_init__(self) -> None:
        n_k, n_bands = len(self.mesh), self.energies_eV.shape[1]
        put = object.__setattr__
        put(self, "energies_eV", frozen_floats(self.energies_eV, (n_k, n_bands), "energies_eV"))
        put(self, "shell_shares", frozen_floats(self.shell_shares, (n_k, None, n_bands), "shell_shares"))
        n_atoms = len(self.charges)
        put(self, "charges", frozen_floats(self.charges, (n_atoms,), "charges"))
        put(self, "potential_eV", frozen_floats(self.potential_eV, (n_atoms,), "potential_eV"))

    @property
    def weighted_filling(self) -> FloatArray:
        """(n_k, n_bands) electrons per cell in each level, both spins, times the weight of its k."""
        filled: FloatArray = self.filling.occupations.sum(axis=0) * self.mesh.weights[:, None]
        return filled


@dataclass(frozen=True, slots=True, eq=False)
class CrystalPopulations:
    """Mulliken populations per cell, averaged over the mesh.

    Attributes
    ----------
    gross, net : (n_ao,) ndarray
        Of each function [e].
    charges : (n_atoms,) ndarray
        Core charge minus gross population [e].
    spin : (n_atoms,) ndarray
        Alpha minus beta [e].
    shell_gross : (n_shells,) ndarray
        [e]
    atom_overlap : (n_atoms, n_atoms) ndarray
        Overlap population of an atom with all images of another, over both halves. The diagonal holds the atom's
        own functions and its overlap with its own images [e].
    """

    gross: FloatArray
    net: FloatArray
    charges: FloatArray
    spin: FloatArray
    shell_gross: FloatArray
    atom_overlap: FloatArray

    def __post_init__(self) -> None:
        n_ao, n_atoms = len(self.gross), len(self.charges)
        shapes: dict[str, tuple[int | None, ...]] = {
            "gross": (n_ao,),
            "net": (n_ao,),
            "charges": (n_atoms,),
            "spin": (n_atoms,),
            "shell_gross": (None,),
            "atom_overlap": (n_atoms, n_atoms),
        }
        for name, shape in shapes.items():
            object.__setattr__(self, name, frozen_floats(getattr(self, name), shape, name))


@dataclass(frozen=True, slots=True, eq=False)
class EnergyCurve:
    """Quantities per energy, broadened by Gaussians.

    Attributes
    ----------
    energies_eV : (n,) ndarray
        Even steps [eV].
    values : (n_curves, n) ndarray
        Per electronvolt.
    width_eV : float
        Standard deviation of the Gaussians [eV].
    """

    energies_eV: FloatArray
    values: FloatArray
    width_eV: float

    def __post_init__(self) -> None:
        n = len(self.energies_eV)
        object.__setattr__(self, "energies_eV", frozen_floats(self.energies_eV, (n,), "energies_eV"))
        object.__setattr__(self, "values", frozen_floats(self.values, (None, n), "values"))


def band_gap(points: FloatArray, energies_eV: FloatArray, n_filled: float) -> BandGap | None:
    """Gap above a number of filled bands.

    Parameters
    ----------
    points : (n_k, 3) ndarray
        Fractional k-points.
    energies_eV : (n_k, n_bands) ndarray
        Ascending levels [eV].
    n_filled : float
        Filled bands of one spin.

    Returns
    -------
    gap : BandGap or None
        None if the number is not whole, if no band is left empty, or if the bands touch or overlap.
    """
    bands = round(n_filled)
    if abs(bands - n_filled) > 1e-9 or not 0 < bands < energies_eV.shape[1]:
        return None
    top, bottom = energies_eV[:, bands - 1], energies_eV[:, bands]
    v, c, d = int(top.argmax()), int(bottom.argmin()), int((bottom - top).argmin())
    if bottom[c] - top[v] <= SMALLEST_GAP_EV:
        return None
    at = [(float(points[k, 0]), float(points[k, 1]), float(points[k, 2])) for k in (v, c, d)]
    return BandGap(float(top[v]), float(bottom[c]), at[0], at[1], float(np.min(bottom - top)), at[2])


@dataclass(frozen=True, slots=True)
class MeshChange:
    """What another mesh changes.

    Attributes
    ----------
    counts : tuple of int
        The other mesh.
    energy_per_atom_eV : float
        Change of the energy per atom, from the other mesh to the reported one [eV].
    largest_charge_e : float
        Largest change of a charge [e].
    largest_order : float
        Largest change of a Mayer or Wiberg order.
    gap_eV : float or None
        Change of the gap; None if one of the two meshes shows none [eV].
    """

    counts: tuple[int, int, int]
    energy_per_atom_eV: float
    largest_charge_e: float
    largest_order: float
    gap_eV: float | None


@dataclass(frozen=True, slots=True, eq=False)
class BandPath:
    """Bands along lines between special points of the Brillouin zone.

    Attributes
    ----------
    path : str
        Names of the special points in order; a comma stands for a jump.
    points : (n_k, 3) ndarray
        Fractional k-points.
    distances : (n_k,) ndarray
        Along the path, without the jumps [1/angstrom].
    labels : tuple of (int, str)
        Number of the k-point and name of each special point.
    energies_eV : (n_k, n_bands) ndarray
        Ascending [eV].
    """

    path: str
    points: FloatArray
    distances: FloatArray
    labels: tuple[tuple[int, str], ...]
    energies_eV: FloatArray

    def __post_init__(self) -> None:
        n_k = len(self.points)
        put = object.__setattr__
        put(self, "points", frozen_floats(self.points, (n_k, 3), "points"))
        put(self, "distances", frozen_floats(self.distances, (n_k,), "distances"))
        put(self, "energies_eV", frozen_floats(self.energies_eV, (n_k, None), "energies_eV"))


@dataclass(frozen=True, slots=True, eq=False)
class CrystalBonding:
    """The numeric result on a crystal.

    Attributes
    ----------
    basis : Basis
        Functions of one cell.
    atoms : (n_atoms,) ndarray of int
        Place in the input of each atom that carries functions.
    ions : (n_ions,) ndarray of int
        Places of the point charges.
    ion_charges : (n_ions,) ndarray
        [e]
    electrons : CellElectrons
    state : BandState
    populations : CrystalPopulations
    bonds : tuple of LatticeBond
        With places in the input.
    lengths_A : (n_bonds,) ndarray
        [angstrom]
    orders : tuple of BondOrders
        One per bond.
    gap : BandGap or None
        On the mesh; None for a metal.
    mesh_change : MeshChange or None
        None if it was not asked for.
    path : BandPath or None
    """

    basis: Basis
    atoms: IntArray
    ions: IntArray
    ion_charges: FloatArray
    electrons: CellElectrons
    state: BandState
    populations: CrystalPopulations
    bonds: tuple[LatticeBond, ...]
    lengths_A: FloatArray
    orders: tuple[BondOrders, ...]
    gap: BandGap | None
    mesh_change: MeshChange | None
    path: BandPath | None

    def __post_init__(self) -> None:
        put = object.__setattr__
        put(self, "atoms", frozen_ints(self.atoms, (len(self.basis.symbols),), "atoms"))
        put(self, "ions", frozen_ints(self.ions, (None,), "ions"))
        put(self, "ion_charges", frozen_floats(self.ion_charges, (len(self.ions),), "ion_charges"))
        put(self, "lengths_A", frozen_floats(self.lengths_A, (len(self.bonds),), "lengths_A"))

    @property
    def charges(self) -> FloatArray:
        """Charge of every atom and ion, in the order of the input [e]."""
        charges = np.zeros(len(self.atoms) + len(self.ions))
        charges[self.atoms] = self.populations.charges
        charges[self.ions] = self.ion_charges
        return charges

    @property
    def place_of(self) -> dict[int, int]:
        """Number among the atoms with functions, by place in the input."""
        return {int(atom): place for place, atom in enumerate(self.atoms)}
