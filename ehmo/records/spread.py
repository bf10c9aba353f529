"""How far the numbers of a report move with the parameters."""

from __future__ import annotations

from dataclasses import dataclass

from ehmo.records.arrays import FloatArray, frozen_floats


@dataclass(frozen=True, slots=True)
class UncertainParameter:
    """One parameter that is drawn.

    Attributes
    ----------
    name : str
        Such as ``V 3d h_ii``, ``O 2p zeta``, ``K`` or ``lambda``.
    unit : str
        "eV", "bohr^-1", "1/A" or empty.
    value, sd : float
        Value in use and standard deviation of the draws; of several exponents the smallest [unit].
    stated : bool
        Whether the parameter table states the standard deviation; else it is a default.
    """

    name: str
    unit: str
    value: float
    sd: float
    stated: bool


@dataclass(frozen=True, slots=True)
class ParameterEffect:
    """What one parameter does to one bond.

    Attributes
    ----------
    parameter : str
        Name of the parameter.
    mayer_per_sd : float
        Change of the Mayer order with one standard deviation of it, the others unmoved.
    """

    parameter: str
    mayer_per_sd: float


@dataclass(frozen=True, slots=True)
class BondSpread:
    """Standard deviations of one metal-donor bond.

    Attributes
    ----------
    overlap_population, mayer, wiberg : float
        [e] for the overlap population.
    channel_weights : tuple of float
        In the order of `BondOrders.channels`; channels are matched by type and place within the type.
    sensitivity : tuple of ParameterEffect
        Largest first.
    """

    overlap_population: float
    mayer: float
    wiberg: float
    channel_weights: tuple[float, ...]
    sensitivity: tuple[ParameterEffect, ...]


@dataclass(frozen=True, slots=True)
class LevelSpread:
    """Standard deviations of one level of a ladder.

    Attributes
    ----------
    energy_eV : float
        Of the level itself [eV].
    above_lowest_per_cm : float
        Of its distance from the lowest level of the ladder [cm^-1].
    """

    energy_eV: float
    above_lowest_per_cm: float


@dataclass(frozen=True, slots=True, eq=False)
class Spread:
    """Standard deviations over draws of the parameters.

    Attributes
    ----------
    draws, seed : int
        Number of draws and seed of the random numbers.
    used : int
        Draws that the standard deviations rest on.
    indefinite_overlap, unsettled, other_configuration : int
        Draws left out because the overlap matrix was not positive definite, the charges did not converge, or the
        ladder was filled in another way.
    parameters : tuple of UncertainParameter
        What was drawn.
    charges : (n_atoms,) ndarray
        Mulliken charges [e].
    orbital_energies_eV : (n_mo,) ndarray
        Orbitals in the order of their energies [eV].
    bonds : tuple of BondSpread
        In the order of the bonds.
    levels : tuple of (tuple of LevelSpread)
        Per metal, in the order of the ladder's levels; empty for one without ladder.
    bands_per_cm : tuple of (float or None)
        In the order of the bands; None for a band that is not followed [cm^-1].
    """

    draws: int
    seed: int
    used: int
    indefinite_overlap: int
    unsettled: int
    other_configuration: int
    parameters: tuple[UncertainParameter, ...]
    charges: FloatArray
    orbital_energies_eV: FloatArray
    bonds: tuple[BondSpread, ...]
    levels: tuple[tuple[LevelSpread, ...], ...]
    bands_per_cm: tuple[float | None, ...]

    def __post_init__(self) -> None:
        put = object.__setattr__
        put(self, "charges", frozen_floats(self.charges, (None,), "charges"))
        put(self, "orbital_energies_eV", frozen_floats(self.orbital_energies_eV, (None,), "orbital_energies_eV"))
