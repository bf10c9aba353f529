"""Numerical health of a calculation."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class ShellPopulation:
    """A shell of an atom with a population.

    Attributes
    ----------
    atom : int
        Atom index.
    shell : str
        Such as ``4p``.
    population : float
        [e].
    """

    atom: int
    shell: str
    population: float


@dataclass(frozen=True, slots=True)
class AntibondingShell:
    """A metal shell whose overlap population with the donor of a bond is negative.

    Attributes
    ----------
    bond : int
        Place of the bond.
    shell : str
        Shell of the metal, such as ``6p``.
    overlap_population : float
        With all shells of the donor [e].
    """

    bond: int
    shell: str
    overlap_population: float


@dataclass(frozen=True, slots=True)
class Health:
    """What tells whether the numbers of a calculation can mean what they should.

    Attributes
    ----------
    smallest_overlap_eigenvalue : float
        Near zero means nearly dependent functions.
    iterations : int
        Diagonalisations until the charges settled.
    charge_residual : float
        Largest last change of a charge [e].
    impossible_populations : tuple of ShellPopulation
        Gross populations below zero or above what the shell holds: signs of counter-intuitive mixing.
    negative_bonds : tuple of int
        Places of the metal-donor bonds whose overlap population is negative.
    antibonding_shells : tuple of AntibondingShell
        Metal shells that push a donor off although the bond as a whole may hold.
    smallest_metal_share : float
        Smallest share of the metals in a filled orbital, by gross population; negative with counter-intuitive mixing.
    frontier_gap_eV : float or None
        From the highest orbital that holds electrons to the lowest empty one; None if none is empty [eV].
    nearly_degenerate : bool
        Whether that gap is too small to tell which orbital is filled, or the frontier shares its electrons.
    smeared : bool
        Whether electrons were shared because levels crossed as the charges settled.
    """

    smallest_overlap_eigenvalue: float
    iterations: int
    charge_residual: float
    impossible_populations: tuple[ShellPopulation, ...]
    negative_bonds: tuple[int, ...]
    antibonding_shells: tuple[AntibondingShell, ...]
    smallest_metal_share: float
    frontier_gap_eV: float | None
    nearly_degenerate: bool
    smeared: bool
