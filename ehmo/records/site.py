"""What a report says of each metal, and of the spectrum and magnetism of a fragment with one metal."""

from __future__ import annotations

from dataclasses import dataclass

from ehmo.records.bands import Band, BandFit
from ehmo.records.ligand_field import Ladder, LigandFieldParameters
from ehmo.records.multiplets import Magnetism, Terms
from ehmo.records.symmetry import ShapeMeasure, Symmetry


@dataclass(frozen=True, slots=True, eq=False)
class MetalSite:
    """One metal: the symmetry of its sphere, its oxidation state and its ladder.

    Attributes
    ----------
    metal : int
        Atom index.
    symmetry : Symmetry
        Of metal and donors, idealised.
    shapes : tuple of ShapeMeasure
        Against the ideal polyhedra of that coordination number, nearest first.
    oxidation_state : int or None
        By counting; None where it cannot be told, or for one of several metals.
    d_count : int or None
        d (f) electrons by counting.
    bond_valence_sum : float or None
        Brown-Altermatt sum with the parameters nearest to that oxidation state [valence units].
    ladder : Ladder or None
    ladder_withheld : str
        Why there is no ladder; empty if there is.
    parameters : LigandFieldParameters or None
    """

    metal: int
    symmetry: Symmetry
    shapes: tuple[ShapeMeasure, ...]
    oxidation_state: int | None
    d_count: int | None
    bond_valence_sum: float | None
    ladder: Ladder | None
    ladder_withheld: str
    parameters: LigandFieldParameters | None


@dataclass(frozen=True, slots=True)
class ShellConstants:
    """Free-ion constants that terms rest on, and how covalency reduces them.

    Attributes
    ----------
    ion : str
        Such as ``V4+``.
    racah_B_per_cm, racah_C_per_cm : float or None
        As used, reduced; None without electron repulsion or for f shells [cm^-1].
    F2_per_cm, F4_per_cm, F6_per_cm : float or None
        As used, reduced, for f shells [cm^-1].
    zeta_per_cm : float or None
        Spin-orbit constant of the free ion; covalency reduces the orbital operator instead [cm^-1].
    repulsion_factor : float
        Square of the mean metal share of the levels, by which the repulsion of the free ion is multiplied.
    momentum_factor : float
        Mean metal share of the levels, by which the orbital momentum is multiplied on the average.
    sources : tuple of str
        Keys of the sources.
    """

    ion: str
    racah_B_per_cm: float | None
    racah_C_per_cm: float | None
    F2_per_cm: float | None
    F4_per_cm: float | None
    F6_per_cm: float | None
    zeta_per_cm: float | None
    repulsion_factor: float
    momentum_factor: float
    sources: tuple[str, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Spectroscopy:
    """Terms, bands and magnetism of a fragment with one metal.

    Attributes
    ----------
    constants : ShellConstants or None
    terms : Terms or None
    ground_term : str
        Lowest term of the spin that the fragment has, such as ``2B2``; empty if it cannot be told.
    bands : tuple of Band
        By rising wavenumber, those within the shell before charge transfer.
    magnetism : Magnetism or None
    first_order_g : tuple of (float, float) or None
        g parallel and perpendicular of d1 by the first-order formulas of a tetragonal oxo ion.
    fitted_magnetism : Magnetism or None
        The same from the field fitted to observed bands.
    fit : BandFit or None
        Assignment of observed bands, if some were given.
    withheld : tuple of str
        What is missing above, and why.
    """

    constants: ShellConstants | None
    terms: Terms | None
    ground_term: str
    bands: tuple[Band, ...]
    magnetism: Magnetism | None
    first_order_g: tuple[float, float] | None
    fitted_magnetism: Magnetism | None
    fit: BandFit | None
    withheld: tuple[str, ...]
