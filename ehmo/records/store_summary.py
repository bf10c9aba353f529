"""What a store holds, in numbers."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np

from ehmo.records.arrays import FloatArray


@dataclass(frozen=True, slots=True)
class Distribution:
    """Five numbers of a distribution; quartiles by linear interpolation between the sorted values.

    Attributes
    ----------
    count : int
        Number of values.
    lowest, lower_quartile, median, upper_quartile, highest : float
    """

    count: int
    lowest: float
    lower_quartile: float
    median: float
    upper_quartile: float
    highest: float


@dataclass(frozen=True, slots=True)
class Trend:
    """Mayer order against length: ``order * exp(log_slope_per_A * (length - length_A))``.

    Attributes
    ----------
    log_slope_per_A : float
        Of the order's logarithm [1/angstrom].
    length_A : float
        Median length [angstrom].
    order : float
        On the line at that length.
    """

    log_slope_per_A: float
    length_A: float
    order: float

    @property
    def b_A(self) -> float | None:
        """Length over which the order falls to 1/e [angstrom]; None if it does not fall."""
        return -1.0 / self.log_slope_per_A if self.log_slope_per_A < 0 else None

    def at(self, lengths_A: FloatArray) -> FloatArray:
        """Orders on the line at some lengths."""
        orders: FloatArray = self.order * np.exp(self.log_slope_per_A * (lengths_A - self.length_A))
        return orders


@dataclass(frozen=True, slots=True)
class KindSummary:
    """Bonds of one metal with one kind of donor.

    Attributes
    ----------
    metal : str
        Symbol of the metal.
    kind : str
        Kind of donor.
    bonds : int
        Number of bonds listed; of bonds that symmetry makes equal a crystal lists one.
    distributions : mapping of str to Distribution
        By column of the store; columns without any value are left out.
    trend : Trend or None
        Mayer order against length; None where too few bonds have both.
    """

    metal: str
    kind: str
    bonds: int
    distributions: Mapping[str, Distribution]
    trend: Trend | None


@dataclass(frozen=True, slots=True)
class Outlier:
    """A bond far from the others of its metal and kind.

    Attributes
    ----------
    key, source, entry : str
        Its structure.
    bond, metal, kind : str
        Its label, metal and kind of donor.
    length_A : float
        Its length [angstrom].
    mayer : float or None
        Its Mayer order.
    quantity : "mayer" or "length_A"
        Whether its Mayer order is far from the trend at its length, or its length far from the others.
    value : float
    expected : float
        Mayer order of the trend at its length, or the median length.
    distance : float
        Beyond the nearer quartile, in interquartile ranges.
    """

    key: str
    source: str
    entry: str
    bond: str
    metal: str
    kind: str
    length_A: float
    mayer: float | None
    quantity: Literal["mayer", "length_A"]
    value: float
    expected: float
    distance: float


@dataclass(frozen=True, slots=True)
class FailureReason:
    """Structures that failed for one reason.

    Attributes
    ----------
    reason : str
        In words, numbers replaced by ``#``.
    count : int
    source, entry, message : str
        The first of them.
    """

    reason: str
    count: int
    source: str
    entry: str
    message: str


@dataclass(frozen=True, slots=True)
class Calculation:
    """What made rows.

    Attributes
    ----------
    parameter_set, parameter_sha256, program_version : str
    results_edition : int
    rows : int
    """

    parameter_set: str
    parameter_sha256: str
    program_version: str
    results_edition: int
    rows: int


@dataclass(frozen=True, slots=True)
class StoreSummary:
    """What a store holds.

    Attributes
    ----------
    store : str
        Where it lies, without secrets.
    where : str or None
        Condition on what is counted.
    done, failed, doubted : int
        Structures calculated, failed, and calculated with something to doubt.
    first_started_utc, last_started_utc : str
        Start of the first and last calculation; empty without rows.
    duration_s : float
        Time of all calculations [s].
    calculations : tuple of Calculation
        Most rows first.
    reasons : tuple of FailureReason
        Most frequent first.
    other_failures : int
        Failures of reasons beyond those listed.
    kinds : tuple of KindSummary
        By metal and kind.
    outliers : tuple of Outlier
        Farthest first.
    outliers_found : int
        Their number, those not listed included.
    """

    store: str
    where: str | None
    done: int
    failed: int
    doubted: int
    first_started_utc: str
    last_started_utc: str
    duration_s: float
    calculations: tuple[Calculation, ...]
    reasons: tuple[FailureReason, ...]
    other_failures: int
    kinds: tuple[KindSummary, ...]
    outliers: tuple[Outlier, ...]
    outliers_found: int
