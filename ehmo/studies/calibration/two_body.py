"""Two-body terms fitted to lengths and stretching wavenumbers, everything electronic held.

Along the bonds of one metal the electrons give forces and force constants, calculated once at the published geometry.
A term A exp(-B R) adds A B exp(-B R) to the force on its bonds and A B^2 exp(-B R) to their force constants, so that
trying terms costs nothing.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace

import numpy as np

from basis_params import PairRepulsion, ParameterTable, atom_symbols
from ehmo.calculate.energy import energy_model
from ehmo.errors import EhmoError, InputError
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.calibration import MECHANICAL, CalibrationSpec, FreePair, Observable
from ehmo.records.coordination import MetalDonorBond
from ehmo.studies.calibration.modes import kind_and_phase, phase_wavenumber
from ehmo.studies.calibration.training import TrainingStructure
from ehmo.studies.stretching import (
    atom_masses,
    bond_force_constants,
    bond_forces,
    equilibrium_change,
    normal_modes,
    wilson_G,
)

FORCE_SD_EV_PER_A = 30.0
"""Standard deviation of the prior of A B exp(-B R) at the mean length of a pair, about zero: wide [eV/angstrom]."""

START_EV_PER_A = 10.0
"""Where A B exp(-B R) starts [eV/angstrom]."""

SOFTEST_EV_PER_A2 = 5.0
"""A softer bond counts as this soft while terms are tried, so that its length stays finite [eV/angstrom^2]."""


@dataclass(frozen=True, slots=True, eq=False)
class StretchedStructure:
    """Forces along the bonds of one structure without the terms that are fitted.

    Attributes
    ----------
    structure : TrainingStructure
    bonds : tuple of MetalDonorBond
        Those that a fitted pair holds.
    pair_of : (n_bonds,) ndarray of int
        Which pair holds each.
    forces : (n_bonds,) ndarray
        Positive where the bond would lengthen [eV/angstrom].
    constants : (n_bonds, n_bonds) ndarray
        [eV/angstrom^2]
    inverse_masses : (n_bonds, n_bonds) ndarray
        [1/u]
    """

    structure: TrainingStructure
    bonds: tuple[MetalDonorBond, ...]
    pair_of: IntArray
    forces: FloatArray
    constants: FloatArray
    inverse_masses: FloatArray

    @property
    def lengths_A(self) -> FloatArray:
        """(n_bonds,) published lengths [angstrom]."""
        return np.array([bond.length_A for bond in self.bonds])

    def chosen(self, of: str) -> list[int]:
        """Places of the bonds that an observable means: one by its label, or all of a kind."""
        labels = self.structure.fragment.labels
        return [
            place
            for place, bond in enumerate(self.bonds)
            if of in (f"{labels[bond.metal]}-{labels[bond.donor]}", bond.kind.value)
        ]

    def value(self, observable: Observable, forces: FloatArray, decays: FloatArray) -> float:
        """Length or wavenumber with terms of given force at the published lengths.

        Parameters
        ----------
        observable : Observable
        forces : (n_bonds,) ndarray
            A B exp(-B R) of each bond [eV/angstrom].
        decays : (n_bonds,) ndarray
            B of each bond [1/angstrom].

        Returns
        -------
        value : float
            A length is that of one Newton step from the published one.
        """
        constants = self.constants + np.diag(forces * decays)
        if observable.quantity == "length":
            places = self.chosen(observable.of)
            stiffness = float(constants[np.ix_(places, places)].sum())
            pull = float((self.forces + forces)[places].sum())
            return observable.value + pull / max(stiffness, SOFTEST_EV_PER_A2 * len(places))
        kind, in_phase = kind_and_phase(observable.of)
        modes = normal_modes(constants, self.inverse_masses)
        return phase_wavenumber(modes, self.chosen(kind), in_phase=bool(in_phase))


def stretched_structures(
    spec: CalibrationSpec, structures: dict[str, TrainingStructure], table: ParameterTable
) -> dict[str, StretchedStructure]:
    """Structures with a length or a wavenumber, with their electronic forces.

    Parameters
    ----------
    spec : CalibrationSpec
    structures : dict of str to TrainingStructure
    table : ParameterTable
        Fitted set without two-body terms.

    Returns
    -------
    stretched : dict of str to StretchedStructure
        Those whose bonds are of pairs that are fitted.

    Raises
    ------
    InputError
        If no length tells a pair.
    EhmoError
        If a structure cannot be calculated.
    """
    silent = replace(table, repulsion={pair.label: _term(spec, pair, 0.0, 1.0, (1.0, 2.0)) for pair in spec.pairs})
    model = energy_model(silent)
    found: dict[str, StretchedStructure] = {}
    for name in dict.fromkeys(o.structure for o in spec.observables if o.quantity in MECHANICAL):
        structure = structures[name]
        fragment, coordination = structure.fragment, structure.coordination
        held = [(bond, place) for bond in coordination.bonds if (place := _pair_of(spec.pairs, structure, bond)) >= 0]
        if not held:
            continue
        bonds = tuple(bond for bond, _ in held)
        found[name] = StretchedStructure(
            structure,
            bonds,
            np.array([place for _, place in held], dtype=np.intp),
            bond_forces(fragment, coordination, bonds, model),
            bond_force_constants(fragment, coordination, bonds, model),
            wilson_G(fragment, coordination, bonds, atom_masses(fragment)),
        )
    for place, pair in enumerate(spec.pairs):
        if not any(_tells(o, place, found) for o in spec.observables if o.quantity == "length"):
            raise InputError(
                f"no length among the observables tells the pair {pair.label}",
                place=spec.place,
                mend="add one, or strike the pair out",
            )
    return found


def mechanical_observables(spec: CalibrationSpec, stretched: dict[str, StretchedStructure]) -> tuple[Observable, ...]:
    """Lengths and wavenumbers whose bonds are all of fitted pairs."""
    return tuple(
        o
        for o in spec.observables
        if o.quantity in MECHANICAL and any(_tells(o, place, stretched) for place in range(len(spec.pairs)))
    )


def fit_pairs(
    spec: CalibrationSpec, stretched: dict[str, StretchedStructure], observables: Sequence[Observable]
) -> dict[str, PairRepulsion]:
    """Least squares of the terms against lengths and wavenumbers, with the robust loss of the other fit.

    Parameters
    ----------
    spec : CalibrationSpec
    stretched : dict of str to StretchedStructure
    observables : sequence of Observable
        Lengths and wavenumbers to be used.

    Returns
    -------
    terms : dict of str to PairRepulsion
        By label; pairs that no length tells are missing.
    """
    terms: dict[str, PairRepulsion] = {}
    # Pairs of different metals share no structure: each metal is a fit of its own.
    for metal in dict.fromkeys(pair.first for pair in spec.pairs):
        told = [
            place
            for place, pair in enumerate(spec.pairs)
            if pair.first == metal and any(_tells(o, place, stretched) for o in observables if o.quantity == "length")
        ]
        if told:
            fit = _PairFit(spec, stretched, tuple(observables), tuple(told))
            terms |= {term.label: term for term in fit.terms()}
    return terms


class _PairFit:
    """Fit of the terms of one metal; the unknowns are A B exp(-B R) at the mean lengths, then ln B where it is free."""

    def __init__(
        self,
        spec: CalibrationSpec,
        stretched: dict[str, StretchedStructure],
        observables: tuple[Observable, ...],
        told: tuple[int, ...],
    ) -> None:
        self._spec, self._stretched, self._told = spec, stretched, told
        self._used = [o for o in observables if any(_tells(o, place, stretched) for place in told)]
        self._lengths = [_lengths(place, self._used, stretched) for place in told]
        self._middle = np.array([float(np.mean(lengths)) for lengths in self._lengths])
        decays = np.array([spec.pairs[place].decay_per_A for place in told])
        self._logs = np.log(decays)
        self._spread = np.array([spec.pairs[place].decay_sd for place in told]) / decays
        self._free = self._spread > 0
        order = {place: k for k, place in enumerate(told)}
        self._order = {
            name: np.array([order.get(place, -1) for place in one.pair_of.tolist()], dtype=np.intp)
            for name, one in stretched.items()
        }

    def terms(self) -> Iterator[PairRepulsion]:
        """The fitted terms."""
        from scipy.optimize import least_squares

        first = np.concatenate([np.full(len(self._told), START_EV_PER_A), self._logs[self._free]])
        forces, decays = self._unpacked(least_squares(self._residuals, first, loss="soft_l1", x_scale="jac").x)
        for k, place in enumerate(self._told):
            amplitude = float(forces[k] / decays[k] * np.exp(decays[k] * self._middle[k]))
            margin, lengths = self._spec.margin_A, self._lengths[k]
            bounds = round(min(lengths) - margin, 2), round(max(lengths) + margin, 2)
            yield _term(self._spec, self._spec.pairs[place], amplitude, float(decays[k]), bounds)

    def _unpacked(self, x: FloatArray) -> tuple[FloatArray, FloatArray]:
        n, logs = len(self._told), self._logs.copy()
        logs[self._free] = x[n:]
        return x[:n], np.exp(logs)

    def _residuals(self, x: FloatArray) -> FloatArray:
        forces, decays = self._unpacked(x)
        differences = []
        for o in self._used:
            one, order = self._stretched[o.structure], self._order[o.structure]
            pull = forces[order] * np.exp(-decays[order] * (one.lengths_A - self._middle[order]))
            pull[order < 0] = 0.0
            differences.append((one.value(o, pull, decays[order]) - o.value) / o.sd)
        n = len(self._told)
        priors = (x[n:] - self._logs[self._free]) / self._spread[self._free]
        return np.concatenate([differences, x[:n] / FORCE_SD_EV_PER_A, priors])


def mechanical_value(observable: Observable, stretched: StretchedStructure, table: ParameterTable) -> float | None:
    """Length at the minimum, or wavenumber at the published geometry, that a table with its terms gives.

    Parameters
    ----------
    observable : Observable
    stretched : StretchedStructure
        Names the bonds.
    table : ParameterTable

    Returns
    -------
    value : float or None
        None where there is no minimum within reach.
    """
    structure = stretched.structure
    model = energy_model(table)
    try:
        if observable.quantity == "length":
            bonds = [stretched.bonds[place] for place in stretched.chosen(observable.of)]
            return observable.value + equilibrium_change(structure.fragment, structure.coordination, bonds, model)
        constants = bond_force_constants(structure.fragment, structure.coordination, stretched.bonds, model)
    except EhmoError:
        return None
    there = replace(stretched, constants=constants)
    n = len(stretched.bonds)
    return there.value(observable, np.zeros(n), np.ones(n))


def _tells(observable: Observable, pair: int, stretched: dict[str, StretchedStructure]) -> bool:
    """Whether the bonds of an observable are of a pair."""
    one = stretched.get(observable.structure)
    if one is None:
        return False
    places = one.chosen(kind_and_phase(observable.of)[0])
    return bool(places) and all(one.pair_of[place] == pair for place in places)


def _lengths(pair: int, observables: Sequence[Observable], stretched: dict[str, StretchedStructure]) -> list[float]:
    """Lengths of the bonds that tell a pair."""
    return [
        stretched[o.structure].bonds[place].length_A
        for o in observables
        if o.quantity == "length" and _tells(o, pair, stretched)
        for place in stretched[o.structure].chosen(o.of)
    ]


def _pair_of(pairs: Sequence[FreePair], structure: TrainingStructure, bond: MetalDonorBond) -> int:
    ends = {structure.fragment.symbols[bond.metal], structure.fragment.symbols[bond.donor]}
    return next((place for place, pair in enumerate(pairs) if {pair.first, pair.second} == ends), -1)


def _term(
    spec: CalibrationSpec, pair: FreePair, amplitude: float, decay: float, bounds: tuple[float, float]
) -> PairRepulsion:
    known = atom_symbols()
    first, second = sorted((pair.first, pair.second), key=known.index, reverse=True)
    return PairRepulsion(
        first,
        second,
        float(f"{amplitude:.5g}"),
        float(f"{decay:.5g}"),
        *bounds,
        source_key=spec.source_key,
        locator="lengths and stretching wavenumbers",
        provenance="derived",
    )
