"""Bands of a crystal: eigenproblems on a mesh of k-points, with fixed or self-consistent charges.

S(k) and H(k) exist for a few k-points at a time; the orbitals and the shares of the shells are kept for each k.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from scipy.linalg import lapack

from ehmo.conventions import atom_label
from ehmo.electronic.band_filling import SMEARING_EV, fill_bands
from ehmo.electronic.hamiltonian import shell_factors
from ehmo.electronic.mixing import AndersonMixer
from ehmo.errors import ConvergenceError, OverlapError
from ehmo.records.arrays import FloatArray
from ehmo.records.basis import Basis
from ehmo.records.bloch import BlochSum, KMesh, MatrixArray
from ehmo.records.crystal_electronic import BandFilling, BandState, CellElectrons

SMALLEST_BLOCH_EIGENVALUE = 1e-6
"""Below this the Bloch functions of a k-point count as linearly dependent."""

CHARGE_TOLERANCE = 1e-10
"""Largest change of a charge at convergence: band energies follow charges, and are compared between cells [e]."""

LAST_TOLERANCE = 1e-8
"""The same after the last pass allowed: as much as in a molecule [e]."""

_FILLING_TURNS = 4
"""Changes between whole levels and a smeared distribution after which the distribution stays."""

_WIDE_EV = 0.3
_CALM = 0.02
"""It starts as wide as this [eV] and narrows once the charges change by less than that [e]: in narrow bands a
distribution of the final width is as sharp as whole levels."""


@dataclass(frozen=True, slots=True, eq=False)
class BlochProblem:
    """H(k) and S(k) of a crystal.

    Attributes
    ----------
    basis : Basis
        Functions of one cell.
    overlap : BlochSum
        S(k).
    scaled : BlochSum or None
        K S(k) with K of each channel and distance, zero on the diagonal of the home cell; None for one K.
    scaled_factor, overlap_factor : (n_ao, n_ao) ndarray
        What multiplies the elements of `scaled` and of `overlap` in H [eV].
    diagonal_eV : (n_ao,) ndarray
        Added to the diagonal [eV].
    """

    basis: Basis
    overlap: BlochSum
    scaled: BlochSum | None
    scaled_factor: FloatArray
    overlap_factor: FloatArray
    diagonal_eV: FloatArray

    def matrices(self, points: FloatArray, potential_eV: FloatArray) -> Iterator[tuple[MatrixArray, MatrixArray]]:
        """S(k) and H(k) at fractional k-points, in the potential [eV] on each atom."""
        half = 0.5 * potential_eV[self.basis.atom_of]
        factor = self.overlap_factor + (half[:, None] + half)
        diagonal = slice(None, None, len(self.basis) + 1)
        if self.scaled is None:
            for S in self.overlap.sums(points):
                H = S * factor
                H.T.flat[diagonal] += self.diagonal_eV
                yield S, H
        else:
            for S, scaled in zip(self.overlap.sums(points), self.scaled.sums(points), strict=True):
                H = S * factor + scaled * self.scaled_factor
                H.T.flat[diagonal] += self.diagonal_eV
                yield S, H


def bloch_problem(
    basis: Basis, overlap: BlochSum, K: float, *, weighting: bool = True, scaled: BlochSum | None = None
) -> BlochProblem:
    """Wolfsberg-Helmholz Hamiltonian of a crystal; its blocks go by the same rule as in a molecule.

    Parameters
    ----------
    basis : Basis
        Functions of one cell.
    overlap : BlochSum
        S(k).
    K : float
        Wolfsberg-Helmholz constant.
    weighting : bool
        Whether K is weighted against counter-intuitive mixing.
    scaled : BlochSum, optional
        K S(k) with K of each channel and distance; replaces `K` times `overlap`.

    Returns
    -------
    problem : BlochProblem

    References
    ----------
    .. [1] wolfsberg-1952: M. Wolfsberg, L. Helmholz, J. Chem. Phys. 20, 837 (1952).
    .. [2] ammeter-1978: J. H. Ammeter, H.-B. Bürgi, J. C. Thibeault, R. Hoffmann, J. Am. Chem. Soc. 100, 3686 (1978).
    """
    with_K, alone = shell_factors(basis, weighting)
    kinds = basis.type_of[:, None], basis.type_of
    h = basis.type_h_ii_eV[basis.type_of]
    if scaled is None:
        # A function overlaps with its own images too: K h_ii S for these, h_ii alone for itself.
        return BlochProblem(basis, overlap, None, np.zeros((0, 0)), (K * with_K + alone)[kinds], h * (1 - K))
    return BlochProblem(basis, overlap, scaled, with_K[kinds], alone[kinds], h)


def fixed_bands(problem: BlochProblem, mesh: KMesh, electrons: CellElectrons) -> BandState:
    """Bands of the Hamiltonian as it stands.

    Parameters
    ----------
    problem : BlochProblem
    mesh : KMesh
    electrons : CellElectrons
        Electrons per cell.

    Returns
    -------
    state : BandState

    Raises
    ------
    OverlapError
        If the Bloch functions of a k-point are linearly dependent.
    """
    smallest = smallest_overlap_eigenvalue(problem, mesh.points)
    bands = _Bands.solved(problem, mesh, np.zeros(len(problem.basis.symbols)))
    filling = fill_bands(bands.energies, mesh.weights, electrons)
    charges = bands.charges(filling)
    energy = bands.energy(filling)
    return bands.state(filling, energy, charges, "fixed", 1, 0.0, smallest)


def self_consistent_bands(
    problem: BlochProblem,
    mesh: KMesh,
    electrons: CellElectrons,
    interaction_eV: FloatArray,
    ion_charges: FloatArray,
    *,
    start_charges: FloatArray | None = None,
    max_iterations: int = 100,
) -> BandState:
    """Bands in the potential of the charges that they give, and of point charges.

    Parameters
    ----------
    problem : BlochProblem
    mesh : KMesh
    electrons : CellElectrons
        Electrons per cell.
    interaction_eV : (n_atoms + n_ions, n_atoms + n_ions) ndarray
        lambda gamma summed over the lattice; see `lattice_interaction` [eV].
    ion_charges : (n_ions,) ndarray
        Point charges without functions [e].
    start_charges : (n_atoms,) ndarray, optional
        First guess, such as the charges of another mesh; zero by default [e].
    max_iterations : int
        Passes over the mesh allowed. If the filling goes back and forth between whole levels and a smeared
        distribution, or the first half of the passes does not settle the charges, the rest is spent with smeared
        filling.

    Returns
    -------
    state : BandState

    Raises
    ------
    OverlapError
        If the Bloch functions of a k-point are linearly dependent.
    ConvergenceError
        If the charges still change by more than `CHARGE_TOLERANCE`.
    """
    smallest = smallest_overlap_eigenvalue(problem, mesh.points)
    basis = problem.basis
    n_atoms = len(basis.symbols)
    mixer = AndersonMixer(np.zeros(n_atoms) if start_charges is None else start_charges)
    residual, turns, smeared, calm = np.inf, 0, False, False
    for iteration in range(1, max_iterations + 1):
        all_charges = np.concatenate([mixer.value, ion_charges])
        potential = -(interaction_eV @ all_charges)[:n_atoms]
        bands = _Bands.solved(problem, mesh, potential)
        always = turns >= _FILLING_TURNS or iteration > max_iterations // 2
        calm = calm or residual < _CALM
        width = SMEARING_EV if calm or not always else _WIDE_EV
        filling = fill_bands(bands.energies, mesh.weights, electrons, smear=always, width_eV=width)
        turns += iteration > 1 and smeared is not (filling.smearing_eV > 0)
        smeared = filling.smearing_eV > 0
        charges = bands.charges(filling)
        residual = float(np.abs(charges - mixer.value).max())
        if width == SMEARING_EV and residual < (CHARGE_TOLERANCE if iteration < max_iterations else LAST_TOLERANCE):
            settled = np.concatenate([charges, ion_charges])
            gross = basis.core_charges - charges
            energy = bands.energy(filling) - float(gross @ potential) + 0.5 * float(settled @ interaction_eV @ settled)
            return bands.state(filling, energy, charges, "self-consistent", iteration, residual, smallest)
        if turns >= _FILLING_TURNS and not always:
            mixer = AndersonMixer(mixer.value)  # steps of the other filling would mislead it
        mixer.update(charges)
    raise ConvergenceError(
        f"the charges still change by {residual:.1e} e after {max_iterations} passes over the mesh",
        mend="try a denser mesh, or --charges fixed",
    )


@dataclass(frozen=True, slots=True, eq=False)
class _Bands:
    """Levels, orbitals and shares on a mesh in one potential."""

    problem: BlochProblem
    mesh: KMesh
    potential: FloatArray
    energies: FloatArray
    coefficients: tuple[MatrixArray, ...]
    shares: FloatArray

    @classmethod
    def solved(cls, problem: BlochProblem, mesh: KMesh, potential: FloatArray) -> _Bands:
        basis = problem.basis
        n_ao = len(basis)
        energies = np.empty((len(mesh), n_ao))
        shares = np.empty((len(mesh), len(basis.shell_start), n_ao))
        coefficients = []
        for k, (S, H) in enumerate(problem.matrices(mesh.points, potential)):
            energies[k], C = solve_point(H, S, mesh.points[k], basis)
            gross = np.multiply(C.conj(), S @ C).real
            shares[k] = np.add.reduceat(gross, basis.shell_start, axis=0)
            coefficients.append(C)
        return cls(problem, mesh, potential, energies, tuple(coefficients), shares)

    def charges(self, filling: BandFilling) -> FloatArray:
        basis = self.problem.basis
        held = filling.occupations.sum(axis=0) * self.mesh.weights[:, None]
        gross = np.einsum("ksb,kb->s", self.shares, held)
        of_atoms = np.bincount(basis.shell_atom, weights=gross, minlength=len(basis.symbols))
        charges: FloatArray = basis.core_charges - of_atoms
        return charges

    def energy(self, filling: BandFilling) -> float:
        return float(np.einsum("skb,kb,k->", filling.occupations, self.energies, self.mesh.weights))

    def state(
        self,
        filling: BandFilling,
        energy: float,
        charges: FloatArray,
        model: str,
        iterations: int,
        residual: float,
        smallest: float,
    ) -> BandState:
        return BandState(
            mesh=self.mesh,
            energies_eV=self.energies,
            coefficients=self.coefficients,
            shell_shares=self.shares,
            filling=filling,
            energy_eV=energy,
            band_energy_eV=self.energy(filling),
            charges=charges,
            potential_eV=self.potential,
            charge_model=model,
            iterations=iterations,
            charge_residual=residual,
            smallest_overlap_eigenvalue=smallest,
        )


def band_energies(problem: BlochProblem, points: FloatArray, potential_eV: FloatArray) -> FloatArray:
    """Levels at any k-points, such as those of a path.

    Parameters
    ----------
    problem : BlochProblem
        Its sums must serve any k-point.
    points : (n_k, 3) ndarray
        Fractional k-points.
    potential_eV : (n_atoms,) ndarray
        Of the settled charges [eV].

    Returns
    -------
    energies : (n_k, n_ao) ndarray
        Ascending [eV].

    Raises
    ------
    OverlapError
        If the Bloch functions of a k-point are linearly dependent.
    """
    energies = np.empty((len(points), len(problem.basis)))
    for k, (S, H) in enumerate(problem.matrices(points, potential_eV)):
        _checked_eigenvalue(S, points[k], problem.basis)
        energies[k], _ = solve_point(H, S, points[k], problem.basis)
    return energies


def solve_point(H: MatrixArray, S: MatrixArray, point: FloatArray, basis: Basis) -> tuple[FloatArray, MatrixArray]:
    """Levels and orbitals of one k-point, lowest first.

    Parameters
    ----------
    H, S : (n_ao, n_ao) ndarray
        Hermitian or real symmetric, column-major; left as they are.
    point : (3,) ndarray
        The k-point, for messages.
    basis : Basis
        Names the functions in messages.

    Returns
    -------
    energies : (n_ao,) ndarray
        [eV]
    coefficients : (n_ao, n_ao) ndarray
        Columns with C^+ S C = 1.

    Raises
    ------
    OverlapError
        If S is not positive definite.
    """
    driver = lapack.zhegvd if np.iscomplexobj(H) else lapack.dsygvd
    energies, vectors, info = driver(H, S, uplo="L")
    if info:
        _checked_eigenvalue(S, point, basis)
        raise OverlapError(
            f"the eigensolver failed at k = {point_in_words(point)} (LAPACK info {info})",
            mend="check the structure for atoms too close together",
        )
    return energies, vectors


def smallest_overlap_eigenvalue(problem: BlochProblem, points: FloatArray) -> float:
    """Smallest eigenvalue of S(k) over some k-points.

    Parameters
    ----------
    problem : BlochProblem
    points : (n_k, 3) ndarray
        Fractional k-points.

    Returns
    -------
    smallest : float

    Raises
    ------
    OverlapError
        If it is below `SMALLEST_BLOCH_EIGENVALUE`: the message names the k-point and the functions.
    """
    sums = problem.overlap.sums(points)
    return min(_checked_eigenvalue(S, point, problem.basis) for S, point in zip(sums, points, strict=True))


def _checked_eigenvalue(S: MatrixArray, point: FloatArray, basis: Basis) -> float:
    driver = lapack.zheevd if np.iscomplexobj(S) else lapack.dsyevd
    eigenvalues, _, _ = driver(S, compute_v=0, lower=1)
    smallest = float(eigenvalues[0])
    if smallest >= SMALLEST_BLOCH_EIGENVALUE:
        return smallest
    parts = np.abs(np.linalg.eigh(S)[1][:, 0])
    names = ", ".join(
        f"{basis.function_label(int(i))} of {atom_label(basis.symbols[basis.atom_of[i]], int(basis.atom_of[i]))}"
        for i in np.argsort(-parts)[:3]
    )
    raise OverlapError(
        f"the Bloch functions are linearly dependent at k = {point_in_words(point)} (smallest overlap eigenvalue "
        f"{smallest:.1e}, mostly {names})",
        mend="check that these atoms are not too close, leave out counter-ions' functions, or use a set with tighter "
        "exponents for them",
    )


def point_in_words(point: FloatArray) -> str:
    """Fractional k-point as people read it.

    Examples
    --------
    >>> point_in_words(np.array([0.0, 0.5, -1 / 3]))
    '(0, 0.5, -0.333)'
    """
    return "(" + ", ".join(f"{round(float(x), 3) + 0.0:g}" for x in point) + ")"
