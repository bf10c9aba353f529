"""Atoms in the average of a configuration: scalar-relativistic restricted Hartree-Fock over ANO-RCC.

Every open shell holds q electrons spread evenly over its 2l+1 orbitals. An electron of that shell meets the
q - 1 others with the mean interaction of two electrons of the shell: with J and K of the spherical density of
one electron that is (q - 1) (4l+2)/(4l+1) (J - K/2), where a plain fractional occupation has q (J - K/2)
(Slater, Quantum Theory of Atomic Structure, 1960, average energy of a configuration; memory). So the orbital
energies are minus the frozen-orbital ionisation energies of the average, without self-interaction.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from pyscf import gto, scf
from pyscf.data import nist
from scipy.linalg import block_diag, eigh

Array = NDArray[np.float64]
Configuration = Mapping[tuple[int, int], float]

HARTREE_EV = nist.HARTREE2EV
MAX_CYCLES = 200
GRADIENT_TOLERANCE = 1e-7
DIIS_VECTORS = 8


@dataclass(frozen=True)
class AtomicOrbital:
    """One radial function R(r) of an average-of-configuration atom.

    Attributes
    ----------
    n, l : int
    electrons : float
        Electrons in the shell.
    energy_eV : float
        Orbital energy [eV].
    r : (n_r,) ndarray
        Radial grid [bohr].
    weights : (n_r,) ndarray
        Quadrature weights of the integral over r [bohr].
    radial : (n_r,) ndarray
        r R(r), normalised to 1 on the grid [bohr^-1/2].
    """

    n: int
    l: int
    electrons: float
    energy_eV: float
    r: Array
    weights: Array
    radial: Array

    def moment(self, power: int) -> float:
        """Return <r^power> [bohr^power]."""
        return float(self.weights @ (self.radial**2 * self.r**power))


def radial_grid(points: int = 4000, r_min: float = 1e-6, r_max: float = 80.0) -> tuple[Array, Array]:
    """Return a logarithmic grid and its trapezoid weights [bohr]."""
    x, step = np.linspace(np.log(r_min), np.log(r_max), points, retstep=True)
    r = np.exp(x)
    weights = r * step
    weights[[0, -1]] *= 0.5
    return r, weights


def build_atom(symbol: str, max_l: int) -> gto.Mole:
    """Return the atom with the functions of the full ANO-RCC basis up to `max_l`."""
    shells = [shell for shell in gto.basis.load("ano", symbol) if shell[0] <= max_l]
    return gto.M(atom=f"{symbol} 0 0 0", basis={symbol: shells}, spin=None, verbose=0, max_memory=3000)


class AverageAtom:
    """Integrals of one atom; `solve` gives the orbitals of a configuration.

    Parameters
    ----------
    symbol : str
    max_l : int
        Highest angular quantum number that any configuration fills; functions above it would stay empty.
    """

    def __init__(self, symbol: str, max_l: int) -> None:
        self.mol = build_atom(symbol, max_l)
        self.core = scf.RHF(self.mol).sfx2c1e().get_hcore()
        self.overlap = self.mol.intor("int1e_ovlp")
        self.eri = self.mol.intor("int2e", aosym="s8")
        self.index = self._functions_by_l()
        coulomb, exchange = scf.hf.dot_eri_dm(self.eri, scf.hf.init_guess_by_atom(self.mol), hermi=1)
        self.guess = self.core + coulomb - 0.5 * exchange

    def _functions_by_l(self) -> dict[int, NDArray[np.int64]]:
        """Return per l the (n_radial, 2l+1) positions of its functions."""
        index: dict[int, list[NDArray[np.int64]]] = {}
        start = 0
        for shell in range(self.mol.nbas):
            l, count = self.mol.bas_angular(shell), self.mol.bas_nctr(shell)
            block = np.arange(start, start + count * (2 * l + 1)).reshape(count, 2 * l + 1)
            index.setdefault(l, []).append(block)
            start += block.size
        return {l: np.concatenate(blocks) for l, blocks in index.items()}

    def _radial_block(self, matrix: Array, l: int) -> Array:
        """Return the block of l of a spherical operator, averaged over m."""
        rows = self.index[l].T
        return np.asarray(np.mean([matrix[np.ix_(row, row)] for row in rows], axis=0))

    def _density(self, l: int, vector: Array, electrons: float) -> Array:
        density = np.zeros((self.mol.nao, self.mol.nao))
        for row in self.index[l].T:
            density[np.ix_(row, row)] = np.outer(vector, vector) * electrons / (2 * l + 1)
        return density

    def _fock(self, configuration: Configuration, orbitals: Mapping[int, Array]) -> dict[int, Array]:
        """Return one Fock block per l whose eigenvectors are the stationary orbitals.

        The part that only an open shell a feels, delta, enters its own block and, weighted so that the
        condition <c|F|a> = 0 is that of the energy, the coupling to the closed shells c of the same l.
        """
        shells = {(n, l): self._density(l, orbitals[l][:, n - l - 1], q) for (n, l), q in configuration.items() if q}
        open_shells = [key for key in shells if configuration[key] < 4 * key[1] + 2]
        densities = np.array([sum(shells.values()), *(shells[key] for key in open_shells)])
        coulomb, exchange = scf.hf.dot_eri_dm(self.eri, densities, hermi=1)
        mean_field = coulomb - 0.5 * exchange
        fock = {l: self._radial_block(self.core + mean_field[0], l) for l in orbitals}
        for (n, l), own in zip(open_shells, mean_field[1:], strict=True):
            q = configuration[n, l]
            delta = ((q - 1) * (4 * l + 2) / (4 * l + 1) - q) / q * self._radial_block(own, l)
            fock[l] = self._with_open_shell(fock[l], delta, l, orbitals[l], n - l - 1, q / (2 * l + 1))
        return fock

    def _with_open_shell(
        self, fock: Array, delta: Array, l: int, vectors: Array, position: int, filling: float
    ) -> Array:
        """Add the operator of one open shell that holds `filling` electrons per orbital."""
        d = vectors.T @ delta @ vectors
        own = np.zeros_like(d)
        own[position, position:] = d[position, position:]
        own[position, :position] = -filling / (2 - filling) * d[position, :position]
        own[:, position] = own[position]
        half = self._radial_block(self.overlap, l) @ vectors
        return fock + half @ own @ half.T

    def solve(self, configuration: Configuration) -> tuple[AtomicOrbital, ...]:
        """Return all occupied orbitals of a configuration {(n, l): electrons}.

        Raises
        ------
        RuntimeError
            If the self-consistent field does not converge.
        """
        overlaps = {l: self._radial_block(self.overlap, l) for l in self.index}
        focks = {l: self._radial_block(self.guess, l) for l in self.index}
        history: list[tuple[Array, Array]] = []
        for _ in range(MAX_CYCLES):
            solutions = {l: eigh(focks[l], overlaps[l]) for l in focks}
            orbitals = {l: vectors for l, (_, vectors) in solutions.items()}
            fresh = self._fock(configuration, orbitals)
            error = block_diag(*(self._gradient(fresh[l], orbitals[l], l, configuration) for l in fresh))
            if np.abs(error).max() < GRADIENT_TOLERANCE:
                return self._collect(configuration, fresh, orbitals)
            history = [*history, (block_diag(*fresh.values()), error)][-DIIS_VECTORS:]
            mixed = _extrapolate(history)
            focks = _split(mixed, fresh)
        raise RuntimeError(f"{self.mol.atom_symbol(0)} {dict(configuration)}: no convergence in {MAX_CYCLES} cycles")

    def _gradient(self, fock: Array, vectors: Array, l: int, configuration: Configuration) -> Array:
        """Return the Fock couplings between shells of different filling, as a matrix over the basis."""
        filling = np.array([configuration.get((k + l + 1, l), 0.0) for k in range(vectors.shape[1])])
        coupling = vectors.T @ fock @ vectors
        coupling[filling[:, None] == filling[None, :]] = 0.0
        half = self._radial_block(self.overlap, l) @ vectors
        return half @ coupling @ half.T

    def _collect(
        self, configuration: Configuration, focks: Mapping[int, Array], orbitals: Mapping[int, Array]
    ) -> tuple[AtomicOrbital, ...]:
        r, weights = radial_grid()
        points = np.stack([0.31 * r, 0.52 * r, np.sqrt(1 - 0.31**2 - 0.52**2) * r], axis=1)
        values = self.mol.eval_gto("GTOval_sph", points)
        found = []
        for (n, l), electrons in configuration.items():
            if not electrons:
                continue
            vector = orbitals[l][:, n - l - 1]
            # sum over m of the squares is (2l+1)/(4 pi) R^2; one component keeps the sign
            component = values[:, self.index[l][:, 0]] @ vector
            radial = component * r
            radial /= np.sqrt(weights @ radial**2) * np.sign(radial[np.argmax(np.abs(radial))])
            energy = float(vector @ focks[l] @ vector) * HARTREE_EV
            found.append(AtomicOrbital(n, l, electrons, energy, r, weights, radial))
        return tuple(found)


def _extrapolate(history: list[tuple[Array, Array]]) -> Array:
    """Direct inversion in the iterative subspace over the Fock matrices of the history."""
    size = len(history)
    system = np.ones((size + 1, size + 1))
    system[-1, -1] = 0.0
    for i, (_, a) in enumerate(history):
        for j, (_, b) in enumerate(history):
            system[i, j] = np.vdot(a, b)
    scale = system[:size, :size].max()
    system[:size, :size] /= scale
    target = np.zeros(size + 1)
    target[-1] = 1.0
    coefficients = np.linalg.lstsq(system, target, rcond=1e-13)[0][:size]
    return np.asarray(sum(c * fock for c, (fock, _) in zip(coefficients, history, strict=True)))


def _split(matrix: Array, like: Mapping[int, Array]) -> dict[int, Array]:
    blocks, start = {}, 0
    for l, block in like.items():
        stop = start + len(block)
        blocks[l], start = matrix[start:stop, start:stop], stop
    return blocks
