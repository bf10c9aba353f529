"""Free-ion constants of ligand-field theory: Racah and Slater parameters, spin-orbit coupling, pairing energy."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cache
from typing import Any, TypeVar

from basis_params.model import Provenance
from basis_params.rows import side_table


@dataclass(frozen=True, slots=True, kw_only=True)
class FreeIon:
    """A free ion and the source of the constants that a subclass adds.

    Attributes
    ----------
    symbol : str
    charge : int
    source_key, locator : str
    provenance : {"read", "memory", "derived"}
    """

    symbol: str
    charge: int
    source_key: str
    locator: str
    provenance: Provenance


@dataclass(frozen=True, slots=True, kw_only=True)
class RacahParameters(FreeIon):
    """Racah parameters `B_per_cm` and `C_per_cm` of a d shell [cm^-1]."""

    B_per_cm: float
    C_per_cm: float


@dataclass(frozen=True, slots=True, kw_only=True)
class SlaterIntegrals(FreeIon):
    """Slater integrals `F2_per_cm`, `F4_per_cm`, `F6_per_cm` of a 5f shell [cm^-1]."""

    F2_per_cm: float
    F4_per_cm: float
    F6_per_cm: float


@dataclass(frozen=True, slots=True, kw_only=True)
class SpinOrbitConstant(FreeIon):
    """One-electron spin-orbit constant `zeta_per_cm` of the d shell, 5f in actinides [cm^-1]."""

    zeta_per_cm: float


@dataclass(frozen=True, slots=True, kw_only=True)
class PairingEnergy(FreeIon):
    """Mean spin-pairing energy `pairing_energy_per_cm` of a d shell [cm^-1]."""

    pairing_energy_per_cm: float


Constants = TypeVar("Constants", bound=FreeIon)


def racah(symbol: str, charge: int) -> RacahParameters:
    """Return the Racah parameters of a free d1 to d9 ion.

    Raises
    ------
    KeyError
        If the table has no such ion.

    References
    ----------
    griffith-1961, jorgensen-1969
    """
    return _find(_racah(), "Racah parameters", symbol, charge)


def slater_integrals(symbol: str, charge: int) -> SlaterIntegrals:
    """Return the Slater integrals of a free actinide ion with two or more 5f electrons.

    Raises
    ------
    KeyError
        If the table has no such ion.

    References
    ----------
    van-deurzen-1984, average-atom
    """
    return _find(_slater(), "Slater integrals", symbol, charge)


def spin_orbit(symbol: str, charge: int) -> SpinOrbitConstant:
    """Return the one-electron spin-orbit constant of a free ion.

    Raises
    ------
    KeyError
        If the table has no such ion.

    References
    ----------
    nist-asd-levels, dunn-1961, goodman-1970, average-atom
    """
    return _find(_spin_orbit(), "spin-orbit constant", symbol, charge)


def pairing_energy(symbol: str, charge: int) -> PairingEnergy:
    """Return the mean spin-pairing energy of a free d2 to d8 ion.

    Raises
    ------
    KeyError
        If the table has no such ion.

    References
    ----------
    griffith-1961, jorgensen-1969
    """
    return _find(_pairing(), "pairing energy", symbol, charge)


def _find(ions: Mapping[tuple[str, int], Constants], what: str, symbol: str, charge: int) -> Constants:
    if (symbol, charge) not in ions:
        charges = ", ".join(f"{q}+" for q in sorted(q for s, q in ions if s == symbol)) or "none"
        raise KeyError(f"no {what} for {symbol!a} {charge}+: charges held for it are {charges}")
    return ions[symbol, charge]


@cache
def _racah() -> Mapping[tuple[str, int], RacahParameters]:
    return _by_ion(
        RacahParameters(**_ion(row), B_per_cm=float(row["B_per_cm"]), C_per_cm=float(row["C_per_cm"]))
        for row in side_table("racah")
    )


@cache
def _slater() -> Mapping[tuple[str, int], SlaterIntegrals]:
    return _by_ion(
        SlaterIntegrals(
            **_ion(row),
            F2_per_cm=float(row["F2_per_cm"]),
            F4_per_cm=float(row["F4_per_cm"]),
            F6_per_cm=float(row["F6_per_cm"]),
        )
        for row in side_table("slater")
    )


@cache
def _spin_orbit() -> Mapping[tuple[str, int], SpinOrbitConstant]:
    return _by_ion(
        SpinOrbitConstant(**_ion(row), zeta_per_cm=float(row["zeta_per_cm"])) for row in side_table("spin_orbit")
    )


@cache
def _pairing() -> Mapping[tuple[str, int], PairingEnergy]:
    return _by_ion(
        PairingEnergy(**_ion(row), pairing_energy_per_cm=float(row["pairing_energy_per_cm"]))
        for row in side_table("pairing")
    )


def _by_ion(rows: Iterable[Constants]) -> Mapping[tuple[str, int], Constants]:
    return {(row.symbol, row.charge): row for row in rows}


def _ion(row: Mapping[str, str]) -> dict[str, Any]:
    """Return the fields of `FreeIon` in one row."""
    text = {key: row[key] for key in ("symbol", "source_key", "locator", "provenance")}
    return {**text, "charge": int(row["charge"])}
