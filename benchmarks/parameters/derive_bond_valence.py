"""Derive atom sizes for the bond-valence estimate that the table of O'Keeffe and Brese does not give.

python benchmarks/parameters/derive_bond_valence.py  # derived rows of basis_params/tables/bond_valence_atoms.csv

The size is the one with which the estimate gives R0 of the highest tabulated oxide; the electronegativity is
that of Allred and Rochow (1958; memory), the scale of that table.
"""

from __future__ import annotations

import sys
from collections.abc import Iterator

from scipy.optimize import brentq

from basis_params.bond_valence import bond_valence_R0, estimated_R0
from basis_params.rows import side_table

ELECTRONEGATIVITY = {"Tc": 1.36, "Os": 1.52, "Pt": 1.44, "Au": 1.42, "Np": 1.22, "Pu": 1.22}
LOCATOR = "benchmarks/parameters/derive_bond_valence.py from {} {}+ oxide"


def rows() -> Iterator[str]:
    """Yield the derived rows."""
    oxygen = next((float(r["c"]), float(r["r_A"])) for r in side_table("bond_valence_atoms") if r["symbol"] == "O")
    for symbol, c in ELECTRONEGATIVITY.items():
        oxides = [row for row in side_table("bond_valence") if (row["cation"], row["anion"]) == (symbol, "O")]
        state = max(int(row["oxidation_state"]) for row in oxides)
        R0 = bond_valence_R0(symbol, "O", state).R0_A
        size = brentq(lambda r, c=c, R0=R0: estimated_R0((c, r), oxygen) - R0, 0.5, 3.0)
        yield f"{symbol},{c},{size:.2f},okeeffe-1991,{LOCATOR.format(symbol, state)},derived"


if __name__ == "__main__":
    sys.stdout.writelines(f"{row}\n" for row in rows())
