"""Valence orbitals of free atoms from first principles: the route against which tables are audited."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache

from basis_params.model import Provenance
from basis_params.rows import side_table


@dataclass(frozen=True, slots=True)
class AtomicOrbitalData:
    """One valence shell of the average of a configuration, scalar-relativistic Hartree-Fock.

    Attributes
    ----------
    symbol : str
    n, l : int
    ground_electrons : int
        Electrons of the shell in the ground configuration; 0 if it is filled by promotion only.
    configuration : str
        Valence configuration computed, such as ``4s1 4p1 3d3``.
    energy_eV : float
        Orbital energy [eV].
    r_mean_bohr : float
        <r> [bohr].
    r2_mean_bohr2 : float
        <r^2> [bohr^2].
    zetas : tuple of float
        Exponents of the fitted Slater functions: one that keeps <r> for s and p, two for d and f [bohr^-1].
    coefficients : tuple of float
    source_key, locator : str
    provenance : {"read", "memory", "derived"}
    """

    symbol: str
    n: int
    l: int
    ground_electrons: int
    configuration: str
    energy_eV: float
    r_mean_bohr: float
    r2_mean_bohr2: float
    zetas: tuple[float, ...]
    coefficients: tuple[float, ...]
    source_key: str
    locator: str
    provenance: Provenance


@cache
def _orbitals() -> Mapping[tuple[str, int, int], AtomicOrbitalData]:
    rows = (_orbital(row) for row in side_table("atomic_orbitals"))
    return {(row.symbol, row.n, row.l): row for row in rows}


def _orbital(row: Mapping[str, str]) -> AtomicOrbitalData:
    return AtomicOrbitalData(
        symbol=row["symbol"],
        n=int(row["n"]),
        l="spdf".index(row["l"]),
        ground_electrons=int(row["ground_electrons"]),
        configuration=row["configuration"],
        energy_eV=float(row["energy_eV"]),
        r_mean_bohr=float(row["r_mean_bohr"]),
        r2_mean_bohr2=float(row["r2_mean_bohr2"]),
        zetas=tuple(float(row[key]) for key in ("zeta1", "zeta2") if row[key]),
        coefficients=tuple(float(row[key]) for key in ("c1", "c2") if row[key]),
        source_key=row["source_key"],
        locator=row["locator"],
        provenance=row["provenance"],  # type: ignore[arg-type]
    )


def atomic_orbital(symbol: str, n: int, l: int) -> AtomicOrbitalData:
    """Return the computed orbital of one valence shell.

    Raises
    ------
    KeyError
        If the shell was not computed.

    References
    ----------
    average-atom
    """
    if (symbol, n, l) not in _orbitals():
        raise KeyError(f"no computed orbital n = {n}, l = {l} of {symbol!a}: the table has the shells of `standard`")
    return _orbitals()[symbol, n, l]
