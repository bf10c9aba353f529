"""The definitions of population and bond analysis as plain sums, one term at a time, independent of ehmo."""

from __future__ import annotations

import numpy as np
from scipy.linalg import expm, sqrtm

from tests.angular_momentum import momentum_matrices


def density(C: np.ndarray, occupations: np.ndarray) -> np.ndarray:
    """P_ij = sum_k n_k c_ik c_jk."""
    size = len(C)
    P = np.zeros((size, size))
    for k in range(size):
        for i in range(size):
            weight = occupations[k] * C[i, k]
            for j in range(size):
                P[i, j] += weight * C[j, k]
    return P


def gross(P: np.ndarray, S: np.ndarray) -> np.ndarray:
    """Mulliken gross population of each function (Mulliken 1955)."""
    return np.array([sum(P[i, j] * S[i, j] for j in range(len(P))) for i in range(len(P))])


def grouped(P: np.ndarray, S: np.ndarray, group: np.ndarray) -> np.ndarray:
    """Net populations of groups of functions on the diagonal, overlap populations over both halves beside it."""
    result = np.zeros((group.max() + 1, group.max() + 1))
    for i in range(len(P)):
        for j in range(len(P)):
            result[group[i], group[j]] += P[i, j] * S[i, j] * (1 if group[i] == group[j] else 2)
    return result


def mayer(spin_densities, S: np.ndarray, first: np.ndarray, second: np.ndarray) -> float:
    """2 sum over spins of (PS)_ij (PS)_ji, i on one atom and j on the other (Mayer 1983)."""
    total = 0.0
    for P in spin_densities:
        product = P @ S
        for i in first:
            for j in second:
                total += 2 * product[i, j] * product[j, i]
    return total


def lowdin(P: np.ndarray, S: np.ndarray) -> np.ndarray:
    """S^1/2 P S^1/2 (Löwdin 1950), the root by SciPy's general matrix function."""
    root = sqrtm(S).real
    return root @ P @ root


def wiberg(lowdin_densities, first: np.ndarray, second: np.ndarray) -> float:
    """2 sum over spins of |P_ij|^2 (Wiberg 1968)."""
    return sum(2 * P[i, j] ** 2 for P in lowdin_densities for i in first for j in second)


def channel_matrix(lowdin_densities, first: np.ndarray, second: np.ndarray) -> np.ndarray:
    """2 sum over spins of P_MX P_XM, whose eigenvalues are the channel weights."""
    return sum(2 * P[np.ix_(first, second)] @ P[np.ix_(second, first)] for P in lowdin_densities)


def squared_momentum(direction: np.ndarray, layout: tuple[int, ...]) -> np.ndarray:
    """(n.L)^2 among the real harmonics of an atom with shells of these l."""
    size = sum(2 * l + 1 for l in layout)
    squared = np.zeros((size, size))
    start = 0
    for l in layout:
        stop = start + 2 * l + 1
        along = np.einsum("a,aij->ij", direction, momentum_matrices(l))
        squared[start:stop, start:stop] = (along @ along).real
        start = stop
    return squared


def turned_functions(turn: np.ndarray, l: int) -> np.ndarray:
    """Matrix that turns the coefficients of a shell by a rotation, by exponentiating angular momentum.

    The rotation by an angle about n is exp(-i angle n.L).
    """
    angle = np.arccos(np.clip((np.trace(turn) - 1) / 2, -1, 1))
    if angle < 1e-12:
        return np.eye(2 * l + 1)
    if abs(angle - np.pi) < 1e-6:
        values, vectors = np.linalg.eigh(turn)
        axis = vectors[:, values.argmax()]
    else:
        odd = turn - turn.T
        axis = np.array([odd[2, 1], odd[0, 2], odd[1, 0]]) / (2 * np.sin(angle))
    return expm(-1j * angle * np.einsum("a,aij->ij", axis, momentum_matrices(l))).real
