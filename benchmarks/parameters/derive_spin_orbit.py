"""Derive spin-orbit constants and Slater integrals of free d and f ions that no remembered row gives.

    python benchmarks/parameters/derive_spin_orbit.py zeta [SYMBOL ...]    # rows of basis_params/tables/spin_orbit.csv
    python benchmarks/parameters/derive_spin_orbit.py slater [SYMBOL ...]  # rows of basis_params/tables/slater.csv
    python benchmarks/parameters/derive_spin_orbit.py audit [SYMBOL ...]   # zeta of the table against a fresh one

zeta is the central-field integral (alpha^2/2) <(1/r) dV/dr / M^2> over the open shell of the average-of-
configuration ion, V being the potential of the nucleus and of the other electrons with Slater's local exchange
and M = 1 + alpha^2 (e - V)/2 the relativistic mass factor (Condon, Shortley 1935; Cowan, Griffin 1976; memory).
It neglects the spin-other-orbit shielding. That is subtracted as a number linear in Z, the same for all charges,
fixed by two ions of each series whose zeta is exact: one electron or one hole, zeta = splitting/(l + 1/2).

F2, F4, F6 of 5f are Hartree-Fock integrals times the ratio of fitted and computed ones of U4+. Symbols restrict
the run: a 3d element takes 3 s, a 5d element a minute, an actinide several.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Iterable, Iterator
from functools import cache

import numpy as np
from average_atom import Array, AtomicOrbital, AverageAtom
from pyscf import gto
from pyscf.data import nist
from scipy.integrate import cumulative_trapezoid

from basis_params.ligand_field import slater_integrals, spin_orbit
from basis_params.rows import side_table

LOCATOR = "benchmarks/parameters/derive_spin_orbit.py"
SOURCE_KEY = "average-atom"
SPEED_OF_LIGHT = 137.035999
PER_CM = nist.HARTREE2WAVENUMBER
RARE_GAS_SHELLS = ((1, 0), (2, 0), (2, 1), (3, 0), (3, 1), (3, 2), (4, 0), (4, 1), (4, 2), (5, 0), (5, 1), (4, 3))
# Open shell -> closed shells below it
CORES = {
    (3, 2): RARE_GAS_SHELLS[:5],
    (4, 2): RARE_GAS_SHELLS[:8],
    (5, 2): RARE_GAS_SHELLS,
    (5, 3): (*RARE_GAS_SHELLS, (5, 2), (6, 0), (6, 1)),
}
SERIES = {
    (3, 2): ("Ti", "V", "Cr", "Mn", "Fe", "Co", "Ni", "Cu"),
    (4, 2): ("Zr", "Nb", "Mo", "Tc", "Ru", "Rh", "Pd", "Ag"),
    (5, 2): ("Hf", "Ta", "W", "Re", "Os", "Ir", "Pt", "Au"),
    (5, 3): ("Th", "U", "Np", "Pu"),
}
# Ions with one electron or one hole whose levels are remembered
ANCHORS = {
    (3, 2): (("Ti", 3), ("Cu", 2)),
    (4, 2): (("Zr", 3), ("Ag", 2)),
    (5, 2): (("Hf", 3), ("Au", 2)),
    (5, 3): (("Th", 3), ("U", 5)),
}
SLATER_ANCHOR = ("U", 4)


def open_shell(symbol: str) -> tuple[int, int]:
    """Return (n, l) of the open shell of the ions of a metal."""
    return next(shell for shell, symbols in SERIES.items() if symbol in symbols)


def electrons(symbol: str, charge: int) -> int:
    """Return the electrons of an ion in its open shell."""
    return int(gto.charge(symbol)) - charge - sum(4 * l + 2 for _, l in CORES[open_shell(symbol)])


@cache
def _atom(symbol: str) -> AverageAtom:
    return AverageAtom(symbol, max(3 if (4, 3) in CORES[open_shell(symbol)] else 2, open_shell(symbol)[1]))


@cache
def ion_orbitals(symbol: str, charge: int) -> tuple[AtomicOrbital, ...]:
    """Return the orbitals of an ion, the open shell last."""
    shell = open_shell(symbol)
    filled = {(n, l): 4 * l + 2 for n, l in CORES[shell]}
    return _atom(symbol).solve({**filled, shell: electrons(symbol, charge)})


def _potential_of(density: Array, r: Array, k: int = 0) -> Array:
    """Return Y_k/r of a radial density: integral of r_<^k / r_>^(k+1) [hartree]."""
    inner = cumulative_trapezoid(density * r**k, r, initial=0.0)
    outer = cumulative_trapezoid(density / r ** (k + 1), r, initial=0.0)
    return np.asarray(inner / r ** (k + 1) + (outer[-1] - outer) * r**k)


def central_field_zeta(symbol: str, charge: int) -> float:
    """Return the central-field spin-orbit constant [cm^-1]."""
    orbitals = ion_orbitals(symbol, charge)
    valence, r = orbitals[-1], orbitals[-1].r
    others = sum(o.electrons * o.radial**2 for o in orbitals) - valence.radial**2
    exchange = -((3.0 / np.pi * others / (4.0 * np.pi * r**2)).clip(1e-30) ** (1 / 3))
    potential = -gto.charge(symbol) / r + _potential_of(others, r) + exchange
    slope = np.gradient(potential, np.log(r)) / r
    mass = 1.0 + (valence.energy_eV / nist.HARTREE2EV - potential) / (2.0 * SPEED_OF_LIGHT**2)
    integral = valence.weights @ (valence.radial**2 * slope / r / mass**2)
    return float(integral / (2.0 * SPEED_OF_LIGHT**2) * PER_CM)


@cache
def _shielding(shell: tuple[int, int]) -> tuple[float, float, float]:
    """Return Z of the first anchor, its neglected shielding [cm^-1] and the rise of that per unit of Z."""
    (z0, s0), (z1, s1) = (
        (gto.charge(symbol), central_field_zeta(symbol, q) - spin_orbit(symbol, q).zeta_per_cm)
        for symbol, q in ANCHORS[shell]
    )
    return z0, s0, (s1 - s0) / (z1 - z0)


def zeta(symbol: str, charge: int) -> float:
    """Return the spin-orbit constant of the open shell of an ion [cm^-1]."""
    z0, shielding, rise = _shielding(open_shell(symbol))
    return central_field_zeta(symbol, charge) - shielding - rise * (gto.charge(symbol) - z0)


def hartree_fock_slater(symbol: str, charge: int) -> tuple[float, float, float]:
    """Return F2, F4, F6 of the open shell [cm^-1]."""
    shell = ion_orbitals(symbol, charge)[-1]
    density = shell.radial**2
    f2, f4, f6 = (float(shell.weights @ (density * _potential_of(density, shell.r, k))) * PER_CM for k in (2, 4, 6))
    return f2, f4, f6


def ions(symbols: Iterable[str]) -> Iterator[tuple[str, int]]:
    """Yield the ions of the table: d1 to d9 with charge 2 to 7, f1 to f5 with charge 3 to 6."""
    wanted = set(symbols)
    for (_, l), series in SERIES.items():
        charges, most = (range(2, 8), 9) if l == 2 else (range(3, 7), 5)
        for symbol in series:
            if not wanted or symbol in wanted:
                yield from ((symbol, q) for q in charges if 1 <= electrons(symbol, q) <= most)


def zeta_rows(symbols: Iterable[str]) -> Iterator[str]:
    """Yield the derived rows of spin_orbit.csv."""
    known = {(r["symbol"], int(r["charge"])) for r in side_table("spin_orbit") if r["provenance"] != "derived"}
    for ion in ions(symbols):
        if ion not in known:
            value = zeta(*ion)
            yield f"{ion[0]},{ion[1]},{float(f'{value:.3g}'):.0f},{SOURCE_KEY},{LOCATOR},derived"


def audit_rows(symbols: Iterable[str]) -> Iterator[str]:
    """Yield symbol, charge, provenance, zeta of the table and zeta computed here [cm^-1]."""
    wanted = set(symbols)
    for row in side_table("spin_orbit"):
        if not wanted or row["symbol"] in wanted:
            computed = zeta(row["symbol"], int(row["charge"]))
            yield f"{row['symbol']},{row['charge']},{row['provenance']},{row['zeta_per_cm']},{computed:.0f}"


def slater_rows(symbols: Iterable[str]) -> Iterator[str]:
    """Yield the derived rows of slater.csv."""
    fitted = slater_integrals(*SLATER_ANCHOR)
    computed = hartree_fock_slater(*SLATER_ANCHOR)
    ratios = [x / y for x, y in zip((fitted.F2_per_cm, fitted.F4_per_cm, fitted.F6_per_cm), computed, strict=True)]
    for symbol, charge in ions(symbols):
        if open_shell(symbol)[1] == 3 and electrons(symbol, charge) > 1 and (symbol, charge) != SLATER_ANCHOR:
            values = (k * x for k, x in zip(ratios, hartree_fock_slater(symbol, charge), strict=True))
            cells = ",".join(f"{round(x, -2):.0f}" for x in values)
            yield f"{symbol},{charge},{cells},{SOURCE_KEY},{LOCATOR},derived"


def main() -> None:
    """Print derived rows."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("what", choices=("zeta", "slater", "audit"))
    parser.add_argument("symbols", nargs="*")
    arguments = parser.parse_args()
    rows = {"zeta": zeta_rows, "slater": slater_rows, "audit": audit_rows}[arguments.what]
    for row in rows(arguments.symbols):
        sys.stdout.write(f"{row}\n")
        sys.stdout.flush()


if __name__ == "__main__":
    main()
