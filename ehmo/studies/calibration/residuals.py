"""Residuals of a training set and their derivatives."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np

from basis_params import ParameterTable
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.calibration import FreeParameter, Observable
from ehmo.studies.calibration.tables import fitted_table
from ehmo.studies.calibration.training import TrainingStructure

STEPS = {"h_ii": 0.02, "zeta": 0.003, "constant": 0.005}
"""Step of a derivative by each kind of parameter."""

JUMP = 0.3
"""Change by one step beyond which the step to the other side is looked at too [standard deviations]."""

Progress = Callable[[str], None]


@dataclass(eq=False)
class Residuals:
    """Differences of a training set in standard deviations, priors last.

    Attributes
    ----------
    base : ParameterTable
    parameters : tuple of FreeParameter
    structures : dict of str to TrainingStructure
    observables : tuple of Observable
        None of those that need an energy.
    unsettled : float
        Residual of what the parameters do not give.
    evaluations : int
        Calculations of the whole set so far.
    """

    base: ParameterTable
    parameters: tuple[FreeParameter, ...]
    structures: dict[str, TrainingStructure]
    observables: tuple[Observable, ...]
    unsettled: float
    evaluations: int = 0
    _places: dict[str, IntArray] = field(default_factory=dict)
    _last: tuple[bytes, FloatArray] | None = None

    def __post_init__(self) -> None:
        names = np.array([observable.structure for observable in self.observables])
        self._places = {name: np.flatnonzero(names == name) for name in dict.fromkeys(names.tolist())}
        self._targets = np.array([observable.value for observable in self.observables])
        self._sds = np.array([observable.sd for observable in self.observables])
        self._starts = np.array([parameter.start for parameter in self.parameters])
        self._prior_sds = np.array([parameter.sd for parameter in self.parameters])

    def table(self, values: FloatArray) -> ParameterTable:
        """Set with the parameters at these values."""
        return fitted_table(self.base, self.parameters, values)

    def values(self, x: FloatArray) -> FloatArray:
        """(n_observables,) what the set gives; NaN for what it does not give."""
        key = x.tobytes()
        if self._last is not None and self._last[0] == key:
            return self._last[1]
        self.evaluations += 1
        table = self.table(x)
        found = np.empty(len(self.observables))
        for name, places in self._places.items():
            found[places] = self.structures[name].values(table, self._of(places))
        self._last = key, found
        return found

    def all(self, x: FloatArray) -> FloatArray:
        """(n_observables + n_parameters,) residuals [standard deviations]."""
        differences = (self.values(x) - self._targets) / self._sds
        return np.concatenate([np.nan_to_num(differences, nan=self.unsettled), (x - self._starts) / self._prior_sds])

    def jacobian(self, x: FloatArray, say: Progress | None = None) -> FloatArray:
        """(n_observables + n_parameters, n_parameters) derivatives of the residuals, by differences.

        Only the structures that hold an element of a parameter are calculated again for it. What a step loses or
        gains counts as steady.
        """
        here, n = self.values(x), len(self.observables)
        found = np.zeros((n + len(x), len(x)))
        for column, parameter in enumerate(self.parameters):
            if say is not None:
                say(f"derivatives {column + 1} of {len(x)}")
            step = STEPS[parameter.kind]
            # Away from the upper bound, where there is no room above.
            step = -step if x[column] + step > parameter.highest else step
            moved = x.copy()
            moved[column] += step
            table = self.table(moved)
            for name, places in self._places.items():
                structure = self.structures[name]
                if parameter.elements and not parameter.elements & structure.elements:
                    continue
                change = (structure.values(table, self._of(places)) - here[places]) / self._sds[places]
                if np.abs(np.nan_to_num(change)).max() > JUMP:
                    # Another band or filling: the other side may have none.
                    back = x.copy()
                    back[column] -= step
                    other = here[places] - structure.values(self.table(back), self._of(places))
                    other = np.nan_to_num(other / self._sds[places], nan=np.inf)
                    change = np.where(np.abs(other) < np.abs(np.nan_to_num(change)), other, change)
                found[places, column] = np.nan_to_num(change / step, nan=0.0)
            found[n + column, column] = 1 / self._prior_sds[column]
        return found

    def near(
        self, x: FloatArray, origin: FloatArray, there: FloatArray, slopes: FloatArray, species: str
    ) -> FloatArray:
        """Residuals near a solution, for a fit without one species.

        Parameters
        ----------
        x : (n_parameters,) ndarray
        origin : (n_parameters,) ndarray
            The solution.
        there, slopes : (n,) and (n, n_parameters) ndarray
            Residuals and derivatives at the solution.
        species : str

        Returns
        -------
        residuals : (n,) ndarray
            Calculated for the structures that share a metal with the species, whose parameters move most; by the
            derivatives for all others.
        """
        found = there + slopes @ (x - origin)
        own = {o.structure for o in self.observables if o.species == species}
        metals = frozenset().union(*(self.structures[name].metals for name in own))
        table = self.table(x)
        for name, places in self._places.items():
            if name not in own and self.structures[name].metals & metals:
                values = self.structures[name].values(table, self._of(places))
                differences = (values - self._targets[places]) / self._sds[places]
                found[places] = np.nan_to_num(differences, nan=self.unsettled)
        return found

    def _of(self, places: IntArray) -> Sequence[Observable]:
        return [self.observables[place] for place in places.tolist()]
