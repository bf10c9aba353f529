"""What a crystal holds: molecules with metals, other ions and solvent, extended networks."""

from __future__ import annotations

from dataclasses import dataclass
from math import gcd
from typing import Final

from ehmo.records.arrays import FloatArray, IntArray, frozen_floats, frozen_ints
from ehmo.records.coordination import DonorKind
from ehmo.records.fragment import Fragment, hill_formula

DIMENSION_WORDS: Final = {0: "molecule", 1: "chain", 2: "layer", 3: "framework"}
"""What bonds make that run on in so many directions."""


@dataclass(frozen=True, slots=True)
class MetalDonorUnit:
    """One metal-donor bond of the asymmetric unit.

    Attributes
    ----------
    metal, donor : str
        Labels in the file, as found (hostile text: show it escaped).
    metal_symbol, donor_symbol : str
    kind : DonorKind
        Kind of the donor atom.
    length_A : float
        [angstrom]
    bond_valence : float or None
        None where no R0 is tabulated [valence units].
    n_metals : int
        Metals that share the donor.
    per_metal : int
        Equivalent bonds at one metal atom.
    multiplicity : int
        Equivalent bonds in the unit cell.
    metal_atom, donor_atom : int
        One pair of atoms of the cell that is bonded so.
    shift : tuple of int
        Lattice translation of the donor atom in that pair.
    """

    metal: str
    donor: str
    metal_symbol: str
    donor_symbol: str
    kind: DonorKind
    length_A: float
    bond_valence: float | None
    n_metals: int
    per_metal: int
    multiplicity: int
    metal_atom: int
    donor_atom: int
    shift: tuple[int, int, int]


@dataclass(frozen=True, slots=True, eq=False)
class CrystalMolecule:
    """A molecule or ion with metals, once for all its symmetry-equivalent copies.

    Attributes
    ----------
    fragment : Fragment
        Its atoms put together; `fragment.crystal` has labels and symmetry. The charge is set where the file or the
        balance of the crystal gives it.
    name : str
        Formula with its charge as far as known.
    multiplicity : int
        Copies in the unit cell.
    units : tuple of MetalDonorUnit
    """

    fragment: Fragment
    name: str
    multiplicity: int
    units: tuple[MetalDonorUnit, ...]


@dataclass(frozen=True, slots=True)
class CrystalSpecies:
    """A molecule or ion without metals: counter-ion or solvent.

    Attributes
    ----------
    formula : str
        In the usual order where the species is known, else in Hill order, as the atoms stand in the file.
    name : str
        Common name; empty where there is none.
    charge : int or None
        Formal charge with missing hydrogens counted as present; None where it cannot be told.
    count : float
        In the unit cell, weighted with the occupancy.
    missing_hydrogens : int
        Hydrogen atoms that the file does not list, of each one.
    in_model : bool
        Whether the atoms are part of the ordered model.
    dimension : int
        Directions in which its bonds run on.
    """

    formula: str
    name: str
    charge: int | None
    count: float
    missing_hydrogens: int = 0
    in_model: bool = True
    dimension: int = 0


@dataclass(frozen=True, slots=True, eq=False)
class CrystalNetwork:
    """A chain, layer or framework with metals, once for all its symmetry-equivalent copies.

    Attributes
    ----------
    symbols : tuple of str
    positions_A : (n_atoms, 3) ndarray
        One repeat unit of one copy; neighbours may need lattice translations [angstrom].
    cell_A : (3, 3) ndarray
        Rows are the lattice vectors [angstrom].
    labels : tuple of str
        Label of each atom in the file.
    atoms : (n_atoms,) ndarray of int
        Places of the atoms in `CrystalContents.symbols`.
    dimension : int
        1 chain, 2 layer, 3 framework.
    multiplicity : int
        Copies in the unit cell.
    units : tuple of MetalDonorUnit
        Multiplicities are those of the unit cell, all copies together.
    charge : int or None
        Charge of one copy in one cell by the balance of the crystal; None where it cannot be told.
    charge_reason : str
    """

    symbols: tuple[str, ...]
    positions_A: FloatArray
    cell_A: FloatArray
    labels: tuple[str, ...]
    atoms: IntArray
    dimension: int
    multiplicity: int
    units: tuple[MetalDonorUnit, ...]
    charge: int | None = None
    charge_reason: str = ""

    def __post_init__(self) -> None:
        n = len(self.symbols)
        object.__setattr__(self, "positions_A", frozen_floats(self.positions_A, (n, 3), "positions_A"))
        object.__setattr__(self, "cell_A", frozen_floats(self.cell_A, (3, 3), "cell_A"))
        object.__setattr__(self, "atoms", frozen_ints(self.atoms, (n,), "atoms"))

    @property
    def formula(self) -> str:
        """Hill formula of one copy in one cell."""
        return hill_formula(self.symbols)

    @property
    def formula_units(self) -> int:
        """Formula units of one copy in one cell."""
        return gcd(*(self.symbols.count(symbol) for symbol in set(self.symbols)))

    @property
    def reduced_formula(self) -> str:
        """Hill formula of one formula unit."""
        units = self.formula_units
        return hill_formula(tuple(s for s in sorted(set(self.symbols)) for _ in range(self.symbols.count(s) // units)))

    @property
    def word(self) -> str:
        """Chain, layer or framework."""
        return DIMENSION_WORDS[self.dimension]


@dataclass(frozen=True, slots=True, eq=False)
class CrystalContents:
    """What one data block of a file holds.

    Attributes
    ----------
    source, title : str
        File and block; title as found (hostile text: show it escaped).
    cell_A : (3, 3) ndarray
        Rows are the lattice vectors [angstrom].
    symbols : tuple of str
        Every atom of the ordered model of the unit cell.
    positions_A : (n_atoms, 3) ndarray
        [angstrom]
    labels : tuple of str
        Label of each atom in the file.
    sites : (n_atoms,) ndarray of int
        Number of the site of each atom: equal for symmetry-equivalent ones.
    molecules : tuple of CrystalMolecule
    networks : tuple of CrystalNetwork
    species : tuple of CrystalSpecies
        Counter-ions and solvent.
    missing_hydrogens : tuple of str
        Sentences on hydrogens that the file lacks.
    notes : tuple of str
        What was done to the atoms, and what the file leaves open, one sentence each.
    """

    source: str
    title: str
    cell_A: FloatArray
    symbols: tuple[str, ...]
    positions_A: FloatArray
    labels: tuple[str, ...]
    sites: IntArray
    molecules: tuple[CrystalMolecule, ...]
    networks: tuple[CrystalNetwork, ...]
    species: tuple[CrystalSpecies, ...]
    missing_hydrogens: tuple[str, ...] = ()
    notes: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        n = len(self.symbols)
        object.__setattr__(self, "cell_A", frozen_floats(self.cell_A, (3, 3), "cell_A"))
        object.__setattr__(self, "positions_A", frozen_floats(self.positions_A, (n, 3), "positions_A"))
        object.__setattr__(self, "sites", frozen_ints(self.sites, (n,), "sites"))

    @property
    def fragments(self) -> tuple[Fragment, ...]:
        """Fragment of each molecule."""
        return tuple(molecule.fragment for molecule in self.molecules)
