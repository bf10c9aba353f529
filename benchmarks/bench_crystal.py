"""From a CIF to molecules, networks, charges and names, in seconds for some 500 atoms in the cell."""

from __future__ import annotations

import pytest

from benchmarks.pairs import timed_in_turn
from ehmo.structure import crystal_contents
from tests.geometries import SPECIES
from tests.structure.cif_text import cif

LIMIT_S = 0.3
P21_C = ("x,y,z", "-x,y+1/2,-z+1/2", "-x,-y,-z", "x,-y+1/2,z+1/2")
EDGE = 26.0


def crystal() -> str:
    """Seven aqua vanadyl ions and as many sulfate ions in the asymmetric unit, 616 atoms in the cell."""
    ion = SPECIES["[VO(OH2)5]2+"]
    sites = []
    for number in range(7):
        x = 0.02 + 0.14 * number
        for k, (symbol, place) in enumerate(zip(ion.symbols, ion.positions_A, strict=True)):
            a, b, c = place / EDGE
            sites.append(f"{symbol}{number}{k:02d} {symbol} {x + a / 2.5:.5f} {0.12 + b:.5f} {0.12 + c:.5f}")
        d = 1.47 / 3**0.5 / EDGE
        corners = ((1, 1, 1), (-1, -1, 1), (-1, 1, -1), (1, -1, -1))
        sites.append(f"S{number} S {x:.5f} 0.35 0.12")
        sites += [
            f"O{number}9{k} O {x + a * d / 2.5:.5f} {0.35 + b * d:.5f} {0.12 + c * d:.5f}"
            for k, (a, b, c) in enumerate(corners)
        ]
    return cif(sites, cell=(2.5 * EDGE, EDGE, EDGE, 90, 98, 90), operations=P21_C)


def bench_reading_and_assembling(tmp_path, benchmark, record_ratio):
    """Reading, expanding, bonds, kinds, charges."""
    path = tmp_path / "crystal.cif"
    path.write_text(crystal())
    contents = crystal_contents(path)
    assert len(contents.molecules) == 7
    assert {molecule.fragment.charge for molecule in contents.molecules} <= {2, None}
    (seconds,) = timed_in_turn(lambda: crystal_contents(path), rounds=10)
    benchmark.pedantic(lambda: crystal_contents(path), rounds=5)
    record_ratio(f"CIF to contents, {len(contents.symbols)} atoms in the cell, in seconds", seconds, LIMIT_S)


@pytest.mark.parametrize("hydrogens", ["place"])
def bench_placing_hydrogens(tmp_path, benchmark, record_ratio, hydrogens):
    """The same without its hydrogens, which are placed."""
    path = tmp_path / "crystal.cif"
    path.write_text("\n".join(line for line in crystal().splitlines() if not line.startswith("H")) + "\n")
    contents = crystal_contents(path, hydrogens=hydrogens)
    assert not contents.missing_hydrogens
    (seconds,) = timed_in_turn(lambda: crystal_contents(path, hydrogens=hydrogens), rounds=5)
    benchmark.pedantic(lambda: crystal_contents(path, hydrogens=hydrogens), rounds=3)
    record_ratio(f"the same, placing {contents.symbols.count('H')} hydrogens, in seconds", seconds)
