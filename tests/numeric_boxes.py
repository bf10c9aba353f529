"""Runs the numeric boxes one after the other, without bond perception, and builds tables for the tests."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from basis_params import ElementParameters, ModelSettings, ParameterTable, Shell, atom
from ehmo.analysis import analyse_bonding
from ehmo.analysis.bonded import bonded_functions
from ehmo.electronic.charges import (
    ElectronCount,
    charge_interaction,
    fixed_charges,
    self_consistent_charges,
)
from ehmo.electronic.eigen import overlap_spectrum
from ehmo.electronic.hamiltonian import wolfsberg_helmholz
from ehmo.orbitals.overlap import ChannelScale, overlap_matrix, scaled_overlap_matrices
from ehmo.orbitals.pairs import OrbitalPlan, orbital_plan
from ehmo.records.bonding import BondOrders, Populations
from ehmo.records.coordination import DonorKind, MetalDonorBond
from ehmo.records.electronic import ElectronicState, OverlapSpectrum
from tests.geometries import Species

DONOR_REACH_A = 2.65
PLAIN = ModelSettings(1.75, True, None, None, None, 0.0, 1.0)


@dataclass(frozen=True)
class Job:
    """Atoms, electrons and settings of one calculation."""

    symbols: tuple[str, ...]
    positions_A: np.ndarray
    charge: int
    unpaired: int
    table: ParameterTable
    settings: ModelSettings = PLAIN
    self_consistent: bool = False
    max_iterations: int = 100

    @classmethod
    def of(cls, species: Species, table: ParameterTable, **settings) -> Job:
        """Job on one of the shared species."""
        return cls(
            species.symbols,
            species.positions_A,
            species.charge,
            species.unpaired_electrons,
            table,
            **settings,
        )


@dataclass(frozen=True)
class Outcome:
    """What every box gave."""

    plan: OrbitalPlan
    overlap: np.ndarray
    spectrum: OverlapSpectrum
    hamiltonian: np.ndarray
    state: ElectronicState
    populations: Populations
    bonds: tuple[MetalDonorBond, ...]
    orders: tuple[BondOrders, ...]


def run(job: Job, bonds: tuple[MetalDonorBond, ...] | None = None) -> Outcome:
    """Overlap, Hamiltonian, orbitals, populations and orders; bonds default to those of atom 0."""
    plan, overlap, hamiltonian = matrices(job)
    spectrum = overlap_spectrum(overlap, plan.basis)
    state = solve_state(job, plan, overlap, hamiltonian)
    bonds = bonds_from_first_atom(job.symbols, job.positions_A) if bonds is None else bonds
    bonded = bonded_functions(bonds, plan.basis, spectrum, state)
    populations, orders = analyse_bonding(bonds, job.positions_A, plan.basis, spectrum, state, bonded)
    return Outcome(plan, overlap, spectrum, hamiltonian, state, populations, bonds, orders)


def matrices(job: Job) -> tuple[OrbitalPlan, np.ndarray, np.ndarray]:
    """Plan, S and H0."""
    plan = orbital_plan(job.symbols, job.table)
    settings = job.settings
    K = [settings.K if k is None else k for k in (settings.K_sigma, settings.K_pi, settings.K_delta)]
    scaled = None
    if (settings.K_sigma, settings.K_pi, settings.K_delta, settings.K_decay_per_A) == (None, None, None, 0.0):
        overlap = overlap_matrix(plan, job.positions_A)
    else:
        radii = tuple(atom(symbol).covalent_radius_A for symbol in job.symbols)
        scale = ChannelScale((*K, settings.K), settings.K_decay_per_A, radii)
        overlap, scaled = scaled_overlap_matrices(plan, job.positions_A, scale)
    hamiltonian = wolfsberg_helmholz(
        plan.basis, overlap, settings.K, weighting=settings.weighting, scaled_overlap=scaled
    )
    return plan, overlap, hamiltonian


def solve_state(job: Job, plan: OrbitalPlan, overlap: np.ndarray, hamiltonian: np.ndarray) -> ElectronicState:
    """Orbitals with fixed or self-consistent charges."""
    count = ElectronCount(round(float(plan.basis.core_charges.sum())) - job.charge, job.unpaired)
    if not job.self_consistent:
        return fixed_charges(hamiltonian, overlap, plan.basis, count)
    return self_consistent_charges(
        hamiltonian, overlap, plan.basis, count, interaction(job), max_iterations=job.max_iterations
    )


def interaction(job: Job) -> np.ndarray:
    """Lambda gamma with the tabulated hardness."""
    hardness = np.array([atom(symbol).hardness_U_eV for symbol in job.symbols])
    return charge_interaction(job.positions_A, hardness, job.settings.lambda_)


def bond(first: int, second: int) -> MetalDonorBond:
    """Bond whose kind and length play no part in the analysis."""
    return MetalDonorBond(first, second, DonorKind.OTHER, 1.0, None, 0)


def bonds_from_first_atom(symbols: tuple[str, ...], positions: np.ndarray) -> tuple[MetalDonorBond, ...]:
    """Atom 0 to every heavier-than-hydrogen atom within reach."""
    distances = np.linalg.norm(positions - positions[0], axis=1)
    return tuple(bond(0, k) for k in range(1, len(symbols)) if symbols[k] != "H" and distances[k] < DONOR_REACH_A)


def shell(n: int, l: int, *zetas: float, coefficients: tuple[float, ...] = (1.0,), h_ii_eV: float = -13.6) -> Shell:
    """Shell of a made-up table."""
    return Shell(n, l, h_ii_eV, zetas, coefficients, "none", "made up for the test", "derived")


def table(**elements: tuple[int, tuple[Shell, ...]]) -> ParameterTable:
    """Table of elements given as valence electrons and shells."""
    rows = {symbol: ElementParameters(symbol, *entry) for symbol, entry in elements.items()}
    return ParameterTable("made up for the test", "1", PLAIN, rows)
