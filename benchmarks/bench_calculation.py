"""One calculation with its full analysis against the bare eigenproblem of the same matrices."""

from __future__ import annotations

import pytest
from scipy.linalg import eigh
from threadpoolctl import threadpool_limits

import basis_params
from benchmarks.pairs import timed_in_turn
from benchmarks.systems import vanadyl_in_water
from ehmo.calculate import Bonding, calculate_bonding, effective_settings
from ehmo.electronic.hamiltonian import wolfsberg_helmholz
from ehmo.records.options import Options
from ehmo.structure import perceive

TABLE = basis_params.load_set("standard")
LIMITS = {43: 10.0, 295: 3.5, 997: 2.5}
ROUNDS = {43: 200, 295: 20, 997: 5}


def calculation(n_functions: int, options: Options):
    """The calculation as a call, and its first result; tables are warm afterwards."""
    fragment = vanadyl_in_water(n_functions)
    coordination = perceive(fragment)
    settings = effective_settings(TABLE.settings, options)

    def run() -> Bonding:
        return calculate_bonding(fragment, coordination, TABLE, settings, options)

    return run, run()


def bare_eigenproblem(first: Bonding):
    """`scipy.linalg.eigh` of the Hamiltonian and overlap matrix of a calculation, as a call."""
    S = first.overlap.matrix
    H = wolfsberg_helmholz(first.plan.basis, S, TABLE.settings.K, weighting=TABLE.settings.weighting)
    return lambda: eigh(H, S)


@pytest.mark.parametrize("n_functions", LIMITS)
def bench_fixed_charges(n_functions, benchmark, record_ratio):
    """Overlap, Hamiltonian, eigenvectors, populations, orders and channels."""
    with threadpool_limits(1):
        run, first = calculation(n_functions, Options(charge_model="fixed"))
        assert len(first.plan.basis) == n_functions
        ours, bare = timed_in_turn(run, bare_eigenproblem(first), rounds=ROUNDS[n_functions])
        benchmark.pedantic(run, rounds=ROUNDS[n_functions])
    record_ratio(f"fixed charges, {n_functions} functions, in bare eigh", ours / bare, LIMITS[n_functions])


def bench_self_consistent_charges(benchmark, record_ratio):
    """What the charge iteration adds, per iteration beyond the first."""
    with threadpool_limits(1):
        fixed, first = calculation(43, Options(charge_model="fixed"))
        run, outcome = calculation(43, Options())
        bare, without, whole = timed_in_turn(bare_eigenproblem(first), fixed, run, rounds=ROUNDS[43])
        benchmark.pedantic(run, rounds=ROUNDS[43])
    added = (whole - without) / (outcome.state.iterations - 1)
    record_ratio("self-consistent charges, each further iteration, in bare eigh", added / bare, 1.5)
