"""Overlap and dipole integrals from PySCF, each Slater function written as a sum of many Gaussians.

r^k exp(-zeta r) = int dt (pi t)^(-1/2) (2 sqrt t)^(-k-1) H_(k+1)(zeta / 2 sqrt t) exp(-zeta^2 / 4t) exp(-t r^2)
(derived from the transform of exp(-zeta r), Shavitt & Karplus, J. Chem. Phys. 43, 398 (1965), memory), by the
trapezoid rule in ln t. All functions of one l on an atom share the grid; they are contracted here, not in PySCF.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from math import factorial, log

import numpy as np
from pyscf import gto
from scipy.special import eval_hermite

from basis_params import Shell

STEP = 0.2
_REACH = (log(1 / 240), log(3e6))  # of t / zeta^2: exp(-60) at the diffuse end
PYSCF_ORDER = {0: (0,), 1: (1, 2, 0), 2: (0, 1, 2, 3, 4), 3: (0, 1, 2, 3, 4, 5, 6)}
"""Position in a PySCF shell of m = -l..l: its p functions run x, y, z."""


def gaussian_overlap(
    symbols: Sequence[str], positions_bohr: np.ndarray, shells: Mapping[str, tuple[Shell, ...]]
) -> np.ndarray:
    """Overlap matrix in the order atom, shell, m; outer shells Schmidt-orthogonalised to inner ones."""
    return gaussian_integrals(("int1e_ovlp",), symbols, positions_bohr, shells)[0]


def gaussian_integrals(
    names: Sequence[str], symbols: Sequence[str], positions_bohr: np.ndarray, shells: Mapping[str, tuple[Shell, ...]]
) -> np.ndarray:
    """Matrices (n_components, n, n) of PySCF's symmetric one-electron integrals, one after the other."""
    molecule = uncontracted(symbols, positions_bohr, shells)
    contractions = [contraction(molecule, atom, shells[symbol]) for atom, symbol in enumerate(symbols)]
    bounds = molecule.aoslice_by_atom()[:, :2]
    starts = np.concatenate([[0], np.cumsum([c.shape[1] for c in contractions])])

    def matrix(name: str) -> np.ndarray:
        parts = []
        for a in range(len(symbols)):
            for b in range(a + 1):
                block = molecule.intor(name, shls_slice=(*bounds[a], *bounds[b]))
                block = contractions[a].T @ block.reshape(-1, *block.shape[-2:]) @ contractions[b]
                parts.append((a, b, block))
        whole = np.zeros((len(parts[0][2]), starts[-1], starts[-1]))
        for a, b, block in parts:
            rows, columns = slice(starts[a], starts[a + 1]), slice(starts[b], starts[b + 1])
            whole[:, rows, columns] = block
            whole[:, columns, rows] = block.transpose(0, 2, 1)
        return whole

    overlap = matrix("int1e_ovlp")
    schmidt = np.zeros_like(overlap[0])
    for a in range(len(symbols)):
        own = slice(starts[a], starts[a + 1])
        # Shells run by l, then n: the upper-triangular factor of the on-site block is Gram-Schmidt, inner first.
        schmidt[own, own] = np.linalg.inv(np.linalg.cholesky(overlap[0, own, own])).T
    return np.concatenate([schmidt.T @ matrix(name) @ schmidt for name in names])


def uncontracted(
    symbols: Sequence[str], positions_bohr: np.ndarray, shells: Mapping[str, tuple[Shell, ...]]
) -> gto.Mole:
    """Molecule of ghost atoms that carry every Gaussian of the grids."""
    labels = [f"ghost-{symbol}@{index}" for index, symbol in enumerate(symbols)]
    basis = {}
    for label, symbol in zip(labels, symbols, strict=True):
        basis[label] = [
            [l, [float(np.exp(STEP * node)), 1.0]]
            for l in sorted({shell.l for shell in shells[symbol]})
            for node in _grid(shells[symbol], l)
        ]
    atoms = list(zip(labels, positions_bohr, strict=True))
    return gto.M(atom=atoms, unit="bohr", basis=basis, verbose=0)


def contraction(molecule: gto.Mole, atom: int, shells: tuple[Shell, ...]) -> np.ndarray:
    """(n_gaussians, n_functions) coefficients of the normalised Gaussians of one atom."""
    first, last = molecule.aoslice_by_atom()[atom, :2]
    offset = molecule.ao_loc[first]
    column = np.concatenate([[0], np.cumsum([2 * shell.l + 1 for shell in shells])])
    matrix = np.zeros((molecule.ao_loc[last] - offset, column[-1]))
    for index in range(first, last):
        l, exponent = molecule.bas_angular(index), molecule.bas_exp(index)[0]
        rows = molecule.ao_loc[index] - offset + np.array(PYSCF_ORDER[l])
        for place, shell in enumerate(shells):
            if shell.l == l:
                weight = sum(
                    c * _weight(shell.n, l, zeta, exponent)
                    for zeta, c in zip(shell.zetas, shell.coefficients, strict=True)
                )
                matrix[rows, np.arange(column[place], column[place + 1])] = weight / gto.gto_norm(l, exponent)
    return matrix


def _grid(shells: tuple[Shell, ...], l: int) -> range:
    logs = [2 * log(zeta) for shell in shells if shell.l == l for zeta in shell.zetas]
    return range(int((min(logs) + _REACH[0]) / STEP), int((max(logs) + _REACH[1]) / STEP) + 1)


def _weight(n: int, l: int, zeta: float, t: float) -> float:
    """Coefficient of r^l exp(-t r^2) in the normalised radial function."""
    k = n - 1 - l
    root = 2 * np.sqrt(t)
    density = root ** (-k - 1) * eval_hermite(k + 1, zeta / root) * np.exp(-(zeta**2) / (4 * t)) / np.sqrt(np.pi * t)
    return float(STEP * t * density * (2 * zeta) ** (n + 0.5) / np.sqrt(factorial(2 * n)))
