"""Terms of an open d or f shell, its spin-orbit levels and its magnetism."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np
from numpy.typing import NDArray

from ehmo.records.arrays import FloatArray, IntArray, frozen_floats, frozen_ints

ComplexArray = NDArray[np.complex128]

_SUPERSCRIPTS: Final = str.maketrans("0123456789", "⁰¹²³⁴⁵⁶⁷⁸⁹")


@dataclass(frozen=True, slots=True)
class ElectronRepulsion:
    """Slater integrals of an open shell, F0 left out since it moves all terms alike.

    Attributes
    ----------
    F2_per_cm, F4_per_cm, F6_per_cm : float
        Integrals F^2, F^4, F^6 [cm^-1]; F^6 belongs to f shells alone.
    """

    F2_per_cm: float
    F4_per_cm: float
    F6_per_cm: float = 0.0

    @classmethod
    def from_racah(cls, B_per_cm: float, C_per_cm: float) -> ElectronRepulsion:
        """Integrals of a d shell from Racah's B and C.

        Parameters
        ----------
        B_per_cm, C_per_cm : float
            Racah parameters [cm^-1].

        Returns
        -------
        repulsion : ElectronRepulsion

        Notes
        -----
        B = F^2/49 - 5 F^4/441 and C = 35 F^4/441.

        References
        ----------
        .. [1] racah-1942: G. Racah, Phys. Rev. 62, 438 (1942) (from memory).
        """
        return cls(49 * B_per_cm + 7 * C_per_cm, 63 * C_per_cm / 5)

    def scaled(self, factor: float) -> ElectronRepulsion:
        """All integrals times a factor."""
        return ElectronRepulsion(factor * self.F2_per_cm, factor * self.F4_per_cm, factor * self.F6_per_cm)


@dataclass(frozen=True, slots=True, eq=False)
class Term:
    """A spin-free state of the shell with the components that belong together.

    Attributes
    ----------
    label : str
        Such as ``3T1g``.
    multiplicity : int
        2S + 1.
    irrep : str
        Mulliken symbol in capitals, or the letter of L in a free ion.
    degeneracy : int
        Number of spatial components.
    energy_per_cm : float
        Mean of the components [cm^-1].
    components_per_cm : (degeneracy,) ndarray
        Energies of the components above the lowest state of the shell, ascending [cm^-1].
    share : float
        Mean part of the components that has the irrep; 1 in an exactly symmetric field.
    parent : str
        Letter of the L that prevails, as in 3T1g(P).
    parent_share : float
        Part of the term with that L.
    configuration : tuple of (str, int)
        Electrons in each level of the field, for the heaviest configuration.
    configuration_share : float
        Weight of that configuration.
    """

    label: str
    multiplicity: int
    irrep: str
    degeneracy: int
    energy_per_cm: float
    components_per_cm: FloatArray
    share: float
    parent: str
    parent_share: float
    configuration: tuple[tuple[str, int], ...]
    configuration_share: float

    def __post_init__(self) -> None:
        components = frozen_floats(self.components_per_cm, (self.degeneracy,), "components_per_cm")
        object.__setattr__(self, "components_per_cm", components)

    @property
    def spread_per_cm(self) -> float:
        """Distance of the outer components: how far the field departs from the group [cm^-1]."""
        return float(self.components_per_cm[-1] - self.components_per_cm[0])

    @property
    def configuration_text(self) -> str:
        """Configuration such as ``t2g² eg¹``."""
        return configuration_in_words(self.configuration)


def configuration_in_words(configuration: tuple[tuple[str, int], ...]) -> str:
    """Occupied levels with their electrons.

    Examples
    --------
    >>> configuration_in_words((("t2g", 3), ("eg", 0)))
    't2g³'
    """
    return " ".join(f"{level}{str(count).translate(_SUPERSCRIPTS)}" for level, count in configuration if count)


@dataclass(frozen=True, slots=True, eq=False)
class FieldLevel:
    """A level of the ligand field that the configurations fill.

    Attributes
    ----------
    label : str
        Irrep, with a number before it where it occurs more than once, such as ``2e``.
    degeneracy : int
    energy_per_cm : float
        Mean above the barycentre of the shell [cm^-1].
    share : float
        Mean part of the orbitals that has the irrep.
    """

    label: str
    degeneracy: int
    energy_per_cm: float
    share: float


@dataclass(frozen=True, slots=True, eq=False)
class Terms:
    """All spin-free terms of an open shell, lowest first.

    Attributes
    ----------
    l : int
        2 for a d shell, 3 for an f shell.
    n_electrons : int
    group : str
        Point group of the labels.
    levels : tuple of FieldLevel
        Levels of the field, lowest first.
    terms : tuple of Term
    by_symmetry : tuple of str
        Terms of highest spin that symmetry and the Pauli principle allow for the configuration of the ground
        term; one entry if that settles the ground term.
    """

    l: int
    n_electrons: int
    group: str
    levels: tuple[FieldLevel, ...]
    terms: tuple[Term, ...]
    by_symmetry: tuple[str, ...]

    @property
    def ground(self) -> Term:
        """Lowest term."""
        return self.terms[0]

    def lowest(self, multiplicity: int) -> Term | None:
        """Lowest term of a multiplicity 2S + 1; None if the shell has none."""
        return next((term for term in self.terms if term.multiplicity == multiplicity), None)


@dataclass(frozen=True, eq=False)
class SpinOrbitStates:
    """Eigenstates of a shell with ligand field, repulsion and spin-orbit coupling.

    Attributes
    ----------
    l, n_electrons : int
    energies_per_cm : (n_states,) ndarray
        Above the lowest state, ascending [cm^-1].
    vectors : (n_states, n_states) ndarray of complex
        Column k is state k in the determinants of `ehmo.analysis.multiplets.determinants`.
    orbital_momentum : (3, n, n) ndarray of complex
        One-electron orbital angular momentum that was used [hbar].
    """

    l: int
    n_electrons: int
    energies_per_cm: FloatArray
    vectors: ComplexArray
    orbital_momentum: ComplexArray

    def __post_init__(self) -> None:
        size, n = len(self.energies_per_cm), 2 * self.l + 1
        put = object.__setattr__
        put(self, "energies_per_cm", frozen_floats(self.energies_per_cm, (size,), "energies_per_cm"))
        for name, shape in (("vectors", (size, size)), ("orbital_momentum", (3, n, n))):
            array: ComplexArray = getattr(self, name)
            if array.shape != shape:
                raise ValueError(f"{name} has shape {array.shape}, expected {shape}")
            if array.flags.writeable:
                array = array.copy()
                array.flags.writeable = False
            put(self, name, array)

    @cached_property
    def levels(self) -> tuple[FloatArray, IntArray]:
        """Energies of the distinct levels [cm^-1] and their degeneracies; see `DISTINCT_PER_CM`."""
        energies = self.energies_per_cm
        starts = np.flatnonzero(np.diff(energies, prepend=-np.inf) > DISTINCT_PER_CM)
        counts = np.diff(starts, append=len(energies))
        means = np.add.reduceat(energies, starts) / counts
        return frozen_floats(means, (len(starts),), "levels"), frozen_ints(counts, (len(starts),), "degeneracies")


DISTINCT_PER_CM: Final = 1e-3
"""Spin-orbit states closer than this count as one level [cm^-1]."""


@dataclass(frozen=True, slots=True, eq=False)
class ZeroFieldSplitting:
    """Zero-field splitting of the ground spin multiplet, H = D (Sz^2 - S(S+1)/3) + E (Sx^2 - Sy^2).

    D > 0 puts the smallest |M_S| lowest. The axes are chosen such that 0 <= E/D <= 1/3.

    Attributes
    ----------
    spin : float
    D_per_cm, E_per_cm : float
        [cm^-1].
    axes : (3, 3) ndarray
        Rows are the x, y, z of the splitting.
    residual_per_cm : float
        Root mean square of what D and E leave out of the effective matrix: terms of fourth order in S [cm^-1].
    purity : float
        Smallest part of the spin-orbit states that lies in the ground term.
    """

    spin: float
    D_per_cm: float
    E_per_cm: float
    axes: FloatArray
    residual_per_cm: float
    purity: float

    def __post_init__(self) -> None:
        object.__setattr__(self, "axes", frozen_floats(self.axes, (3, 3), "axes"))


@dataclass(frozen=True, slots=True, eq=False)
class GTensor:
    """g tensor of an effective spin, its principal values without sign.

    Attributes
    ----------
    effective_spin : float
        1/2 for a Kramers doublet, else the spin of the ground term.
    values : (3,) ndarray
        Principal values, ascending.
    axes : (3, 3) ndarray
        Row k is the axis of value k.
    """

    effective_spin: float
    values: FloatArray
    axes: FloatArray

    def __post_init__(self) -> None:
        put = object.__setattr__
        put(self, "values", frozen_floats(self.values, (3,), "values"))
        put(self, "axes", frozen_floats(self.axes, (3, 3), "axes"))

    def along(self, direction: FloatArray) -> float:
        """Effective g for a field along a direction, (sum_k g_k^2 cos^2_k)^(1/2)."""
        cosines = self.axes @ np.asarray(direction, dtype=np.float64)
        return float(np.linalg.norm(self.values * cosines) / np.linalg.norm(cosines))


@dataclass(frozen=True, slots=True, eq=False)
class Magnetism:
    """Magnetic properties of one open shell.

    Attributes
    ----------
    temperature_K : float
    spin : float
        Spin of the ground term.
    spin_only_moment : float
        [n (n + 2)]^(1/2) with n = 2S [Bohr magneton].
    effective_moment : float
        Van Vleck's moment at the temperature [Bohr magneton].
    zero_field_splitting : ZeroFieldSplitting or None
    g_tensor : GTensor or None
        Of the ground Kramers doublet where S = 1/2 or the ground term is orbitally degenerate, else of the spin.
    doublet_g_tensor : GTensor or None
        Of the ground Kramers doublet, for an odd number of electrons.
    level_energies_per_cm : (n_levels,) ndarray
        Spin-orbit levels [cm^-1].
    level_degeneracies : (n_levels,) ndarray of int
    withheld : tuple of str
        What is missing above and why.
    """

    temperature_K: float
    spin: float
    spin_only_moment: float
    effective_moment: float
    zero_field_splitting: ZeroFieldSplitting | None
    g_tensor: GTensor | None
    doublet_g_tensor: GTensor | None
    level_energies_per_cm: FloatArray
    level_degeneracies: IntArray
    withheld: tuple[str, ...]

    def __post_init__(self) -> None:
        size = len(self.level_energies_per_cm)
        put = object.__setattr__
        put(self, "level_energies_per_cm", frozen_floats(self.level_energies_per_cm, (size,), "level_energies_per_cm"))
        put(self, "level_degeneracies", frozen_ints(self.level_degeneracies, (size,), "level_degeneracies"))
