"""Free atoms, Z = 1 to 96: ionisation energies, electron affinities, covalent radii."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache

from basis_params.model import FrozenMapping, Provenance
from basis_params.rows import optional_number, side_table


@dataclass(frozen=True, slots=True)
class AtomData:
    """Measured properties of one free atom.

    Attributes
    ----------
    symbol : str
    number : int
        Atomic number.
    ionisation_energy_eV : float
        First ionisation energy I of the neutral atom [eV].
    electron_affinity_eV : float or None
        Electron affinity A; None where no bound anion was measured [eV].
    covalent_radius_A : float
        Covalent radius [A].
    source_key, locator : str
    provenance : {"read", "memory", "derived"}

    References
    ----------
    cordero-2008
    """

    symbol: str
    number: int
    ionisation_energy_eV: float
    electron_affinity_eV: float | None
    covalent_radius_A: float
    source_key: str
    locator: str
    provenance: Provenance

    @property
    def hardness_U_eV(self) -> float:
        """I - A, twice the hardness of Parr and Pearson; an unbound anion counts as A = 0 [eV]."""
        return self.ionisation_energy_eV - max(self.electron_affinity_eV or 0.0, 0.0)


@cache
def _atoms() -> Mapping[str, AtomData]:
    return FrozenMapping(
        {
            row["symbol"]: AtomData(
                symbol=row["symbol"],
                number=int(row["number"]),
                ionisation_energy_eV=float(row["ionisation_energy_eV"]),
                electron_affinity_eV=optional_number(row["electron_affinity_eV"]),
                covalent_radius_A=float(row["covalent_radius_A"]),
                source_key=row["source_key"],
                locator=row["locator"],
                provenance=row["provenance"],  # type: ignore[arg-type]
            )
            for row in side_table("atoms")
        }
    )


@cache
def _ionisation() -> Mapping[tuple[str, int], float]:
    return {
        (row["symbol"], charge): float(row[f"I{charge}_eV"])
        for row in side_table("ionisation")
        for charge in range(1, 9)
        if row[f"I{charge}_eV"]
    }


def atom_symbols() -> tuple[str, ...]:
    """Return the symbols H to Cm in the order of atomic numbers."""
    return tuple(_atoms())


def atom(symbol: str) -> AtomData:
    """Return the data of one atom.

    Raises
    ------
    KeyError
        If `symbol` is no element from H to Cm.
    """
    if symbol not in _atoms():
        raise KeyError(f"{symbol!a} is no element from H to Cm: correct the symbol")
    return _atoms()[symbol]


def ionisation_energy(symbol: str, charge: int) -> float:
    """Return the energy that takes an ion of charge `charge` - 1 to `charge` [eV].

    Raises
    ------
    KeyError
        If the table has no such value (charges 1 to 8).

    References
    ----------
    nist-asd
    """
    if (symbol, charge) not in _ionisation():
        raise KeyError(f"no ionisation energy to charge {charge} of {symbol!a}: the table has 1 to 8, H to Cm")
    return _ionisation()[symbol, charge]
