"""Write the structures that the set `oxo` is calibrated on, from the builds of the tests.

    python benchmarks/parameters/training_structures.py > basis_params/specs/oxo_structures.xyz

Run from the folder of the checkout. Each frame's comment line holds the name, charge and unpaired electrons. The first
frames are the idealised ones that the PySCF records of `tests/published/pyscf_minimal.csv` were made on.
"""

from __future__ import annotations

import sys
from pathlib import Path

import numpy as np

from ehmo.records.fragment import Fragment
from ehmo.structure import read_frames
from tests.published.structures import STRUCTURES

METALS = frozenset({"V", "Cr", "Mn", "Fe", "Mo", "Tc", "Ru", "W", "Re", "Os"})
RECORDS = Path("tests/published/pyscf_minimal.xyz")
BUILT = (
    *("VO4 3-", "CrO4 2-", "MnO4 -", "FeO4 2-", "MoO4 2-", "TcO4 -", "RuO4", "WO4 2-", "ReO4 -", "OsO4", "MnO4 3-"),
    *("[VO(OH2)5]2+", "[FeO(OH2)5]2+", "VOCl3", "CrO2Cl2", "CrO3Cl -", "CrOF4", "ReO3F", "CH3ReO3", "OsO3N -"),
    *("[VOCl4]2-", "[MoOCl4]-", "[TcOCl4]-", "[ReOCl4]-", "[MoOCl5]2-", "[WOCl5]2-", "MoOCl4", "WOCl4", "OsOCl4"),
    *("[CrNCl4]2-", "[MoNCl4]-", "[RuNCl4]-"),
    *("[V(OH2)6]2+", "[V(OH2)6]3+", "[Mn(OH2)6]2+", "[Fe(OH2)6]2+", "[Fe(OH2)6]3+", "[MnO(NH2)4]-"),
    *("[FeO(NH3)4(NCCH3)]2+", "trans-[RuO2(NH3)4]2+", "[RuO(NH3)5]2+"),
)
HEXACHLORO = (("[CrCl6]3-", "Cr", 2.335, -3, 3), ("[MnCl6]4-", "Mn", 2.54, -4, 5))
"""Regular octahedra with lengths typical of their salts (memory): name, metal, length, charge, unpaired electrons."""


def frame(name: str, fragment: Fragment) -> str:
    """One frame of XYZ text."""
    lines = [str(len(fragment)), f"{name} charge={fragment.charge} unpaired={fragment.unpaired_electrons}"]
    lines += [
        f"{symbol:2} " + " ".join(f"{x + 0.0:12.8f}" for x in position)
        for symbol, position in zip(fragment.symbols, fragment.positions_A.round(8), strict=True)
    ]
    return "\n".join(lines) + "\n"


def text() -> str:
    """All frames."""
    recorded = [f for f in read_frames(RECORDS) if f.symbols[0] in METALS]
    frames = [frame(f"{f.title}, idealised", f) for f in recorded]
    axes = np.concatenate([np.eye(3), -np.eye(3)])
    frames += [
        frame(name, Fragment((metal, *["Cl"] * 6), np.vstack([np.zeros(3), length * axes]), charge, unpaired))
        for name, metal, length, charge, unpaired in HEXACHLORO
    ]
    return "".join([*frames, *(frame(name, STRUCTURES[name].fragment()) for name in BUILT)])


if __name__ == "__main__":
    sys.stdout.write(text())
