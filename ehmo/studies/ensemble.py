"""One report calculated again for many draws of its parameters, everything shared that the draws leave alone."""

from __future__ import annotations

from dataclasses import dataclass, fields
from enum import IntEnum
from typing import Any

import numpy as np
from numpy.typing import NDArray

import basis_params
from basis_params import ParameterTable
from ehmo.analysis.followed import FollowedLadder, follow_ladders, follow_orbitals
from ehmo.analysis.stacked import StackedFunctions, StackedOrders, stacked_orders
from ehmo.calculate.numbers import channel_constants, threads_for
from ehmo.electronic.charges import SMEARING_EV, ElectronCount, charge_interaction
from ehmo.electronic.eigen import SMALLEST_OVERLAP_EIGENVALUE
from ehmo.electronic.stacked import (
    Metric,
    StackedStates,
    charge_response,
    settled_charges,
    stacked_hamiltonians,
)
from ehmo.errors import ConvergenceError
from ehmo.orbitals.exponents import ExponentGrid, exponent_grid
from ehmo.orbitals.pairs import orbital_plan
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.report import BondReport
from ehmo.studies.uncertainty import ParameterModel

BoolArray = NDArray[np.bool_]

_NUMBERS_AT_ONCE = 250_000
"""Elements of one matrix for all draws that are worked on at once, so that they stay near the cache."""


class Outcome(IntEnum):
    """What became of a draw."""

    USED = 0
    INDEFINITE_OVERLAP = 1
    UNSETTLED = 2
    OTHER_CONFIGURATION = 3


@dataclass(frozen=True, slots=True, eq=False)
class DrawNumbers:
    """Numbers of every draw; rows of draws without result hold NaN.

    Attributes
    ----------
    energies_eV : (n_draws, n_mo) ndarray
        [eV].
    charges : (n_draws, n_atoms) ndarray
        [e].
    orders : StackedOrders
    ladders : tuple of FollowedLadder
        One per ladder of the report.
    followed_eV : (n_draws, n_followed) ndarray
        Energies of the followed orbitals [eV].
    """

    energies_eV: FloatArray
    charges: FloatArray
    orders: StackedOrders
    ladders: tuple[FollowedLadder, ...]
    followed_eV: FloatArray


@dataclass(frozen=True, slots=True, eq=False)
class DrawResults:
    """Numbers of every draw and what became of it.

    Attributes
    ----------
    outcome : (n_draws,) ndarray of int
        Values of `Outcome`. Draws of another configuration have numbers all the same.
    iterations : (n_draws,) ndarray of int
        Diagonalisations.
    numbers : DrawNumbers
    """

    outcome: IntArray
    iterations: IntArray
    numbers: DrawNumbers


class Ensemble:
    """A report with all that its draws share.

    Parameters
    ----------
    report : BondReport
        Undrawn calculation.
    table : ParameterTable
        Set that it was made with.
    model : ParameterModel
        Its uncertain parameters.
    followed : sequence of int
        Orbitals whose energies are wanted.
    """

    def __init__(
        self, report: BondReport, table: ParameterTable, model: ParameterModel, followed: tuple[int, ...] = ()
    ) -> None:
        fragment, basis = report.fragment, report.basis
        self._report, self._model, self._followed = report, model, list(followed)
        self._self_consistent = report.state.charge_model == "self-consistent"
        constants = channel_constants(model.settings)
        by_channel = len(set(constants)) > 1 or bool(model.settings.K_decay_per_A)
        self._grid: ExponentGrid = exponent_grid(
            orbital_plan(fragment.symbols, table),
            fragment.positions_A,
            {symbol: table.element(symbol).shells for symbol in set(fragment.symbols)},
            model.relative_zeta_sd,
            by_channel=by_channel,
        )
        self._metric = Metric.of(report.overlap, *np.linalg.eigh(report.overlap))
        self._undrawn = self._metric.half @ report.state.coefficients
        ends = [atom for bond in report.coordination.bonds for atom in (bond.metal, bond.donor)]
        self._bonded = np.flatnonzero(np.isin(basis.atom_of, ends))
        self._interaction = self._response = None
        if self._self_consistent:
            hardness = np.array([basis_params.atom(symbol).hardness_U_eV for symbol in fragment.symbols])
            self._interaction = charge_interaction(fragment.positions_A, hardness, 1.0)
            self._response = charge_response(report.state, report.overlap, basis)
        total = round(float(basis.core_charges.sum())) - (fragment.charge or 0)
        self._electrons = ElectronCount(total, fragment.unpaired_electrons or 0)
        self._excess_A = self._excess() if model.settings.K_decay_per_A else None

    def results(self, steps: FloatArray) -> DrawResults:
        """Numbers of all draws.

        Parameters
        ----------
        steps : (n_draws, n_parameters) ndarray
            Draws of the model [standard deviations].

        Returns
        -------
        results : DrawResults

        Raises
        ------
        ConvergenceError
            If no draw gives a result.
        """
        # Draws that leave the exponents alone share one overlap matrix.
        moved = self._model.exponent_steps(steps).any(axis=1)
        n_ao = len(self._report.basis)
        at_once = max(1, _NUMBERS_AT_ONCE // n_ao**2)
        outcome, iterations = np.zeros(len(steps), dtype=np.intp), np.zeros(len(steps), dtype=np.intp)
        lots: list[tuple[IntArray, DrawNumbers]] = []
        with threads_for(n_ao):
            for draws in (np.flatnonzero(~moved), np.flatnonzero(moved)):
                for start in range(0, len(draws), at_once):
                    chosen = draws[start : start + at_once]
                    two_centre, metric, definite = self._overlaps(steps[chosen])
                    outcome[chosen[~definite]] = Outcome.INDEFINITE_OVERLAP
                    if not definite.any():
                        continue
                    chosen = chosen[definite]
                    states = self._states(steps[chosen], two_centre, metric)
                    outcome[chosen[~states.settled]] = Outcome.UNSETTLED
                    iterations[chosen] = states.iterations
                    if states.settled.any():
                        lots.append((chosen[states.settled], self._analysed(states, metric)))
        if not lots:
            raise ConvergenceError(
                "no draw of the parameters gives a result", mend="state smaller standard deviations in the table"
            )
        numbers: DrawNumbers = _scattered(lots, len(steps))
        if numbers.ladders:
            same = np.all([ladder.same_filling for ladder in numbers.ladders], axis=0)
            outcome[~same & (outcome == Outcome.USED)] = Outcome.OTHER_CONFIGURATION
        return DrawResults(outcome, iterations, numbers)

    def _overlaps(self, steps: FloatArray) -> tuple[FloatArray, Metric, BoolArray]:
        """Overlaps of the draws whose matrix is positive definite, and which these are."""
        basis = self._report.basis
        moved = self._model.exponent_steps(steps)
        two_centre = self._grid.two_centre(moved[:, basis.type_of])
        if not moved.any():
            return two_centre, self._metric, np.ones(len(steps), dtype=bool)
        overlap = two_centre.sum(axis=1) + np.eye(len(basis))
        eigenvalues, vectors = np.linalg.eigh(overlap)
        definite = eigenvalues[:, 0] >= SMALLEST_OVERLAP_EIGENVALUE
        metric = Metric.of(overlap[definite], eigenvalues[definite], vectors[definite])
        return two_centre[definite], metric, definite

    def _states(self, steps: FloatArray, two_centre: FloatArray, metric: Metric) -> StackedStates:
        """Orbitals of the draws; where the charges do not settle, once more with smeared filling."""
        model, basis, state = self._model, self._report.basis, self._report.state
        constants = model.constants(steps)
        hamiltonians = stacked_hamiltonians(
            basis,
            model.h_ii_eV(steps),
            metric.overlap,
            constants["K"][:, 0],
            weighting=model.settings.weighting,
            scaled_overlap=self._scaled(two_centre, constants),
        )
        interactions = None
        if self._interaction is not None:
            interactions = constants["lambda"][:, None, None] * self._interaction
        start = self._report.populations.charges

        def settle(draws: BoolArray, smearing_eV: float) -> StackedStates:
            whole = bool(draws.all())
            return settled_charges(
                hamiltonians if whole else hamiltonians[draws],
                metric.chosen(draws),
                basis,
                self._electrons,
                None if interactions is None else interactions[draws],
                start,
                self._response,
                smearing_eV=smearing_eV,
            )

        states = settle(np.ones(len(steps), dtype=bool), state.smearing_eV)
        open_ = ~states.settled
        if open_.any() and not state.smearing_eV:
            again = settle(open_, SMEARING_EV)
            for name in ("energies_eV", "vectors", "occupations", "charges", "settled"):
                getattr(states, name)[open_] = getattr(again, name)
            states.iterations[open_] += again.iterations
        return states

    def _scaled(self, two_centre: FloatArray, constants: dict[str, FloatArray]) -> FloatArray | None:
        """Overlaps with every channel multiplied by its K, see `ChannelScale`; None where one K serves all."""
        if two_centre.shape[1] == 1:
            return None
        extra = np.einsum("dm,dmij->dij", constants["K"] - 1, two_centre)
        if self._excess_A is not None:
            extra *= np.exp(-constants["K_decay_per_A"][:, None, None] * self._excess_A)
        with_channels: FloatArray = two_centre.sum(axis=1) + extra
        return with_channels

    def _excess(self) -> FloatArray:
        """(n_ao, n_ao) distance of the atoms of two functions beyond the sum of their covalent radii [angstrom]."""
        fragment, basis = self._report.fragment, self._report.basis
        radii = np.array([basis_params.atom(symbol).covalent_radius_A for symbol in fragment.symbols])
        distances = np.linalg.norm(fragment.positions_A[:, None] - fragment.positions_A, axis=2)
        excess: FloatArray = (distances - radii[:, None] - radii)[np.ix_(basis.atom_of, basis.atom_of)]
        return excess

    def _analysed(self, states: StackedStates, metric: Metric) -> DrawNumbers:
        """Numbers of the draws whose charges have settled."""
        report, settled = self._report, states.settled
        metric = metric.chosen(settled)
        chosen = slice(None) if settled.all() else settled
        energies, vectors, occupations = (a[chosen] for a in (states.energies_eV, states.vectors, states.occupations))
        filling = occupations.sum(axis=1)
        holding = int(filling.any(axis=0).nonzero()[0][-1]) + 1
        lowdin, rows = vectors[:, :, :holding], self._bonded
        bonded = StackedFunctions(
            rows,
            metric.overlap[..., rows[:, None], rows],
            metric.inverse_half[..., rows, :] @ lowdin,
            metric.half[..., rows, :] @ lowdin,
            lowdin[:, rows],
        )
        orders = stacked_orders(
            report.coordination.bonds,
            report.fragment.positions_A,
            report.basis,
            bonded,
            occupations[:, :, :holding],
            report.orders,
        )
        pairs = zip(report.sites, report.coordination.frames, strict=True)
        found = [(site.ladder, frame) for site, frame in pairs if site.ladder is not None]
        ladders: tuple[FollowedLadder, ...] = ()
        if found:
            undrawn, frames = zip(*found, strict=True)
            ladders = follow_ladders(undrawn, frames, report.basis, self._undrawn, energies, vectors, filling)
        orbitals = follow_orbitals(self._undrawn[:, self._followed], vectors)
        followed = np.take_along_axis(energies, orbitals, axis=1)
        return DrawNumbers(energies, states.charges[settled], orders, ladders, followed)


def _scattered(lots: list[tuple[IntArray, Any]], n_draws: int) -> Any:
    """Records of several lots of draws as one record of all draws, field by field; NaN or False where none is."""
    first = lots[0][1]
    if isinstance(first, np.ndarray):
        blank: Any = False if first.dtype == bool else np.nan
        whole = np.full((n_draws, *first.shape[1:]), blank)
        for draws, values in lots:
            whole[draws] = values
        return whole
    if isinstance(first, tuple):
        return tuple(_scattered([(draws, part[k]) for draws, part in lots], n_draws) for k in range(len(first)))
    names = [field.name for field in fields(first)]
    return type(first)(*(_scattered([(draws, getattr(part, name)) for draws, part in lots], n_draws) for name in names))
