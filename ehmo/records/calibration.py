"""A calibration: what is fitted to what, and what came of it."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal, get_args

from ehmo.records.arrays import FloatArray, frozen_floats

ParameterKind = Literal["h_ii", "zeta", "constant"]

Quantity = Literal[
    "Mayer order", "charge", "d-d band", "10Dq", "charge-transfer band", "length", "stretching wavenumber"
]
QUANTITIES: tuple[Quantity, ...] = get_args(Quantity)

MECHANICAL: tuple[Quantity, ...] = ("length", "stretching wavenumber")
"""Quantities that need an energy; two-body terms are fitted to them once everything else is settled."""

UNITS: dict[Quantity, str] = {
    "Mayer order": "",
    "charge": "e",
    "d-d band": "cm-1",
    "10Dq": "cm-1",
    "charge-transfer band": "cm-1",
    "length": "A",
    "stretching wavenumber": "cm-1",
}


@dataclass(frozen=True, slots=True)
class FreeParameter:
    """One number that is fitted.

    Attributes
    ----------
    kind : {"h_ii", "zeta", "constant"}
        Diagonal element, exponents, or constant of the Hamiltonian.
    key : str
        Name of the constant as in a table, such as ``K_pi``; empty for the other kinds.
    shells : tuple of (str, int, int)
        Element, n and l of the shells that it moves alike; empty for a constant.
    start : float
        Value at the start and centre of the prior: of a constant itself, a change of h_ii [eV], or the natural
        logarithm of the factor of the exponents.
    sd : float
        Standard deviation of the prior.
    lowest, highest : float
        Bounds.
    """

    kind: ParameterKind
    key: str
    shells: tuple[tuple[str, int, int], ...]
    start: float
    sd: float
    lowest: float
    highest: float

    @property
    def name(self) -> str:
        """What people call it, such as ``V 3d h_ii``."""
        if self.kind == "constant":
            return self.key
        return f"{', '.join(f'{symbol} {n}' + 'spdf'[l] for symbol, n, l in self.shells)} {self.kind}"

    @property
    def elements(self) -> frozenset[str]:
        """Elements that it touches; empty means all."""
        return frozenset(symbol for symbol, _, _ in self.shells)

    @property
    def unit(self) -> str:
        """Unit of the value."""
        if self.kind == "h_ii":
            return "eV"
        return "1/A" if self.key == "K_decay_per_A" else ""


@dataclass(frozen=True, slots=True)
class FreePair:
    """Two-body term of a pair of elements that is fitted, A exp(-B R).

    Attributes
    ----------
    first, second : str
        Elements; the metal first.
    decay_per_A : float
        B at the start and centre of its prior [1/angstrom].
    decay_sd : float
        Standard deviation of the prior; 0 holds B [1/angstrom].
    """

    first: str
    second: str
    decay_per_A: float
    decay_sd: float

    @property
    def label(self) -> str:
        """Such as ``V-O``."""
        return f"{self.first}-{self.second}"


@dataclass(frozen=True, slots=True)
class Observable:
    """One number that the set is fitted to.

    Attributes
    ----------
    species : str
        What is left out as a whole to see how well it is predicted.
    structure : str
        Title of the frame that holds its geometry.
    quantity : str
    of : str
        Bond, atom, term, transition or kind of donor.
    value : float
    sd : float
        What counts as one standard deviation.
    source : str
    provenance : {"read", "memory", "derived"}
    line : int
        In the table.
    """

    species: str
    structure: str
    quantity: Quantity
    of: str
    value: float
    sd: float
    source: str
    provenance: str
    line: int

    @property
    def name(self) -> str:
        """What people call it."""
        return " ".join(part for part in (self.quantity, self.of, "of", self.structure) if part)


@dataclass(frozen=True, slots=True)
class CalibrationSpec:
    """What is fitted to what.

    Attributes
    ----------
    name, edition : str
        Of the set that is written.
    base : str
        Set that it starts from, by name or path.
    notes : tuple of str
        Remarks for the head of the table.
    elements : tuple of str
        Elements of the set; all of the base where empty.
    source_key : str
        Where fitted numbers say that they come from.
    parameters : tuple of FreeParameter
    pairs : tuple of FreePair
    observables : tuple of Observable
    structure_files : tuple of str
        Paths of XYZ files.
    oxidation_states : dict of str to int
        By structure, where counting leaves it open.
    margin_A : float
        Added at both ends to the lengths of a pair, for the range in which its term counts as calibrated [angstrom].
    unsettled : float
        What an observable that the current parameters do not give counts as [standard deviations].
    place : str
        Path of the file.
    sha256 : str
        Hash of everything that the fit depends on.
    """

    name: str
    edition: str
    base: str
    notes: tuple[str, ...]
    elements: tuple[str, ...]
    source_key: str
    parameters: tuple[FreeParameter, ...]
    pairs: tuple[FreePair, ...]
    observables: tuple[Observable, ...]
    structure_files: tuple[str, ...]
    oxidation_states: dict[str, int]
    margin_A: float
    unsettled: float
    place: str
    sha256: str


@dataclass(frozen=True, slots=True, eq=False)
class ElectronicFit:
    """Least-squares solution for everything but two-body terms.

    Attributes
    ----------
    values : (n_parameters,) ndarray
        In the order of the specification.
    covariance : (n_parameters, n_parameters) ndarray
        Scaled by the misfit where that is above 1.
    cost : float
        Half the robust sum of squares, priors included.
    evaluations : int
        Calculations of the whole training set.
    """

    values: FloatArray
    covariance: FloatArray
    cost: float
    evaluations: int

    def __post_init__(self) -> None:
        n = len(self.values)
        object.__setattr__(self, "values", frozen_floats(self.values, (n,), "values"))
        object.__setattr__(self, "covariance", frozen_floats(self.covariance, (n, n), "covariance"))


@dataclass(frozen=True, slots=True)
class Fitted:
    """One observable beside what the sets give; None where a set gives nothing.

    Attributes
    ----------
    observable : Observable
    base, trained, left_out : float or None
        Of the set that the fit started from, of the fitted set, and of a set fitted without that species.
    """

    observable: Observable
    base: float | None
    trained: float | None
    left_out: float | None


@dataclass(frozen=True, slots=True)
class QuantityErrors:
    """Mean absolute differences over one quantity; None where nothing is to be compared."""

    quantity: Quantity
    count: int
    species: int
    base: float | None
    trained: float | None
    left_out: float | None


@dataclass(frozen=True, slots=True, eq=False)
class Calibration:
    """What came of a calibration.

    Attributes
    ----------
    spec : CalibrationSpec
    fit : ElectronicFit
    fitted : tuple of Fitted
        Every observable, in the order of the table.
    table_text : str
        The fitted set as a parameter table.
    warnings : tuple of str
    """

    spec: CalibrationSpec
    fit: ElectronicFit
    fitted: tuple[Fitted, ...]
    table_text: str
    warnings: tuple[str, ...] = field(default=())

    def errors(self) -> tuple[QuantityErrors, ...]:
        """Mean absolute differences by quantity."""
        found = []
        for quantity in QUANTITIES:
            rows = [row for row in self.fitted if row.observable.quantity == quantity]
            if rows:
                found.append(
                    QuantityErrors(
                        quantity,
                        len(rows),
                        len({row.observable.species for row in rows}),
                        *(_mean_difference(rows, name) for name in ("base", "trained", "left_out")),
                    )
                )
        return tuple(found)


def _mean_difference(rows: list[Fitted], name: str) -> float | None:
    differences = [abs(getattr(row, name) - row.observable.value) for row in rows if getattr(row, name) is not None]
    return sum(differences) / len(differences) if differences else None
