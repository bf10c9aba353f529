"""Ligand field fitted to observed bands, damped towards the computed one.

Every level of the field may move, and Racah's B with it where electrons repel; what the bands do not determine stays
where the calculation put it. Bands are assigned to the terms they name, the rest in the order of energy; terms are
followed by their labels when others cross them.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from ehmo.analysis.multiplets import multiplet_terms
from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray
from ehmo.records.bands import BandAssignment, BandFit, FittedParameter
from ehmo.records.multiplets import ElectronRepulsion, Term, Terms
from ehmo.records.symmetry import PointGroup
from ehmo.units import PER_CM_PER_EV

LEVEL_WIDTH_PER_CM = 10_000.0
"""Standard deviation that a level of the computed field is allowed [cm^-1]."""

REPULSION_WIDTH = 0.2
"""Standard deviation that B is allowed, as a part of its start."""

BAND_WIDTH_PER_CM = 200.0
"""Standard deviation of an observed band [cm^-1]."""

DETERMINED = 0.5
"""A parameter counts as determined if the bands narrow its width below this part of the allowed one."""

_STEPS = 12
_SAME_LEVEL_EV = 0.05  # levels that an idealised sphere would make degenerate move together
_DIFFERENCE = 1e-3  # of the allowed widths


@dataclass(frozen=True, slots=True, eq=False)
class FieldModel:
    """What a field needs to make terms.

    Attributes
    ----------
    field_eV : (n, n) ndarray
        Computed field in the local axes [eV].
    n_electrons : int
    repulsion : ElectronRepulsion or None
    B_per_cm : float
        Racah B of `repulsion`, or 0 [cm^-1].
    group : PointGroup or None
    axes : (3, 3) ndarray
        Rows are the group's axes in the local ones.
    multiplicity : int
        2S + 1 of the ground term.
    """

    field_eV: FloatArray
    n_electrons: int
    repulsion: ElectronRepulsion | None
    B_per_cm: float
    group: PointGroup | None
    axes: FloatArray
    multiplicity: int

    def terms(self, shifts_per_cm: FloatArray, projectors: FloatArray, scale: float) -> Terms:
        """Terms with every level shifted and the repulsion scaled."""
        field = self.field_eV + np.tensordot(shifts_per_cm, projectors, axes=1) / PER_CM_PER_EV
        repulsion = None if self.repulsion is None else self.repulsion.scaled(scale)
        return multiplet_terms(field, self.n_electrons, repulsion, self.group, self.axes)


def fit_bands(model: FieldModel, observed_per_cm: Sequence[float], labels: Sequence[str] = ()) -> BandFit:
    """Assign observed bands and fit the field to them.

    Parameters
    ----------
    model : FieldModel
        Computed field.
    observed_per_cm : sequence of float
        Band maxima [cm^-1].
    labels : sequence of str
        Upper term of each band; bands with an empty one take the remaining terms in the order of energy.

    Returns
    -------
    fit : BandFit

    Raises
    ------
    InputError
        If there are more bands than spin-allowed terms, a wavenumber is not positive, or there is no such term.
    """
    observed = np.asarray(observed_per_cm, dtype=np.float64)
    order = np.argsort(observed, kind="stable")
    wanted = [labels[k] if labels else "" for k in order]
    observed = observed[order]
    if not len(observed) or not np.isfinite(observed).all() or observed[0] <= 0:
        raise InputError("observed bands must be positive wavenumbers", mend="give them in cm-1, such as 13000,16000")
    # Only differences of levels show, so the lowest one stays.
    lowest, *moving = _level_projectors(model.field_eV)
    projectors = np.array(moving).reshape(-1, *lowest.shape)
    n_levels = len(projectors)
    with_repulsion = model.repulsion is not None and model.B_per_cm > 0
    n_parameters = n_levels + int(with_repulsion)

    def terms_at(parameters: FloatArray) -> Terms:
        scale = 1 + REPULSION_WIDTH * parameters[n_levels] if with_repulsion else 1.0
        return model.terms(LEVEL_WIDTH_PER_CM * parameters[:n_levels], projectors, float(scale))

    start = terms_at(np.zeros(n_parameters))
    upper = _spin_allowed(start, model.multiplicity)
    places = _assigned([term.label for term, _ in upper], wanted)

    def bands_at(parameters: FloatArray) -> FloatArray:
        found = _spin_allowed(terms_at(parameters), model.multiplicity)
        names = _numbered([term.label for term, _ in found])
        energies = dict(zip(names, (energy for _, energy in found), strict=True))
        return np.array([energies.get(name, np.nan) for name in followed])

    followed = [_numbered([term.label for term, _ in upper])[place] for place in places]

    parameters, covariance, fitted = _damped_fit(bands_at, observed, n_parameters)
    names = [level.label for level in start.levels][1:]
    if len(names) != n_levels:
        names = [f"level {place + 2}" for place in range(n_levels)]
    names += ["B"] if with_repulsion else []
    return BandFit(
        assignments=tuple(
            BandAssignment(float(seen), upper[place][1], float(after), upper[place][0].label)
            for seen, place, after in zip(observed, places, fitted, strict=True)
        ),
        parameters=_fitted(names, model, (lowest, *projectors), parameters, covariance),
        undetermined=_undetermined(names, covariance),
        field_eV=model.field_eV
        + np.tensordot(LEVEL_WIDTH_PER_CM * parameters[:n_levels], projectors, axes=1) / PER_CM_PER_EV,
        repulsion_scale=1 + REPULSION_WIDTH * float(parameters[n_levels]) if with_repulsion else 1.0,
    )


def _assigned(terms: Sequence[str], wanted: Sequence[str]) -> list[int]:
    """Place of the term of each band: labelled ones first, the others in the order of energy."""
    free = list(range(len(terms)))
    places: list[int | None] = [None] * len(wanted)
    for band, label in enumerate(wanted):
        if label:
            place = next((k for k in free if terms[k] == label), None)
            if place is None:
                raise InputError(
                    f"there is no spin-allowed term {label} for a band",
                    mend=f"choose from {', '.join(terms) or 'none'}",
                )
            places[band] = place
            free.remove(place)
    open_ = [band for band, place in enumerate(places) if place is None]
    if len(open_) > len(free):
        raise InputError(
            f"{len(wanted)} observed bands, but only {len(terms)} spin-allowed ones within the shell",
            mend="leave out charge-transfer and spin-forbidden bands",
        )
    for band, place in zip(open_, free, strict=False):
        places[band] = place
    return [place for place in places if place is not None]


def _numbered(labels: Sequence[str]) -> list[str]:
    """Labels told apart by their number among equals, so that terms are followed when others cross them."""
    return [f"{label} {list(labels[:place]).count(label)}" for place, label in enumerate(labels)]


def _level_projectors(field_eV: FloatArray) -> FloatArray:
    """(n_levels, n, n) projectors on the levels of a field, nearly degenerate ones together."""
    energies, vectors = np.linalg.eigh(field_eV)
    starts = np.flatnonzero(np.diff(energies, prepend=-np.inf) > _SAME_LEVEL_EV).tolist()
    blocks = [vectors[:, a:b] for a, b in zip(starts, [*starts[1:], len(energies)], strict=True)]
    return np.array([block @ block.T for block in blocks])


def _spin_allowed(terms: Terms, multiplicity: int) -> list[tuple[Term, float]]:
    """Terms of one spin above the lowest of them, with their energies above it."""
    lowest, *upper = [term for term in terms.terms if term.multiplicity == multiplicity]
    return [(term, term.energy_per_cm - lowest.energy_per_cm) for term in upper]


def _damped_fit(
    bands_at: Callable[[FloatArray], FloatArray], observed: FloatArray, n_parameters: int
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Gauss-Newton on bands and on the parameters themselves, both in units of their widths.

    Returns the parameters, their covariance and the fitted bands.
    """
    parameters: FloatArray = np.zeros(n_parameters)
    information: FloatArray = np.eye(n_parameters)
    for _ in range(_STEPS):
        base = bands_at(parameters)
        slopes = np.array(
            [(bands_at(parameters + _DIFFERENCE * unit) - base) / _DIFFERENCE for unit in np.eye(n_parameters)]
        ).T
        weighted = slopes / BAND_WIDTH_PER_CM
        information = weighted.T @ weighted + np.eye(n_parameters)
        gradient = weighted.T @ ((observed - base) / BAND_WIDTH_PER_CM) - parameters
        step = np.linalg.solve(information, gradient)
        parameters = np.asarray(parameters + step, dtype=np.float64)
        if np.abs(step).max() < 1e-6:
            break
    covariance = np.asarray(np.linalg.inv(information), dtype=np.float64)
    return parameters, covariance, bands_at(parameters)


def _fitted(
    names: Sequence[str],
    model: FieldModel,
    projectors: Sequence[FloatArray],
    parameters: FloatArray,
    covariance: FloatArray,
) -> tuple[FittedParameter, ...]:
    """Parameters in their own units; levels count from the lowest of the computed field."""
    levels = np.array([np.tensordot(model.field_eV, p) / np.trace(p) for p in projectors]) * PER_CM_PER_EV
    levels = levels[1:] - levels[0]
    starts, scales = list(levels), [LEVEL_WIDTH_PER_CM] * len(levels)
    if len(names) > len(levels):
        starts.append(model.B_per_cm)
        scales.append(REPULSION_WIDTH * model.B_per_cm)
    widths = np.sqrt(np.diag(covariance))
    return tuple(
        FittedParameter(
            name, float(start), float(start + scale * value), float(scale * width), bool(width < DETERMINED)
        )
        for name, start, scale, value, width in zip(names, starts, scales, parameters, widths, strict=True)
    )


def _undetermined(names: Sequence[str], covariance: FloatArray) -> tuple[str, ...]:
    """Directions whose width the bands have not narrowed, as combinations of parameters in allowed widths."""
    variances, directions = np.linalg.eigh(covariance)
    said = []
    for variance, direction in zip(variances, directions.T, strict=True):
        if variance < DETERMINED**2:
            continue
        scaled = direction / direction[np.abs(direction).argmax()]
        parts = [(name, value) for name, value in zip(names, scaled, strict=True) if abs(value) > 0.05]
        terms = " ".join(f"{value:+.2f} {name}" for name, value in parts)
        said.append(parts[0][0] if len(parts) == 1 else terms.removeprefix("+"))
    return tuple(said)
