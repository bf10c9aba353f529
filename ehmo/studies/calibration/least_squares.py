"""Robust least squares of the electronic parameters, their covariance, and fits without one species."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ehmo.errors import ConvergenceError
from ehmo.records.arrays import FloatArray
from ehmo.records.calibration import ElectronicFit
from ehmo.studies.calibration.residuals import Residuals

MOST_EVALUATIONS = 60
SETTLED = 1e-3
"""Relative change of the cost at which the fit counts as done."""

_LEFT_OUT_STEPS = 8
_LEFT_OUT_SETTLED = 0.02  # largest last step of a parameter, in standard deviations of its prior
_HALVINGS = 4

Progress = Callable[[str], None]
Keep = Callable[[FloatArray], None]


def fit_parameters(
    residuals: Residuals, start: FloatArray, *, say: Progress, keep: Keep | None = None
) -> tuple[ElectronicFit, FloatArray]:
    """Least squares with the robust loss 2 (sqrt(1 + r^2) - 1), priors and bounds.

    Parameters
    ----------
    residuals : Residuals
    start : (n_parameters,) ndarray
    say : callable
        Called with one line on each step.
    keep : callable, optional
        Called with the parameters at each step, so that a run that was stopped can go on.

    Returns
    -------
    fit : ElectronicFit
    jacobian : (n_residuals, n_parameters) ndarray
        Derivatives at the solution.

    Raises
    ------
    ConvergenceError
        If the set cannot be calculated at the start.
    """
    from scipy.optimize import least_squares

    def jacobian(x: FloatArray) -> FloatArray:
        if keep is not None:
            keep(x)
        cost = robust_cost(residuals.all(x))
        say(f"cost {cost:.2f} after {residuals.evaluations} calculations of the set")
        return residuals.jacobian(x, lambda words: say(f"cost {cost:.2f}, {words}"))

    parameters = residuals.parameters
    if np.isnan(residuals.values(start)).all():
        raise ConvergenceError("the set gives nothing at the start of the fit", mend="move the starting values")
    solution = least_squares(
        residuals.all,
        start,
        jac=jacobian,
        bounds=([p.lowest for p in parameters], [p.highest for p in parameters]),
        x_scale=np.array([p.sd for p in parameters]),
        loss="soft_l1",
        ftol=SETTLED,
        xtol=SETTLED,
        gtol=1e-8,
        max_nfev=MOST_EVALUATIONS,
    )
    slopes = residuals.jacobian(solution.x)
    return (
        ElectronicFit(
            solution.x, covariance(residuals.all(solution.x), slopes), float(solution.cost), residuals.evaluations
        ),
        slopes,
    )


def robust_cost(residuals: FloatArray) -> float:
    """Half the sum of 2 (sqrt(1 + r^2) - 1)."""
    return float((np.sqrt(1 + residuals**2) - 1).sum())


def covariance(residuals: FloatArray, jacobian: FloatArray) -> FloatArray:
    """Covariance of the parameters at a solution.

    Parameters
    ----------
    residuals : (n,) ndarray
        Observables, then priors [standard deviations].
    jacobian : (n, n_parameters) ndarray

    Returns
    -------
    covariance : (n_parameters, n_parameters) ndarray
        Inverse of J^T W J with the weights of the robust loss, times the mean weighted square of the observables
        where that is above 1: a misfit larger than the stated standard deviations widens those of the parameters.
    """
    n = jacobian.shape[1]
    weights = 1 / np.sqrt(1 + residuals**2)
    inverse = np.linalg.inv((jacobian * weights[:, None]).T @ jacobian)
    observed, seen = residuals[:-n], weights[:-n]
    misfit = float((seen * observed**2).sum() / max(len(observed), 1))
    return np.asarray(inverse * max(1.0, misfit), dtype=np.float64)


def without_species(
    residuals: Residuals, fit: ElectronicFit, jacobian: FloatArray, species: str
) -> tuple[FloatArray, bool]:
    """Parameters fitted without the observables of one species, from the solution for all.

    Gauss-Newton steps with the derivatives of that solution, halved where they raise the cost; see `Residuals.near`
    for what is calculated at each step.

    Parameters
    ----------
    residuals : Residuals
        Of the whole set.
    fit : ElectronicFit
        Its solution.
    jacobian : (n_residuals, n_parameters) ndarray
        Derivatives there.
    species : str

    Returns
    -------
    values : (n_parameters,) ndarray
    settled : bool
        Whether the last step was small.
    """
    kept = np.array([o.species != species for o in residuals.observables] + [True] * len(fit.values))
    bounds = np.array([[p.lowest, p.highest] for p in residuals.parameters]).T
    scale = np.array([p.sd for p in residuals.parameters])
    x, slopes = fit.values.copy(), jacobian[kept]
    origin = residuals.all(x)
    current = origin[kept]
    cost = robust_cost(current)
    for _ in range(_LEFT_OUT_STEPS):
        weighted = slopes / np.sqrt(1 + current**2)[:, None]
        step = -np.linalg.solve(weighted.T @ slopes, weighted.T @ current)
        for _ in range(_HALVINGS):
            trial = np.clip(x + step, *bounds)
            there = residuals.near(trial, fit.values, origin, jacobian, species)[kept]
            new = robust_cost(there)
            if new <= cost:
                break
            step = step / 2
        else:
            return x, True  # no direction of these derivatives goes down any more
        moved = float(np.max(np.abs(trial - x) / scale))
        x, current, cost = trial, there, new
        if moved < _LEFT_OUT_SETTLED:
            return x, True
    return x, False
