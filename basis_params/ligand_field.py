"""Free-ion constants of ligand-field theory: Racah B and C, spin-orbit coupling, spin-pairing energy."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache

from basis_params.model import Provenance
from basis_params.rows import side_table

IonKey = tuple[str, int]


@dataclass(frozen=True, slots=True)
class IonConstants:
    """Constants of one kind for one free ion, with their source.

    Attributes
    ----------
    symbol : str
    charge : int
    values_per_cm : tuple of float
        (B, C), (zeta,) or (mean pairing energy,) [cm^-1].
    source_key, locator : str
    provenance : {"read", "memory", "derived"}
    """

    symbol: str
    charge: int
    values_per_cm: tuple[float, ...]
    source_key: str
    locator: str
    provenance: Provenance


@cache
def _ions(table: str, *columns: str) -> Mapping[IonKey, IonConstants]:
    return {
        (row["symbol"], int(row["charge"])): IonConstants(
            symbol=row["symbol"],
            charge=int(row["charge"]),
            values_per_cm=tuple(float(row[column]) for column in columns),
            source_key=row["source_key"],
            locator=row["locator"],
            provenance=row["provenance"],  # type: ignore[arg-type]
        )
        for row in side_table(table)
    }


def _find(ions: Mapping[IonKey, IonConstants], what: str, symbol: str, charge: int) -> IonConstants:
    if (symbol, charge) not in ions:
        charges = ", ".join(f"{q}+" for s, q in ions if s == symbol) or "none"
        raise KeyError(f"no {what} for {symbol!a} {charge}+: charges held for it are {charges}")
    return ions[symbol, charge]


def racah(symbol: str, charge: int) -> IonConstants:
    """Return the Racah parameters (B, C) of a free d ion [cm^-1].

    Raises
    ------
    KeyError
        If the table has no such ion.

    References
    ----------
    griffith-1961, jorgensen-1969
    """
    return _find(_ions("racah", "B_per_cm", "C_per_cm"), "Racah parameters", symbol, charge)


def spin_orbit(symbol: str, charge: int) -> IonConstants:
    """Return the one-electron spin-orbit constant (zeta,) of the d (or 5f) shell of a free ion [cm^-1].

    Raises
    ------
    KeyError
        If the table has no such ion.

    References
    ----------
    dunn-1961
    """
    return _find(_ions("spin_orbit", "zeta_per_cm"), "spin-orbit constant", symbol, charge)


def pairing_energy(symbol: str, charge: int) -> IonConstants:
    """Return the mean spin-pairing energy (P,) of a free d^2 to d^8 ion [cm^-1].

    Raises
    ------
    KeyError
        If the table has no such ion.

    References
    ----------
    griffith-1961, jorgensen-1969
    """
    return _find(_ions("pairing", "pairing_energy_per_cm"), "pairing energy", symbol, charge)
