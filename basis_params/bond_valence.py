"""Bond-valence parameters R0 and B by cation, anion and oxidation state."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from functools import cache

from basis_params.model import Provenance
from basis_params.rows import side_table

ANY_STATE = 9
ESTIMATED_B_A = 0.37


@dataclass(frozen=True, slots=True)
class BondValence:
    """Parameters of s = exp((R0 - R)/B) for one kind of bond.

    Attributes
    ----------
    cation, anion : str
    oxidation_state : int or None
        State the row was fitted to; 9 means any, None an estimate from atom parameters.
    R0_A, B_A : float
        [A]
    source_key, locator : str
    provenance : {"read", "memory", "derived"}
    exact : bool
        Whether the row is of the oxidation state asked for.
    """

    cation: str
    anion: str
    oxidation_state: int | None
    R0_A: float
    B_A: float
    source_key: str
    locator: str
    provenance: Provenance
    exact: bool

    def valence(self, length_A: float) -> float:
        """Return the bond valence of a bond of length `length_A` [A]."""
        return math.exp((self.R0_A - length_A) / self.B_A)


def bond_valence_R0(cation: str, anion: str, oxidation_state: int | None = None) -> BondValence:
    """Return the bond-valence parameters of a cation-anion pair.

    Falls back from the oxidation state asked for to a row for any state, then to the nearest state (the
    highest if none is asked for), then to an estimate from atom parameters; `exact` says whether it had to.

    Parameters
    ----------
    cation, anion : str
    oxidation_state : int, optional

    Returns
    -------
    parameters : BondValence

    Raises
    ------
    KeyError
        If neither a row nor atom parameters exist for the pair.

    References
    ----------
    brown-1985, brese-1991, okeeffe-1991
    """
    states = _table().get((cation, anion), {})
    if not states:
        return _estimate(cation, anion)
    wanted = max(states) if oxidation_state is None else oxidation_state
    if oxidation_state not in states and ANY_STATE in states:
        wanted = ANY_STATE
    state = min(states, key=lambda held: (abs(held - wanted), -held))
    row = states[state]
    return BondValence(
        cation=cation,
        anion=anion,
        oxidation_state=state,
        R0_A=float(row["R0_A"]),
        B_A=float(row["B_A"]),
        source_key=row["source_key"],
        locator=row["locator"],
        provenance=row["provenance"],  # type: ignore[arg-type]
        exact=state == oxidation_state,
    )


@cache
def _table() -> Mapping[tuple[str, str], Mapping[int, dict[str, str]]]:
    table: dict[tuple[str, str], dict[int, dict[str, str]]] = {}
    for row in side_table("bond_valence"):
        table.setdefault((row["cation"], row["anion"]), {})[int(row["oxidation_state"])] = row
    return table


@cache
def _atom_parameters() -> Mapping[str, tuple[float, float]]:
    return {row["symbol"]: (float(row["c"]), float(row["r_A"])) for row in side_table("bond_valence_atoms")}


def estimated_R0(cation: tuple[float, float], anion: tuple[float, float]) -> float:
    """Return r1 + r2 - r1 r2 (sqrt c1 - sqrt c2)^2 / (c1 r1 + c2 r2) [A].

    Parameters
    ----------
    cation, anion : tuple of float
        Electronegativity c and size r [A] of each atom.

    Returns
    -------
    R0_A : float
        [A]

    References
    ----------
    okeeffe-1991
    """
    (c1, r1), (c2, r2) = cation, anion
    return r1 + r2 - r1 * r2 * (math.sqrt(c1) - math.sqrt(c2)) ** 2 / (c1 * r1 + c2 * r2)


def _estimate(cation: str, anion: str) -> BondValence:
    missing = [symbol for symbol in (cation, anion) if symbol not in _atom_parameters()]
    if missing:
        raise KeyError(
            f"no bond-valence parameters for {cation!a}-{anion!a}: neither a row for the pair "
            f"nor atom parameters of {', '.join(ascii(symbol) for symbol in missing)}"
        )
    return BondValence(
        cation=cation,
        anion=anion,
        oxidation_state=None,
        R0_A=estimated_R0(_atom_parameters()[cation], _atom_parameters()[anion]),
        B_A=ESTIMATED_B_A,
        source_key="okeeffe-1991",
        locator="equation with atom parameters",
        provenance="derived",
        exact=False,
    )
