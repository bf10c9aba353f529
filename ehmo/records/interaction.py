"""Orbitals of a fragment as they arise from a metal and the ligands of one bond."""

from __future__ import annotations

from dataclasses import dataclass

from ehmo.records.arrays import FloatArray, frozen_floats


@dataclass(frozen=True, slots=True)
class PartLevel:
    """Level of the metal alone, or of the ligands of the bond alone, in the Hamiltonian of the whole.

    Attributes
    ----------
    energy_eV : float
        [eV]
    degeneracy : int
    label : str
        Shell for the metal, such as ``3d``; leading shell of the donors for ligands, such as ``2p``.
    irreps : tuple of str
        Irreps that it holds in the group of the sphere, such as ``("a1", "e")``; none without a group.
    symmetry : str
        "sigma", "pi", ... about the bonds; empty for the metal.
    donor_share : float
        Part on the donor atoms of the bonds; 0 for the metal.
    """

    energy_eV: float
    degeneracy: int
    label: str
    irreps: tuple[str, ...]
    symmetry: str
    donor_share: float = 0.0


@dataclass(frozen=True, slots=True)
class OrbitalSet:
    """Orbitals of the fragment that are one level.

    Attributes
    ----------
    orbitals : tuple of int
        Their places, lowest first.
    energy_eV : float
        Mean [eV].
    irrep : str
        Empty without a group.
    number : int
        Which level of that irrep it is, counted from the lowest valence level; 0 without a group, or where a distorted
        structure splits degenerate levels.
    alpha, beta : float
        Electrons of either spin in the set.
    symmetry : str
        Bond part that dominates its overlap population with the bonds; empty if there is next to none.
    overlap_population : float
        Of one orbital of it with the bonds, holding two electrons [e].
    metal_share, ligand_share, donor_share : float
        Gross shares of the metal, of the ligands of the bond, and of the donor atoms within these.
    """

    orbitals: tuple[int, ...]
    energy_eV: float
    irrep: str
    number: int
    alpha: float
    beta: float
    symmetry: str
    overlap_population: float
    metal_share: float
    ligand_share: float
    donor_share: float

    @property
    def label(self) -> str:
        """Such as ``2b1``; the irrep alone where it is not numbered; the orbital, from 1, where there is no group."""
        return f"{self.number or ''}{self.irrep}" if self.irrep else f"({self.orbitals[0] + 1})"

    @property
    def part(self) -> str:
        """Bond part with a star where it is antibonding, such as ``pi*``; empty if it is neither."""
        return f"{self.symmetry}*" if self.symmetry and self.overlap_population < 0 else self.symmetry


@dataclass(frozen=True, slots=True, eq=False)
class Interaction:
    """Levels of a metal, of the ligands that one bond and its equals lead to, and of the whole fragment.

    Attributes
    ----------
    metal : int
        Atom index.
    bonds : tuple of int
        Places of the bonds: the chosen one and those of the same kind and length at the metal.
    ligand_atoms : tuple of int
        Atoms of their ligands.
    metal_levels, ligand_levels : tuple of PartLevel
        By rising energy.
    sets : tuple of OrbitalSet
        By rising energy, all orbitals of the fragment.
    metal_contributions : (n_sets, n_metal_levels) ndarray
        Gross share of each metal level in an orbital of the set.
    ligand_contributions : (n_sets, n_ligand_levels) ndarray
        The same for the levels of the ligands.
    """

    metal: int
    bonds: tuple[int, ...]
    ligand_atoms: tuple[int, ...]
    metal_levels: tuple[PartLevel, ...]
    ligand_levels: tuple[PartLevel, ...]
    sets: tuple[OrbitalSet, ...]
    metal_contributions: FloatArray
    ligand_contributions: FloatArray

    def __post_init__(self) -> None:
        n_sets, put = len(self.sets), object.__setattr__
        for name, levels in (
            ("metal_contributions", self.metal_levels),
            ("ligand_contributions", self.ligand_levels),
        ):
            put(self, name, frozen_floats(getattr(self, name), (n_sets, len(levels)), name))
