"""Magnetic moment, zero-field splitting and g tensor from the spin-orbit states of an open shell."""

from __future__ import annotations

import numpy as np

from ehmo.analysis.multiplets.effective_spin import doublet_g_tensor, effective_hamiltonian, g_tensor, spin_splitting
from ehmo.analysis.multiplets.momentum import spin_momentum, total_orbital_momentum
from ehmo.analysis.multiplets.spin_orbit import SpinMultiplet, ground_multiplet, spin_orbit_states
from ehmo.records.arrays import FloatArray
from ehmo.records.multiplets import (
    ComplexArray,
    ElectronRepulsion,
    GTensor,
    Magnetism,
    SpinOrbitStates,
    ZeroFieldSplitting,
)
from ehmo.units import BOLTZMANN_PER_CM_K, ELECTRON_G

ROOM_TEMPERATURE_K = 298.15

LEAST_PURITY = 0.7
"""Part of the lowest spin-orbit states in the ground term below which no spin Hamiltonian is given."""

_DEGENERATE_PER_CM = 1.0
_RARE = 1e-14  # Boltzmann factors below this do not show in a moment


def magnetic_properties(
    ligand_field_eV: FloatArray,
    n_electrons: int,
    repulsion: ElectronRepulsion | None,
    zeta_per_cm: float,
    momentum: ComplexArray | None = None,
    temperature_K: float = ROOM_TEMPERATURE_K,
) -> Magnetism:
    """Moments, zero-field splitting and g tensor of one open shell.

    Parameters
    ----------
    ligand_field_eV, n_electrons, repulsion, zeta_per_cm, momentum
        As in `spin_orbit_states`.
    temperature_K : float
        Temperature of the effective moment [K].

    Returns
    -------
    magnetism : Magnetism
        Axes are those of the harmonics of the field.

    Raises
    ------
    MultipletError
        For an empty or full shell, f4 to f10, or a missing repulsion.
    ValueError
        If the field, the momentum or the temperature cannot be used.
    """
    states = spin_orbit_states(ligand_field_eV, n_electrons, repulsion, zeta_per_cm, momentum)
    ground = ground_multiplet(ligand_field_eV, n_electrons, repulsion)
    operators = moment_operators(states)
    energies, degeneracies = states.levels
    two_s = ground.two_s
    splitting, spin_g, withheld = _spin_hamiltonian(states, ground, operators)
    has_doublet = n_electrons % 2 == 1 and degeneracies[0] == 2
    doublet_g = doublet_g_tensor(_among(states, operators, 2)) if has_doublet else None
    chosen = doublet_g if spin_g is None else spin_g
    if chosen is None:
        reason = "no Kramers doublet is lowest" if n_electrons % 2 else "even number of electrons and no effective spin"
        withheld = (*withheld, f"g tensor: {reason}")
    return Magnetism(
        temperature_K=temperature_K,
        spin=two_s / 2,
        spin_only_moment=spin_only_moment(two_s),
        effective_moment=float(_thermal_moment(states, operators, temperature_K)),
        zero_field_splitting=splitting,
        g_tensor=chosen,
        doublet_g_tensor=doublet_g,
        level_energies_per_cm=energies,
        level_degeneracies=degeneracies,
        withheld=withheld,
    )


def _spin_hamiltonian(
    states: SpinOrbitStates, ground: SpinMultiplet, operators: ComplexArray
) -> tuple[ZeroFieldSplitting | None, GTensor | None, tuple[str, ...]]:
    """Splitting and g of the ground spin, with the reason where there are none."""
    if ground.two_s < 2:
        reason = "the ground term is a singlet" if ground.two_s == 0 else "S = 1/2 does not split in zero field"
        return None, None, (f"zero-field splitting: {reason}",)
    if ground.gap_per_cm < _DEGENERATE_PER_CM:
        return None, None, ("zero-field splitting: the ground term is orbitally degenerate",)
    size = ground.two_s + 1
    hamiltonian, moments, purity = effective_hamiltonian(states, ground.vectors, _among(states, operators, size))
    if purity < LEAST_PURITY:
        reason = f"only {purity:.0%} of the lowest spin-orbit states lies in the ground term"
        return None, None, (f"zero-field splitting: {reason}",)
    return spin_splitting(hamiltonian, purity), g_tensor(moments), ()


def spin_only_moment(unpaired: int) -> float:
    """Moment of n unpaired spins, [n (n + 2)]^(1/2) [Bohr magneton].

    Examples
    --------
    >>> round(spin_only_moment(3), 2)
    3.87

    References
    ----------
    .. [1] van-vleck-1932: J. H. Van Vleck, The Theory of Electric and Magnetic Susceptibilities, Oxford 1932
       (from memory).
    """
    return float(np.sqrt(unpaired * (unpaired + 2)))


def moment_operators(states: SpinOrbitStates) -> ComplexArray:
    """Matrices of L + g_e S among the determinants of the shell.

    Parameters
    ----------
    states : SpinOrbitStates

    Returns
    -------
    operators : (3, n_states, n_states) ndarray of complex
        [Bohr magneton], with the sign of the spin, not of the electron's charge.
    """
    orbital = total_orbital_momentum(states.orbital_momentum, states.n_electrons)
    return orbital + ELECTRON_G * spin_momentum(states.l, states.n_electrons)


def _among(states: SpinOrbitStates, operators: ComplexArray, n_lowest: int) -> ComplexArray:
    """Operators among the lowest states."""
    kets = states.vectors[:, :n_lowest]
    result: ComplexArray = kets.conj().T @ (operators @ kets)
    return result


def effective_moment(states: SpinOrbitStates, temperature_K: float | FloatArray) -> FloatArray:
    """Effective magnetic moment in a weak field, mean over all directions.

    Parameters
    ----------
    states : SpinOrbitStates
    temperature_K : float or ndarray
        Positive [K].

    Returns
    -------
    moment : ndarray
        mu_eff, of the shape of the temperature [Bohr magneton].

    Raises
    ------
    ValueError
        If a temperature is not positive and finite.

    Notes
    -----
    mu_eff^2 = sum_a sum_ij p_i |<i|mu_a|j>|^2 f(E_j - E_i) with f(x) = (1 - exp(-x/kT)) / (x/kT): the first-order
    part of Van Vleck's formula is f(0) = 1, the second-order part the sum over pairs of levels. With
    p_i f(E_j - E_i) = p_j f(E_i - E_j) the sum needs only pairs with one occupied state.

    References
    ----------
    .. [1] van-vleck-1932: J. H. Van Vleck, The Theory of Electric and Magnetic Susceptibilities, Oxford 1932
       (from memory).
    """
    return _thermal_moment(states, moment_operators(states), temperature_K)


def _thermal_moment(states: SpinOrbitStates, operators: ComplexArray, temperature_K: float | FloatArray) -> FloatArray:
    """Effective moment from the moment operators; see `effective_moment`."""
    temperatures = np.asarray(temperature_K, dtype=np.float64)
    if not (np.isfinite(temperatures).all() and (temperatures > 0).all()):
        raise ValueError(f"temperature is {temperature_K} K, expected a positive number")
    energies = states.energies_per_cm
    beta = 1 / (BOLTZMANN_PER_CM_K * temperatures.ravel())
    factors = np.exp(-beta[:, None] * energies)
    populations = factors / factors.sum(axis=1, keepdims=True)
    occupied = int((populations > _RARE).any(axis=0).sum())
    kets = operators @ states.vectors[:, :occupied]
    squares = np.sum(np.abs(states.vectors.conj().T @ kets) ** 2, axis=0)
    # The sum is symmetric in i and j: pairs with one empty state are met once and count twice.
    squares[occupied:] *= 2
    result = np.empty(len(beta))
    for place, inverse in enumerate(beta):
        x = inverse * (energies[:, None] - energies[:occupied])
        # Towards x = 0 the quotient is 1 - x/2.
        small = np.abs(x) < 1e-8
        safe = np.where(small, 1.0, x)
        weights = np.where(small, 1 - x / 2, -np.expm1(-safe) / safe)
        result[place] = np.sum((squares * weights) @ populations[place, :occupied])
    return np.sqrt(result).reshape(temperatures.shape)
