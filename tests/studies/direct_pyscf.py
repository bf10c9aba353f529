"""A direct PySCF script for the cross-check's tests: same recipe, its analysis written as plain loops over labels."""

from __future__ import annotations

import gc
import warnings
from contextlib import contextmanager
from dataclasses import dataclass

import numpy as np
from pyscf import dft, gto, scf
from scipy.linalg import sqrtm

from ehmo.records.fragment import Fragment

CONTRACTION = {
    **dict.fromkeys(["H"], "1s"),
    **dict.fromkeys(["N", "O"], "2s1p"),
    **dict.fromkeys(["Cl"], "3s2p"),
    **dict.fromkeys(["Ti", "V", "Cr", "Mn"], "4s3p1d"),
    **dict.fromkeys(["Mo", "Tc"], "5s4p2d"),
    **dict.fromkeys(["W", "Re", "Os"], "6s5p3d1f"),
    **dict.fromkeys(["U", "Np", "Pu"], "7s6p4d2f"),
}
VALENCE = {
    **dict.fromkeys(["Ti", "V", "Cr", "Mn"], ("4s", "4p", "3d")),
    **dict.fromkeys(["Mo", "Tc"], ("5s", "5p", "4d")),
    **dict.fromkeys(["W", "Re", "Os"], ("6s", "6p", "5d")),
    **dict.fromkeys(["U", "Np", "Pu"], ("7s", "7p", "6d", "5f")),
}
BOHR_A = 0.529177210544  # CODATA 2022 (memory)


@dataclass(frozen=True)
class Direct:
    """Figures of a direct run; pairs are (metal, donor)."""

    energy: float
    charges: np.ndarray
    spins: np.ndarray
    mayer: dict[tuple[int, int], float]
    wiberg: dict[tuple[int, int], float]
    overlap_population: dict[tuple[int, int], float]
    squared_singular_values: dict[tuple[int, int], np.ndarray]
    """Of the Löwdin density block: the channel weights of a closed shell."""
    orbital_energies_eV: np.ndarray | None


def mean_field(fragment: Fragment, theory: str):
    atoms = list(zip(fragment.symbols, (fragment.positions_A / BOHR_A).tolist(), strict=True))
    molecule = gto.M(
        atom=atoms,
        unit="Bohr",
        basis={symbol: f"ano@{CONTRACTION[symbol]}" for symbol in set(fragment.symbols)},
        charge=fragment.charge,
        spin=fragment.unpaired_electrons,
        verbose=0,
    )
    if theory == "hf":
        field = (scf.ROHF if fragment.unpaired_electrons else scf.RHF)(molecule).sfx2c1e().density_fit()
    else:
        field = (dft.UKS if fragment.unpaired_electrons else dft.RKS)(molecule).sfx2c1e()
        field.xc = theory
        field.grids.level = 1
        field = field.density_fit()
    field.with_df.build()
    field.conv_tol, field.conv_tol_grad, field.max_cycle = 1e-10, 1e-6, 60
    field.kernel()
    return field


def followed(field):
    """The solution after internal instabilities, seen on a coarse grid, were followed downhill."""
    while True:
        coarse = field.copy()
        if hasattr(field, "grids"):
            coarse.grids = dft.gen_grid.Grids(field.mol)
            coarse.grids.level = 0
            coarse.grids.build()
        rotated, _, stable, _ = coarse.stability(return_status=True)
        if stable:
            return field
        newton = field.newton()
        newton.max_cycle = 60
        newton.kernel(rotated, field.mo_occ)
        if not newton.converged or newton.e_tot > field.e_tot - 1e-6:
            return field
        field.mo_coeff, field.mo_occ, field.mo_energy, field.e_tot = (
            newton.mo_coeff,
            newton.mo_occ,
            newton.mo_energy,
            newton.e_tot,
        )


@contextmanager
def without_open_file_warnings():
    """PySCF leaves its scratch files to the collector, which would raise here; collect them within."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", ResourceWarning)
        yield
        gc.collect()


def direct_energy(fragment: Fragment, theory: str) -> float:
    with without_open_file_warnings():
        return float(mean_field(fragment, theory).e_tot)


def direct_run(
    fragment: Fragment, pairs: list[tuple[int, int]], theory: str = "pbe", *, follow: bool = False
) -> Direct:
    with without_open_file_warnings():
        return _figures(fragment, pairs, theory, follow)


def _figures(fragment: Fragment, pairs: list[tuple[int, int]], theory: str, follow: bool) -> Direct:
    field = mean_field(fragment, theory)
    assert field.converged
    if follow:
        field = followed(field)
    overlap = field.mol.intor("int1e_ovlp")
    matrix = np.asarray(field.make_rdm1())
    alpha, beta = matrix if matrix.ndim == 3 else (matrix / 2, matrix / 2)
    labels = field.mol.ao_labels(fmt=None)
    functions = [[k for k, label in enumerate(labels) if label[0] == atom] for atom in range(len(fragment))]
    total, root = alpha + beta, np.real(sqrtm(overlap))
    seen_a, seen_b = alpha @ overlap, beta @ overlap
    lowdin_a, lowdin_b = root @ alpha @ root, root @ beta @ root
    gross_a, gross_b = seen_a.diagonal(), seen_b.diagonal()
    mayer, wiberg, population, singular = {}, {}, {}, {}
    for metal, donor in pairs:
        mayer[metal, donor] = 2 * sum(
            seen_a[i, j] * seen_a[j, i] + seen_b[i, j] * seen_b[j, i]
            for i in functions[metal]
            for j in functions[donor]
        )
        wiberg[metal, donor] = 2 * sum(
            lowdin_a[i, j] ** 2 + lowdin_b[i, j] ** 2 for i in functions[metal] for j in functions[donor]
        )
        valence = [k for k in functions[metal] if labels[k][2] in VALENCE[fragment.symbols[metal]]]
        population[metal, donor] = 2 * sum(total[i, j] * overlap[i, j] for i in valence for j in functions[donor])
        block = (lowdin_a + lowdin_b)[np.ix_(functions[metal], functions[donor])]
        singular[metal, donor] = np.linalg.svd(block, compute_uv=False) ** 2
    return Direct(
        energy=float(field.e_tot),
        charges=np.array(
            [
                field.mol.atom_charge(atom) - sum(gross_a[k] + gross_b[k] for k in functions[atom])
                for atom in range(len(fragment))
            ]
        ),
        spins=np.array([sum(gross_a[k] - gross_b[k] for k in functions[atom]) for atom in range(len(fragment))]),
        mayer=mayer,
        wiberg=wiberg,
        overlap_population=population,
        squared_singular_values=singular,
        orbital_energies_eV=None if matrix.ndim == 3 else field.mo_energy * 27.211386245981,
    )
