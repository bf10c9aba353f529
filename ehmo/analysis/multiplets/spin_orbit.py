"""Levels of an open shell with spin-orbit coupling, in all its determinants."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ehmo.analysis.multiplets.determinants import fermion_space, shell_repulsion, shell_space
from ehmo.analysis.multiplets.momentum import SPIN_HALF, orbital_momentum, spin_momentum
from ehmo.analysis.multiplets.shells import check_shell, field_per_cm, slater_vector
from ehmo.analysis.multiplets.spin_adapted import SpinSpace, spin_spaces
from ehmo.records.arrays import FloatArray
from ehmo.records.multiplets import ComplexArray, ElectronRepulsion, SpinOrbitStates


def spin_orbit_states(
    ligand_field_eV: FloatArray,
    n_electrons: int,
    repulsion: ElectronRepulsion | None,
    zeta_per_cm: float,
    momentum: ComplexArray | None = None,
) -> SpinOrbitStates:
    """Eigenstates of ligand field, repulsion and spin-orbit coupling zeta sum_i l_i s_i.

    Parameters
    ----------
    ligand_field_eV : (5, 5) or (7, 7) ndarray
        Ligand field among the real harmonics m = -l..l [eV].
    n_electrons : int
    repulsion : ElectronRepulsion or None
        None is enough for one electron or one hole.
    zeta_per_cm : float
        One-electron spin-orbit constant of the free ion [cm^-1].
    momentum : (3, 2l+1, 2l+1) ndarray of complex, optional
        Hermitian matrices of l_x, l_y, l_z, reduced for covalency; by default those of the free ion. They act in
        the spin-orbit coupling and in the magnetic moment alike. `momentum.reduced_momentum` makes them from metal
        shares; a factor k of both is k times `momentum.orbital_momentum`.

    Returns
    -------
    states : SpinOrbitStates

    Raises
    ------
    MultipletError
        For an empty or full shell, f4 to f10, or a missing repulsion.
    ValueError
        If the field or the momentum has the wrong shape or is not hermitian.

    References
    ----------
    .. [1] griffith-1961: J. S. Griffith, The Theory of Transition-Metal Ions, Cambridge 1961 (from memory).
    """
    field = field_per_cm(ligand_field_eV)
    l = (len(field) - 1) // 2
    check_shell(l, n_electrons)
    momentum = _checked_momentum(l, momentum)
    integrals = slater_vector(l, n_electrons, repulsion)
    coupling = np.sum([np.kron(spin, orbital) for spin, orbital in zip(SPIN_HALF, momentum, strict=True)], axis=0)
    one_electron: ComplexArray = np.kron(np.eye(2), field) + zeta_per_cm * coupling
    matrix = shell_space(l, n_electrons).one_body(one_electron)
    matrix += np.tensordot(integrals, shell_repulsion(l, n_electrons), axes=1)
    energies, vectors = np.linalg.eigh(matrix)
    vectors.flags.writeable = False
    return SpinOrbitStates(l, n_electrons, energies - energies[0], vectors, momentum)


def _checked_momentum(l: int, momentum: ComplexArray | None) -> ComplexArray:
    if momentum is None:
        return orbital_momentum(l)
    n_orbitals = 2 * l + 1
    matrices = np.asarray(momentum, dtype=np.complex128)
    if matrices.shape != (3, n_orbitals, n_orbitals):
        raise ValueError(f"momentum has shape {matrices.shape}, expected {(3, n_orbitals, n_orbitals)}")
    if not np.abs(matrices - matrices.conj().swapaxes(1, 2)).max() < 1e-8:
        raise ValueError("momentum is not hermitian")
    return matrices


@dataclass(frozen=True, slots=True, eq=False)
class SpinMultiplet:
    """The lowest spin-free state with its 2S + 1 spin components.

    Attributes
    ----------
    two_s : int
    vectors : (n_states, 2S + 1) ndarray
        Columns M_S = S, S-1, .., -S in the determinants of the shell.
    gap_per_cm : float
        Distance to the next spin-free state of the same spin; 0 if the ground state is orbitally degenerate
        [cm^-1].
    """

    two_s: int
    vectors: FloatArray
    gap_per_cm: float


def ground_multiplet(
    ligand_field_eV: FloatArray, n_electrons: int, repulsion: ElectronRepulsion | None
) -> SpinMultiplet:
    """Ground state without spin-orbit coupling, as spin components.

    Parameters
    ----------
    ligand_field_eV : (5, 5) or (7, 7) ndarray
        [eV]
    n_electrons : int
    repulsion : ElectronRepulsion or None

    Returns
    -------
    multiplet : SpinMultiplet
    """
    field = field_per_cm(ligand_field_eV)
    l = (len(field) - 1) // 2
    check_shell(l, n_electrons)
    integrals = slater_vector(l, n_electrons, repulsion)
    solved = []
    for space in spin_spaces(l, n_electrons):
        matrix = space.one_body(field) + np.tensordot(integrals, space.repulsion, axes=1)
        solved.append((space, *np.linalg.eigh(matrix)))
    space, energies, vectors = min(solved, key=lambda part: float(part[1][0]))
    gap = float(energies[1] - energies[0]) if len(energies) > 1 else np.inf
    return SpinMultiplet(space.two_s, _spin_components(space, vectors[:, 0]), gap)


def _spin_components(space: SpinSpace, vector: FloatArray) -> FloatArray:
    """Components M_S = S .. -S of a function of one spin, made by lowering."""
    n_orbitals = 2 * space.l + 1
    shell = shell_space(space.l, space.n_electrons)
    alpha = fermion_space(n_orbitals, space.n_alpha).strings
    beta = fermion_space(n_orbitals, space.n_beta).strings
    places = [shell.index[(*a, *(n_orbitals + mode for mode in b))] for a in alpha for b in beta]
    highest = np.zeros(shell.size)
    highest[places] = space.vectors @ vector
    columns = [highest]
    s_x, s_y, _ = spin_momentum(space.l, space.n_electrons)
    lowering = (s_x - 1j * s_y).real
    for _ in range(space.two_s):
        lowered = lowering @ columns[-1]
        columns.append(lowered / np.linalg.norm(lowered))
    return np.array(columns).T
