"""Spin Hamiltonians: the lowest spin-orbit states mapped on the components of one spin."""

from __future__ import annotations

import numpy as np

from ehmo.records.arrays import FloatArray
from ehmo.records.multiplets import ComplexArray, GTensor, SpinOrbitStates, ZeroFieldSplitting

_SYMMETRIC_PAIRS = ((0, 0), (1, 1), (0, 1), (0, 2), (1, 2))
_NO_SPLITTING_PER_CM = 1e-6
_SAME_SQUARED_G = 1e-8


def spin_matrices(two_s: int) -> ComplexArray:
    """Matrices of S_x, S_y, S_z among M_S = S, S-1, .., -S.

    Parameters
    ----------
    two_s : int
        2S.

    Returns
    -------
    matrices : (3, two_s + 1, two_s + 1) ndarray of complex
    """
    spin = two_s / 2
    m = spin - np.arange(two_s + 1)
    raising = np.diag(np.sqrt(spin * (spin + 1) - m[1:] * (m[1:] + 1)), 1).astype(np.complex128)
    lowering = raising.conj().T
    return np.array([(raising + lowering) / 2, (raising - lowering) / 2j, np.diag(m)])


def effective_hamiltonian(
    states: SpinOrbitStates, model: FloatArray, moments: ComplexArray
) -> tuple[ComplexArray, ComplexArray, float]:
    """Lowest spin-orbit states as operators among the components of the ground term.

    Parameters
    ----------
    states : SpinOrbitStates
    model : (n_states, n) ndarray
        Components M_S = S .. -S of the ground term.
    moments : (3, n, n) ndarray of complex
        L + g_e S among the n lowest states.

    Returns
    -------
    hamiltonian : (n, n) ndarray of complex
        [cm^-1]
    moments : (3, n, n) ndarray of complex
    purity : float
        Smallest part of the states that lies in the model space.

    References
    ----------
    .. [1] des-cloizeaux-1960: J. des Cloizeaux, Nucl. Phys. 20, 321 (1960) (symmetric orthonormalisation of the
       projected states; from memory).
    """
    n = model.shape[1]
    left, singular, right = np.linalg.svd(model.T @ states.vectors[:, :n])
    turn = left @ right
    hamiltonian = (turn * states.energies_per_cm[:n]) @ turn.conj().T
    return hamiltonian, turn @ moments @ turn.conj().T, float(singular.min() ** 2)


def spin_splitting(hamiltonian: ComplexArray, purity: float = 1.0) -> ZeroFieldSplitting:
    """D and E of an effective matrix.

    Parameters
    ----------
    hamiltonian : (2S+1, 2S+1) ndarray of complex
        Among M_S = S .. -S, S >= 1 [cm^-1].
    purity : float
        Passed on.

    Returns
    -------
    splitting : ZeroFieldSplitting

    References
    ----------
    .. [1] abragam-1970: A. Abragam, B. Bleaney, Electron Paramagnetic Resonance of Transition Ions, Oxford 1970
       (from memory).
    """
    two_s = len(hamiltonian) - 1
    spin = two_s / 2
    s = spin_matrices(two_s)
    unit = np.eye(two_s + 1)
    products = (s[:, None] @ s[None] + s[None] @ s[:, None]) / 2
    # Traceless symmetric D_ab: five numbers, D_zz = -D_xx - D_yy.
    patterns = [_traceless(a, b) for a, b in _SYMMETRIC_PAIRS]
    operators = np.array([unit, *(np.tensordot(pattern, products, axes=2) for pattern in patterns)])
    columns = operators.reshape(len(operators), -1).T
    design = np.concatenate([columns.real, columns.imag])
    target = np.concatenate([hamiltonian.real.ravel(), hamiltonian.imag.ravel()])
    solution = np.linalg.lstsq(design, target, rcond=None)[0]
    rest = target - design @ solution
    tensor = np.tensordot(solution[1:], np.array(patterns), axes=1)
    D, E, axes = _principal_splitting(tensor)
    residual = float(np.linalg.norm(rest) / np.sqrt(two_s + 1))
    return ZeroFieldSplitting(spin, D, E, axes, residual, purity)


def _traceless(a: int, b: int) -> FloatArray:
    pattern = np.zeros((3, 3))
    pattern[a, b] = pattern[b, a] = 1
    if a == b:
        pattern[2, 2] = -1
    return pattern


def _principal_splitting(tensor: FloatArray) -> tuple[float, float, FloatArray]:
    """D, E and axes with z along the largest |D_kk| and 0 <= E/D <= 1/3."""
    values, axes = _principal(tensor, _NO_SPLITTING_PER_CM)
    z = int(np.abs(values).argmax())
    x, y = (k for k in range(3) if k != z)
    D = 1.5 * float(values[z])
    E = (float(values[x]) - float(values[y])) / 2
    if abs(D) < _NO_SPLITTING_PER_CM:
        D = E = 0.0
    elif D * E < 0:
        x, y, E = y, x, -E
    return D, E, _right_handed(axes[[x, y, z]])


def g_tensor(moments: ComplexArray) -> GTensor:
    """Tensor g of an effective spin from mu_a = sum_b g_ab S_b.

    Parameters
    ----------
    moments : (3, 2S+1, 2S+1) ndarray of complex
        L + g_e S among M_S = S .. -S.

    Returns
    -------
    g : GTensor
    """
    two_s = moments.shape[1] - 1
    s = spin_matrices(two_s)
    norm = np.sum(np.abs(s[2]) ** 2)
    matrix = np.einsum("aij,bji->ab", moments, s).real / norm
    return _from_squares(two_s / 2, matrix @ matrix.T)


def doublet_g_tensor(moments: ComplexArray) -> GTensor:
    """Tensor g of a Kramers doublet as an effective spin 1/2.

    Parameters
    ----------
    moments : (3, 2, 2) ndarray of complex
        L + g_e S among the two states.

    Returns
    -------
    g : GTensor

    Notes
    -----
    The squared principal values are the eigenvalues of G_ab = 2 sum_ij <i|mu_a|j><j|mu_b|i>.

    References
    ----------
    .. [1] gerloch-1975: M. Gerloch, R. F. McMeeking, J. Chem. Soc., Dalton Trans., 2443 (1975) (from memory).
    """
    return _from_squares(0.5, 2 * np.einsum("aij,bji->ab", moments, moments).real)


def _from_squares(spin: float, squares: FloatArray) -> GTensor:
    values, axes = _principal(squares, _SAME_SQUARED_G)
    return GTensor(spin, np.sqrt(np.maximum(values, 0)), _right_handed(axes))


def _principal(tensor: FloatArray, same: float) -> tuple[FloatArray, FloatArray]:
    """Principal values and axes (rows); where values are the same the axes follow the coordinates."""
    values, vectors = np.linalg.eigh(tensor)
    axes = vectors.T
    low, high = values[1] - values[0] < same, values[2] - values[1] < same
    if low and high:
        return np.full(3, values.mean()), np.eye(3)
    if low or high:
        pair, single = ([0, 1], 2) if low else ([1, 2], 0)
        values[pair] = values[pair].mean()
        plane = np.eye(3) - np.outer(axes[single], axes[single])
        # x before y before z among those that lie about as near to the plane: rounding must not choose.
        lengths = np.diagonal(plane)
        nearest = plane[int((lengths > lengths.max() - 1e-3).argmax())]
        axes[pair[0]] = nearest / np.linalg.norm(nearest)
        axes[pair[1]] = np.cross(axes[single], axes[pair[0]])
    return values, axes


def _right_handed(axes: FloatArray) -> FloatArray:
    """Rows turned to a right-handed set, each x and z pointing along its largest component."""
    fixed = axes.copy()
    for row in (0, 2):
        fixed[row] *= np.sign(fixed[row, np.abs(fixed[row]).argmax()])
    if np.linalg.det(fixed) < 0:
        fixed[1] *= -1
    return fixed
