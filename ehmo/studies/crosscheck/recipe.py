"""The minimal-basis run that a report is set beside: what PySCF is asked to do, and in which order.

Basis: the minimal contraction of ANO-RCC, inner shells and the metal's outer p shell included, one choice for all
elements up to curium; it is contracted for a relativistic Hamiltonian, hence the spin-free one-electron X2C.
Coulomb and exchange by density fitting. Convergence: DIIS from the minimal-basis guess, then second-order steps,
then a smeared start followed by second-order steps; what converges is tested for internal stability.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any, Final

import numpy as np

from ehmo.conventions import ELEMENT_SYMBOLS
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.crosscheck import Theory
from ehmo.units import BOHR_A

RECIPE: Final = "ehmo minimal-basis recipe 1"
"""Name and version; results of another version are not taken from the cache."""

DIIS_CYCLES: Final = 60
NEWTON_CYCLES: Final = 60
FOLLOWED: Final = 3
"""How often an unstable solution is followed downhill."""

_CONTRACTIONS: Final = (
    (2, "1s"),
    (10, "2s1p"),
    (18, "3s2p"),
    (20, "4s3p"),
    (36, "4s3p1d"),
    (38, "5s4p1d"),
    (54, "5s4p2d"),
    (56, "6s5p2d"),
    (86, "6s5p3d1f"),
    (88, "7s6p3d1f"),
    (96, "7s6p4d2f"),
)
_FUNCTIONAL: Final[dict[Theory, str | None]] = {"pbe": "pbe", "b3lyp": "b3lyp", "hf": None}
_ENERGY_TOLERANCE = 1e-10  # populations are of first order in the error of the density: far below PySCF's default
_GRADIENT_TOLERANCE = 1e-6
_FALL = 1e-6  # an energy must fall by this to count as lower [hartree]
_SMEARING = 0.02  # of the smeared start [hartree]
_COARSE_GRID = 0
_WORKING_GRID = 1
_SAID_EVERY = 5

Say = Callable[[str], None]


@dataclass(frozen=True, slots=True, eq=False)
class Job:
    """Input of one run.

    Attributes
    ----------
    symbols : tuple of str
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].
    charge, unpaired_electrons : int
    theory : {"pbe", "b3lyp", "hf"}
    """

    symbols: tuple[str, ...]
    positions_A: FloatArray
    charge: int
    unpaired_electrons: int
    theory: Theory


class NotConvergedError(Exception):
    """No step of the recipe converged; carries what was tried."""

    def __init__(self, tried: list[str]) -> None:
        super().__init__("; ".join(tried))
        self.tried = tried


def minimal_contraction(symbol: str) -> str | None:
    """Minimal contraction of ANO-RCC, such as ``4s3p1d``; None beyond curium.

    Parameters
    ----------
    symbol : str
        Chemical symbol.

    Examples
    --------
    >>> minimal_contraction("V"), minimal_contraction("O"), minimal_contraction("U"), minimal_contraction("Fm")
    ('4s3p1d', '2s1p', '7s6p4d2f', None)

    Returns
    -------
    contraction : str or None

    References
    ----------
    .. [1] roos-2005: B. O. Roos et al., J. Phys. Chem. A 109, 6575 (2005).
    """
    number = ELEMENT_SYMBOLS.index(symbol) + 1
    return next((contraction for last, contraction in _CONTRACTIONS if number <= last), None)


def run_recipe(job: Job, say: Say) -> dict[str, Any]:
    """Converged orbitals, densities and how they were reached.

    Parameters
    ----------
    job : Job
    say : callable
        Called with one line on each step.

    Returns
    -------
    outcome : dict
        Arrays of the run (see `ReferenceRun`), and ``tried``, ``doubts``, ``energy_hartree``, ``spin_squared``.

    Raises
    ------
    NotConvergedError
        If no step converged.
    """
    molecule = _molecule(job)
    say(f"{molecule.nao} functions, {molecule.nelectron} electrons; integrals")
    field = _field(molecule, job)
    tried: list[str] = []
    settled = _converged(field, tried, say)
    settled, doubts = _made_stable(settled, tried, say)
    shells, order = _functions(molecule)
    overlap = molecule.intor("int1e_ovlp")[np.ix_(order, order)]
    densities = _spin_pair(settled.make_rdm1(), 0.5)
    potential = _spin_pair(settled.get_veff(dm=settled.make_rdm1()), 1.0)
    mean_fock = (settled.get_hcore() + potential.mean(axis=0))[np.ix_(order, order)]
    spin_squared = float(settled.spin_square()[0]) if _unrestricted(settled) else _pure(job.unpaired_electrons)
    return {
        "shells": shells,
        "overlap": overlap,
        "densities": densities[:, order][:, :, order],
        "mean_fock": mean_fock,
        "energy_hartree": float(settled.e_tot),
        "spin_squared": spin_squared,
        "tried": tried,
        "doubts": doubts,
    }


def _molecule(job: Job) -> Any:
    from pyscf import gto

    # In bohr, so that PySCF's own conversion factor has no say.
    atoms = [(symbol, place.tolist()) for symbol, place in zip(job.symbols, job.positions_A / BOHR_A, strict=True)]
    basis = {symbol: f"ano@{minimal_contraction(symbol)}" for symbol in set(job.symbols)}
    return gto.M(atom=atoms, unit="Bohr", basis=basis, charge=job.charge, spin=job.unpaired_electrons, verbose=0)


def _field(molecule: Any, job: Job) -> Any:
    """Mean field with its fitted integrals built, so that no cycle evaluates them again."""
    from pyscf import dft, scf

    functional = _FUNCTIONAL[job.theory]
    if functional is None:
        field = (scf.ROHF if job.unpaired_electrons else scf.RHF)(molecule).sfx2c1e()
    else:
        field = (dft.UKS if job.unpaired_electrons else dft.RKS)(molecule).sfx2c1e()
        field.xc = functional
        field.grids.level = _WORKING_GRID
    field = field.density_fit()
    field.conv_tol = _ENERGY_TOLERANCE
    field.conv_tol_grad = _GRADIENT_TOLERANCE
    field.max_cycle = DIIS_CYCLES
    field.with_df.build()
    return field


def _converged(field: Any, tried: list[str], say: Say) -> Any:
    """DIIS, then second-order steps from its last orbitals, then the same from a smeared start."""
    from pyscf import scf

    field.init_guess = "minao"
    field.callback = _reporter("DIIS", say)
    field.kernel()
    if _noted(field, f"DIIS from the minimal-basis guess, {field.cycles} cycles", tried):
        return field
    second = _second_order(field, field.mo_coeff, field.mo_occ, say)
    if _noted(second, "second-order steps from its last orbitals", tried):
        return second
    smeared = scf.addons.smearing(field.copy(), sigma=_SMEARING, method="fermi", fix_spin=True)
    smeared.callback = _reporter("smeared", say)
    smeared.conv_tol, smeared.conv_tol_grad = 1e-6, 1e-3
    smeared.kernel()
    filling = field.get_occ(smeared.mo_energy, smeared.mo_coeff)
    second = _second_order(field, smeared.mo_coeff, filling, say)
    if _noted(second, f"second-order steps from a start smeared by {_SMEARING} hartree", tried):
        return second
    raise NotConvergedError(tried)


def _second_order(field: Any, orbitals: Any, filling: Any, say: Say) -> Any:
    second = field.newton()
    second.max_cycle = NEWTON_CYCLES
    second.callback = _reporter("second order", say)
    second.kernel(orbitals, filling)
    plain = field.copy()
    for name in ("mo_coeff", "mo_occ", "mo_energy", "e_tot", "converged"):
        setattr(plain, name, getattr(second, name))
    return plain


def _noted(field: Any, step: str, tried: list[str]) -> bool:
    tried.append(f"{step}: {'converged' if field.converged else 'not converged'} (energy {field.e_tot:.6f} hartree)")
    return bool(field.converged)


def _reporter(name: str, say: Say) -> Callable[[dict[str, Any]], None]:
    seen = 0

    def report(inner: dict[str, Any]) -> None:
        nonlocal seen
        seen += 1
        if seen % _SAID_EVERY == 1:
            gradient = inner.get("norm_gorb")
            end = "" if gradient is None else f", gradient {gradient:.1e}"
            say(f"{name}, cycle {seen}: energy {inner.get('e_tot', np.nan):.6f} hartree{end}")

    return report


def _made_stable(field: Any, tried: list[str], say: Say) -> tuple[Any, list[str]]:
    """Lowest solution reached by following instabilities, and what remains to doubt."""
    doubts: list[str] = []
    for _ in range(FOLLOWED):
        say("internal stability")
        rotated, stable = _internal_stability(field)
        if stable:
            tried.append("internally stable")
            break
        second = _second_order(field, rotated, field.mo_occ, say)
        fell = bool(second.converged) and second.e_tot < field.e_tot - _FALL
        _noted(second, "unstable; second-order steps from the rotated orbitals", tried)
        if not fell:
            tried.append("the coarse grid calls it unstable, but no lower solution was found on the working grid")
            break
        field = second
    else:
        doubts.append(f"the solution was still unstable after {FOLLOWED} followed instabilities")
    if not _unrestricted(field) and not field.mol.spin:
        say("stability against unpairing")
        if not _stable_against_unpairing(field):
            doubts.append("the closed shell is unstable against unpairing: a lower, spin-polarised solution exists")
    return field, doubts


def _internal_stability(field: Any) -> tuple[Any, bool]:
    rotated, _, stable, _ = _on_coarse_grid(field).stability(return_status=True)
    return rotated, bool(stable)


def _stable_against_unpairing(field: Any) -> bool:
    # PySCF's status here is that of restricted against unrestricted orbitals.
    _, _, _, stable = _on_coarse_grid(field).stability(internal=False, external=True, return_status=True)
    return bool(stable)


def _on_coarse_grid(field: Any) -> Any:
    """Copy with a coarse grid: on the working grid the test would outlast the calculation."""
    copied = field.copy()
    if hasattr(field, "grids"):
        from pyscf import dft

        copied.grids = dft.gen_grid.Grids(field.mol)
        copied.grids.level = _COARSE_GRID
        copied.grids.build()
    return copied


def _unrestricted(field: Any) -> bool:
    return np.ndim(field.mo_coeff) == 3


def _pure(unpaired: int) -> float:
    return unpaired / 2 * (unpaired / 2 + 1)


def _spin_pair(matrix: Any, share: float) -> FloatArray:
    """(2, n, n) alpha and beta; a closed shell gives each spin its share of the one matrix."""
    values = np.asarray(matrix, dtype=np.float64)
    return values if values.ndim == 3 else np.stack([share * values, share * values])


def _functions(molecule: Any) -> tuple[IntArray, IntArray]:
    """Shells as rows (atom, n, l), and the place in PySCF's order of each function in the order m = -l..l."""
    rows: list[tuple[int, int, int]] = []
    order: list[int] = []
    counted: dict[tuple[int, int], int] = {}
    for atom, l in _contracted_shells(molecule):
        below = counted.get((atom, l), 0)
        counted[atom, l] = below + 1
        rows.append((atom, l + 1 + below, l))
        start = len(order)
        # PySCF keeps p as x, y, z and all others as m = -l..l.
        order += [start + k for k in ((1, 2, 0) if l == 1 else range(2 * l + 1))]
    return np.array(rows, dtype=np.intp), np.array(order, dtype=np.intp)


def _contracted_shells(molecule: Any) -> Iterator[tuple[int, int]]:
    for shell in range(molecule.nbas):
        for _ in range(molecule.bas_nctr(shell)):
            yield int(molecule.bas_atom(shell)), int(molecule.bas_angular(shell))
