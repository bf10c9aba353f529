"""One calculation with its full analysis on aqua vanadyl against minimal-basis runs of PySCF on the same ion.

The limits are for fixed charges; the default, self-consistent charges, is measured beside them.
"""

from __future__ import annotations

import pytest
from pyscf import dft, gto, lib, scf
from threadpoolctl import threadpool_limits

from benchmarks.bench_calculation import calculation
from benchmarks.pairs import seconds, timed_in_turn
from benchmarks.systems import VANADYL
from ehmo.records.options import Options
from tests.geometries import SPECIES


def molecule(basis: str | dict[str, str]) -> gto.Mole:
    """Aqua vanadyl for PySCF."""
    ion = SPECIES[VANADYL]
    atoms = list(zip(ion.symbols, ion.positions_A.tolist(), strict=True))
    return gto.M(atom=atoms, basis=basis, charge=ion.charge, spin=ion.unpaired_electrons, verbose=0)


def restricted_open_shell_hartree_fock() -> bool:
    """STO-3G, PySCF's defaults but for 200 cycles; returns whether it converged."""
    field = scf.ROHF(molecule("sto-3g"))
    field.max_cycle = 200
    field.kernel()
    return bool(field.converged)


def density_functional() -> bool:
    """PBE in ANO-RCC's minimal contraction, one-electron X2C, density fitting, coarse grid."""
    field = dft.UKS(molecule({"V": "ano@4s3p1d", "O": "ano@2s1p", "H": "ano@1s"})).sfx2c1e()
    field.xc = "pbe"
    field.grids.level = 1
    field.max_cycle = 60
    field = field.density_fit()
    field.with_df.build()
    field.kernel()
    return bool(field.converged)


@pytest.mark.parametrize(
    ("name", "reference", "limit"),
    [
        ("ROHF/STO-3G", restricted_open_shell_hartree_fock, 500),
        ("PBE/ANO-RCC minimal", density_functional, 3000),
    ],
    ids=["hartree-fock", "pbe"],
)
def bench_against_pyscf(name, reference, limit, benchmark, record_ratio):
    """How many times shorter ours takes; one thread for both."""
    with threadpool_limits(1), lib.with_omp_threads(1):
        fixed, _ = calculation(43, Options(charge_model="fixed"))
        default, _ = calculation(43, Options())
        reference()  # loads the basis sets and functionals
        outcome = []
        theirs = min(seconds(lambda: outcome.append(reference())) for _ in range(2))
        ours, ours_by_default = timed_in_turn(fixed, default, rounds=200)
        benchmark.pedantic(fixed, rounds=50)
    assert all(outcome), "the reference run did not converge"
    record_ratio(f"fixed charges, times faster than {name}", theirs / ours, limit, more_is_better=True)
    record_ratio(f"self-consistent charges, times faster than {name}", theirs / ours_by_default, more_is_better=True)
