"""Two-body repulsion between atoms: terms of the parameter set, or the electrostatics of neutral atoms."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from math import factorial

import numpy as np

import basis_params
from basis_params import ElementParameters, PairRepulsion, ParameterTable
from ehmo.orbitals.pairs import OrbitalPlan
from ehmo.orbitals.parameters import element_parameters
from ehmo.orbitals.radial import orthogonal_radial_functions
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.units import BOHR_A, COULOMB_EV_A

_COULOMB_EV_BOHR = COULOMB_EV_A / BOHR_A


@dataclass(frozen=True, slots=True, eq=False)
class TwoBody:
    """Repulsion of every pair of atoms of a plan.

    Attributes
    ----------
    energies_eV : (n_pairs,) ndarray
        [eV]
    slopes_eV_per_A : (n_pairs,) ndarray
        Derivative by the distance [eV/angstrom].
    directions : (n_pairs, 3) ndarray
        Unit vectors from the first to the second atom.
    """

    energies_eV: FloatArray
    slopes_eV_per_A: FloatArray
    directions: FloatArray

    def gradient(self, plan: OrbitalPlan) -> FloatArray:
        """(n_atoms, 3) derivative of the sum of all pairs by the positions [eV/angstrom]."""
        pull = self.slopes_eV_per_A[:, None] * self.directions
        gradient = np.zeros((len(plan.basis.symbols), 3))
        np.add.at(gradient, plan.second, pull)
        np.subtract.at(gradient, plan.first, pull)
        return gradient


def two_body(plan: OrbitalPlan, table: ParameterTable, positions_A: FloatArray) -> TwoBody:
    """Repulsion of every pair of atoms.

    A exp(-B R) where the set has a term for the two elements, else `neutral_atom_repulsion`.

    Parameters
    ----------
    plan : OrbitalPlan
        Basis and pairs of the fragment.
    table : ParameterTable
        Parameter set that the plan was made with.
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].

    Returns
    -------
    repulsion : TwoBody
    """
    vectors = positions_A[plan.second] - positions_A[plan.first]
    distances = np.sqrt(np.einsum("pi,pi->p", vectors, vectors))
    energies, slopes = np.zeros(len(distances)), np.zeros(len(distances))
    for first, second, chosen in _element_pairs(plan):
        term = table.pair_repulsion(first, second)
        if term is not None:
            energies[chosen], slopes[chosen] = _exponential(term, distances[chosen])
        else:
            energies[chosen], slopes[chosen] = neutral_atom_repulsion(
                element_parameters(table, first), element_parameters(table, second), distances[chosen]
            )
    return TwoBody(energies, slopes, vectors / distances[:, None])


@lru_cache(maxsize=16)
def _element_pairs(plan: OrbitalPlan) -> tuple[tuple[str, str, IntArray], ...]:
    """Pairs of atoms by pairs of elements."""
    names = sorted(set(plan.basis.symbols))
    code = np.array([names.index(symbol) for symbol in plan.basis.symbols], dtype=np.intp)
    pair_code = code[plan.first] * len(names) + code[plan.second]
    return tuple(
        (names[value // len(names)], names[value % len(names)], np.flatnonzero(pair_code == value))
        for value in np.unique(pair_code)
    )


def _exponential(term: PairRepulsion, distances_A: FloatArray) -> tuple[FloatArray, FloatArray]:
    energies: FloatArray = term.amplitude_eV * np.exp(-term.decay_per_A * distances_A)
    return energies, -term.decay_per_A * energies


def neutral_atom_repulsion(
    first: ElementParameters, second: ElementParameters, distances_A: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Electrostatic energy of the core of one neutral atom in the field of the other, and its derivative.

    E = Z_B [Z_A/R - integral of rho_A(r)/|R_B - r|] with valence electrons and their cores. The formula is not
    symmetric in A and B; the mean of both is taken here, which needs no rule of which atom comes first. It falls off
    as the densities do.

    Parameters
    ----------
    first, second : ElementParameters
        Shells and valence electrons of the two elements.
    distances_A : (n,) ndarray
        [angstrom]

    Returns
    -------
    energies, slopes : (n,) ndarray
        [eV], [eV/angstrom]

    References
    ----------
    .. [1] anderson-1974: A. B. Anderson, R. Hoffmann, J. Chem. Phys. 60, 4271 (1974).
    """
    distances = distances_A * (1 / BOHR_A)
    energies, slopes = np.zeros(len(distances)), np.zeros(len(distances))
    for cloud, core in ((first, second), (second, first)):
        potential, slope = atom_density(cloud).unscreened(distances)
        half = 0.5 * core.valence_electrons * _COULOMB_EV_BOHR
        energies += half * potential
        slopes += half / BOHR_A * slope
    return energies, slopes


@dataclass(frozen=True, slots=True)
class AtomDensity:
    """Radial density of a neutral atom's valence electrons, D(r) = sum of weight r^power exp(-exponent r).

    Attributes
    ----------
    terms : tuple of (int, float, float)
        Power, exponent [bohr^-1] and weight of each term; D integrates to the number of valence electrons.
    """

    terms: tuple[tuple[int, float, float], ...]

    def unscreened(self, distances: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Potential of core and electrons on a unit charge, and its derivative.

        By Gauss's law the electrons beyond R alone count: the integral from R of D(r) (1/R - 1/r).

        Parameters
        ----------
        distances : (n,) ndarray
            R [bohr].

        Returns
        -------
        potential, slope : (n,) ndarray
            [bohr^-1], [bohr^-2]
        """
        powers, exponents, weights = (np.array(column)[:, None] for column in zip(*self.terms, strict=True))
        # Integrals from R of r^(p - 1) exp(-a r) and of r^p exp(-a r): Poisson sums in x = a R.
        x = exponents * distances
        term, lower = np.ones_like(x), np.zeros_like(x)
        for k in range(int(powers.max())):
            within = k < powers
            lower += np.where(within, term, 0.0)
            term = np.where(within, term * (x / (k + 1)), term)
        scale = weights * _factorials(powers - 1) / exponents**powers * np.exp(-x)
        inverse = (scale * lower).sum(axis=0)
        beyond = (scale * powers / exponents * (lower + term)).sum(axis=0)
        return beyond / distances - inverse, -beyond / distances**2


def _factorials(numbers: IntArray) -> FloatArray:
    return np.array([float(factorial(int(number))) for number in numbers.ravel()]).reshape(numbers.shape)


@lru_cache(maxsize=256)
def atom_density(element: ElementParameters) -> AtomDensity:
    """Density of a neutral atom with the functions of the set, spherically averaged.

    Parameters
    ----------
    element : ElementParameters

    Returns
    -------
    density : AtomDensity
    """
    terms: dict[tuple[int, float], float] = {}
    for function, electrons in zip(
        orthogonal_radial_functions(element.shells), neutral_configuration(element), strict=True
    ):
        for n1, zeta1, weight1 in function.primitives:
            for n2, zeta2, weight2 in function.primitives:
                key = n1 + n2, zeta1 + zeta2
                terms[key] = terms.get(key, 0.0) + electrons * weight1 * weight2
    return AtomDensity(tuple((power, exponent, weight) for (power, exponent), weight in terms.items() if weight))


def neutral_configuration(element: ElementParameters) -> tuple[float, ...]:
    """Electrons of each shell in the neutral atom: its ground configuration where the tables know it.

    Parameters
    ----------
    element : ElementParameters

    Returns
    -------
    electrons : tuple of float
        In the order of the shells; lowest h_ii first for a set with other shells or electrons than the tables.
    """
    try:
        known = tuple(
            float(basis_params.atomic_orbital(element.symbol, shell.n, shell.l).ground_electrons)
            for shell in element.shells
        )
    except KeyError:
        known = ()
    return known if sum(known) == element.valence_electrons else lowest_configuration(element)


def lowest_configuration(element: ElementParameters) -> tuple[float, ...]:
    """Electrons of each shell when the shells are filled by rising h_ii."""
    left = float(element.valence_electrons)
    electrons = [0.0] * len(element.shells)
    for place in sorted(range(len(electrons)), key=lambda k: element.shells[k].h_ii_eV):
        electrons[place] = min(left, 4.0 * element.shells[place].l + 2)
        left -= electrons[place]
    return tuple(electrons)


def separated_atoms_eV(symbols: tuple[str, ...], table: ParameterTable) -> float:
    """Energy of the neutral atoms far apart: each fills its shells by rising h_ii [eV]."""
    total = 0.0
    for symbol in symbols:
        element = element_parameters(table, symbol)
        total += sum(
            electrons * shell.h_ii_eV
            for electrons, shell in zip(lowest_configuration(element), element.shells, strict=True)
        )
    return total
