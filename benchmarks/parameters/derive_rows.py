"""Derive atomic orbitals and parameter rows from average-of-configuration atoms.

    python benchmarks/parameters/derive_rows.py orbitals > basis_params/tables/atomic_orbitals.csv
    python benchmarks/parameters/derive_rows.py rows

The first form computes every valence shell of the set `standard` (about 20 minutes); symbols after the word
restrict it. The second prints, in the CSV form of a parameter table, the rows of elements that have no
remembered row, from the orbitals in the package: the row of the homologue with every exponent scaled so that
(2n+1)/(2<r>) changes as in the atoms, and with the difference of the orbital energies added to h_ii. Scaling
leaves the norm as it is.
"""

from __future__ import annotations

import argparse
import csv
import sys
from collections.abc import Iterable

import numpy as np
from average_atom import Array, AtomicOrbital, AverageAtom
from numpy.typing import NDArray
from pyscf import gto
from pyscf.data import elements
from scipy.optimize import least_squares
from scipy.special import gammaln

import basis_params

SPDF = "spdf"
SOURCE_KEY, LOCATOR = "average-atom", "benchmarks/parameters/derive_rows.py"
# Element without a remembered row: (homologue, difference of n, valence electrons)
HOMOLOGUES = {"Ba": ("Sr", 1, 2), "Np": ("U", 0, 13), "Pu": ("U", 0, 14)}
# Pu as 5f5 6d1 7s2, like U and Np, so that the series has one kind of configuration and 6d is filled
ELECTRONS_BY_L = {"Pu": (14, 30, 31, 19)}
COLUMNS = (
    *("symbol", "n", "l", "ground_electrons", "configuration", "energy_eV", "r_mean_bohr", "r2_mean_bohr2"),
    *("zeta1", "c1", "zeta2", "c2", "source_key", "locator", "provenance"),
)

Shells = tuple[tuple[int, int], ...]
Configuration = dict[tuple[int, int], int]


def valence_shells(symbol: str) -> Shells:
    """Return the (n, l) that the set `standard` gives, or is to give, the element."""
    source, shift, _ = HOMOLOGUES.get(symbol, (symbol, 0, 0))
    return tuple((shell.n + shift, shell.l) for shell in basis_params.load_set("standard").element(source).shells)


def ground_configuration(symbol: str) -> Configuration:
    """Return {(n, l): electrons}, each l filled from its lowest shell."""
    filled: Configuration = {}
    for l, electrons in enumerate(ELECTRONS_BY_L.get(symbol, elements.CONFIGURATION[gto.charge(symbol)])):
        n = l + 1
        while electrons > 0:
            filled[n, l] = min(electrons, 4 * l + 2)
            electrons -= filled[n, l]
            n += 1
    return filled


def promoted(ground: Configuration, empty: tuple[int, int], valence: Shells) -> Configuration:
    """Return the configuration with one electron of the outermost s shell (else d) moved to `empty`."""
    donor = min((shell for shell in valence if ground.get(shell)), key=lambda shell: (shell[1], -shell[0]))
    return {**ground, donor: ground[donor] - 1, empty: 1}


def valence_orbitals(symbol: str) -> dict[str, list[AtomicOrbital]]:
    """Return the valence orbitals by configuration: ground state, and one promoted for each empty shell."""
    valence, ground = valence_shells(symbol), ground_configuration(symbol)
    empty = [shell for shell in valence if not ground.get(shell)]
    atom = AverageAtom(symbol, max(l for _, l in (*ground, *valence)))
    found = {_label(ground, valence): [o for o in atom.solve(ground) if (o.n, o.l) in valence]}
    for shell in empty:
        configuration = promoted(ground, shell, valence)
        found[_label(configuration, valence)] = [o for o in atom.solve(configuration) if (o.n, o.l) == shell]
    return found


def _label(configuration: Configuration, valence: Shells) -> str:
    return " ".join(f"{n}{SPDF[l]}{configuration[n, l]}" for n, l in valence if configuration.get((n, l)))


def slater_function(n: int, zeta: float, r: Array) -> Array:
    """Return r R(r) of the normalised Slater function [bohr^-1/2]."""
    log_norm = (n + 0.5) * np.log(2 * zeta) - 0.5 * gammaln(2 * n + 1)
    return np.asarray(np.exp(log_norm + n * np.log(r) - zeta * r))


def fit_slater(orbital: AtomicOrbital) -> tuple[tuple[float, float], ...]:
    """Return (zeta, coefficient) pairs: one that keeps <r> for s and p, two by least squares for d and f."""
    if orbital.l < 2:
        return (((2 * orbital.n + 1) / (2 * orbital.moment(1)), 1.0),)
    root = np.sqrt(orbital.weights)

    def basis(log_zetas: Array) -> Array:
        return np.stack([slater_function(orbital.n, z, orbital.r) * root for z in np.exp(log_zetas)], axis=1)

    def coefficients(log_zetas: Array) -> Array:
        return np.asarray(np.linalg.lstsq(basis(log_zetas), orbital.radial * root, rcond=None)[0])

    def residual(log_zetas: Array) -> Array:
        return np.asarray(basis(log_zetas) @ coefficients(log_zetas) - orbital.radial * root)

    mean = (2 * orbital.n + 1) / (2 * orbital.moment(1))
    zetas: NDArray[np.float64] = np.sort(least_squares(residual, np.log([1.8 * mean, 0.7 * mean])).x)[::-1]
    c = coefficients(zetas)
    c /= np.linalg.norm(basis(zetas) @ c)
    return tuple((float(z), float(k)) for z, k in zip(np.exp(zetas), c, strict=True))


def orbital_rows(symbols: Iterable[str]) -> Iterable[list[object]]:
    """Yield the rows of atomic_orbitals.csv."""
    for symbol in symbols:
        rows = []
        ground = ground_configuration(symbol)
        for configuration, orbitals in valence_orbitals(symbol).items():
            for o in orbitals:
                pairs = [f"{x:.4f}" for pair in fit_slater(o) for x in pair]
                values = [f"{o.energy_eV:.3f}", f"{o.moment(1):.4f}", f"{o.moment(2):.4f}", *pairs]
                cells = [
                    symbol,
                    o.n,
                    SPDF[o.l],
                    ground.get((o.n, o.l), 0),
                    configuration,
                    *values,
                    *[""] * (4 - len(pairs)),
                ]
                rows.append([*cells, SOURCE_KEY, LOCATOR, "derived"])
        yield from sorted(rows, key=lambda row: (SPDF.index(str(row[2])), row[1]))


def homologue_rows(symbol: str) -> Iterable[list[object]]:
    """Yield the rows of one element in the columns of a parameter table."""
    source, shift, electrons = HOMOLOGUES[symbol]
    for shell in basis_params.load_set("standard").element(source).shells:
        known = basis_params.atomic_orbital(source, shell.n, shell.l)
        new = basis_params.atomic_orbital(symbol, shell.n + shift, shell.l)
        scale = known.r_mean_bohr / new.r_mean_bohr * (2 * new.n + 1) / (2 * known.n + 1)
        h_ii = shell.h_ii_eV + new.energy_eV - known.energy_eV
        pairs = [(f"{scale * z:.3f}", c) for z, c in zip(shell.zetas, shell.coefficients, strict=True)]
        contraction = [x for pair in pairs for x in pair] if len(pairs) > 1 else [pairs[0][0], "", "", ""]
        place = f"{LOCATOR} from {source}"
        yield [
            symbol,
            electrons,
            new.n,
            SPDF[new.l],
            f"{h_ii:.2f}",
            *contraction,
            SOURCE_KEY,
            place,
            "derived",
        ]


def main() -> None:
    """Print the table of orbitals, or the derived parameter rows."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("what", choices=("orbitals", "rows"))
    parser.add_argument("symbols", nargs="*")
    arguments = parser.parse_args()
    known = {*basis_params.load_set("standard").elements, *HOMOLOGUES}
    everything = [s for s in basis_params.atom_symbols() if s in known]
    writer = csv.writer(sys.stdout, lineterminator="\n")
    if arguments.what == "rows":
        writer.writerows(row for symbol in arguments.symbols or HOMOLOGUES for row in homologue_rows(symbol))
        return
    writer.writerow(COLUMNS)
    for row in orbital_rows(arguments.symbols or everything):
        writer.writerow(row)
        sys.stdout.flush()


if __name__ == "__main__":
    main()
