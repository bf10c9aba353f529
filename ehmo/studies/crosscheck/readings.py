"""Numbers of a report and of a minimal-basis run by the same definitions, ready to be set side by side."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from ehmo.analysis.bonded import BondedFunctions
from ehmo.analysis.channels import bond_channels
from ehmo.analysis.ladder import LadderError, ladders
from ehmo.analysis.symmetry import functions_of_atoms, lowdin_rows, orbital_irreps
from ehmo.calculate.sites import shell_spans
from ehmo.conventions import BOND_SYMMETRIES
from ehmo.electronic.eigen import overlap_spectrum
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.bonding import SMALLEST_CHANNEL, BondChannel
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.crosscheck import AtomNumbers, BondNumbers, ReferenceRun
from ehmo.records.electronic import ElectronicState, OverlapSpectrum
from ehmo.records.ligand_field import Ladder
from ehmo.records.report import BondReport
from ehmo.records.symmetry import OrbitalIrreps
from ehmo.structure.elements import F_BLOCK

GRID_DEGENERACY_EV: Final = 1e-3
"""Orbitals of the run closer than this count as one set: the grid splits exact ones by up to 1e-4 eV."""


@dataclass(frozen=True, slots=True, eq=False)
class Orbitals:
    """One side's orbitals.

    Attributes
    ----------
    energies_eV : (n_mo,) ndarray
        Ascending [eV].
    electrons : (n_mo,) ndarray
    shell_shares : (n_mo,) ndarray
        Part of each orbital on the valence d (f) shells of the metals (orthonormalised functions).
    irreps : OrbitalIrreps or None
    """

    energies_eV: FloatArray
    electrons: FloatArray
    shell_shares: FloatArray
    irreps: OrbitalIrreps | None


@dataclass(frozen=True, slots=True, eq=False)
class RunReading:
    """What a minimal-basis run says of a fragment, in the terms of a report.

    Attributes
    ----------
    atoms : tuple of AtomNumbers
    bonds : tuple of BondNumbers
    orbitals : Orbitals
    ladders : tuple of Ladder
        Empty if withheld.
    withheld : str
        Why there is no ladder.
    """

    atoms: tuple[AtomNumbers, ...]
    bonds: tuple[BondNumbers, ...]
    orbitals: Orbitals
    ladders: tuple[Ladder, ...]
    withheld: str


def valence_shells(basis: Basis, atom: int) -> IntArray:
    """Highest s, p, d (and, in the f block, f) shell of an atom.

    A metal's semicore shells overlap with the donors in an antibonding sense; an extended-Hückel set has no such
    shells, so overlap populations are comparable without them only.

    Parameters
    ----------
    basis : Basis
    atom : int

    Returns
    -------
    shells : (n,) ndarray of int
        Ascending.
    """
    own = np.flatnonzero(basis.shell_atom == atom)
    kinds = (0, 1, 2, 3) if basis.symbols[atom] in F_BLOCK else (0, 1, 2)
    highest = [own[basis.shell_l[own] == l] for l in kinds]
    chosen: IntArray = np.sort(np.array([shells[-1] for shells in highest if len(shells)], dtype=np.intp))
    return chosen


def report_bonds(report: BondReport) -> tuple[BondNumbers, ...]:
    """Each bond of a report, the overlap population of the metal's highest shells only.

    Parameters
    ----------
    report : BondReport

    Returns
    -------
    bonds : tuple of BondNumbers
    """
    basis, between = report.basis, report.populations.shell_overlap
    return tuple(
        BondNumbers(
            overlap_population=float(
                between[np.ix_(valence_shells(basis, bond.metal), np.flatnonzero(basis.shell_atom == bond.donor))].sum()
            ),
            mayer=orders.mayer,
            wiberg=orders.wiberg,
            channels=orders.channels,
        )
        for bond, orders in report.bonds()
    )


def report_orbitals(report: BondReport) -> Orbitals:
    """Orbitals of a report.

    Parameters
    ----------
    report : BondReport

    Returns
    -------
    orbitals : Orbitals
    """
    rows = np.concatenate([_shell_rows(report.basis, metal) for metal in report.coordination.metals])
    spectrum = overlap_spectrum(report.overlap, report.basis)
    return Orbitals(
        report.state.energies_eV,
        report.state.occupations.sum(axis=0),
        (lowdin_rows(spectrum, rows, report.state.coefficients) ** 2).sum(axis=0),
        report.irreps,
    )


def read_run(report: BondReport, run: ReferenceRun) -> RunReading:
    """Populations, orders, channels, orbitals and ladders of a run.

    Parameters
    ----------
    report : BondReport
        Its bonds, frames and symmetries are taken over.
    run : ReferenceRun

    Returns
    -------
    reading : RunReading
    """
    basis = run.basis
    spectrum = overlap_spectrum(run.overlap, basis)
    state = ElectronicState(run.energies_eV, run.coefficients, run.occupations, np.nan, "fixed", 0, 0.0)
    chosen = np.concatenate([valence_shells(basis, atom) for atom in range(len(basis.symbols))])
    places = np.flatnonzero(np.isin(basis.shell_of, chosen))
    valence = _only(basis, chosen)
    metal_rows = np.concatenate([_shell_rows(basis, metal) for metal in report.coordination.metals])
    found, withheld = _ladders(report, spectrum, state, valence, places)
    return RunReading(
        _atoms(run),
        tuple(_bond(report, bond, run, spectrum) for bond in report.coordination.bonds),
        Orbitals(
            run.energies_eV,
            run.occupations.sum(axis=0),
            (lowdin_rows(spectrum, metal_rows, run.coefficients) ** 2).sum(axis=0),
            _irreps(report, spectrum, state, valence, places),
        ),
        found,
        withheld,
    )


def _shell_rows(basis: Basis, metal: int) -> IntArray:
    """Functions of the highest d shell of a metal, f in the f block; none without such a shell."""
    shells = valence_shells(basis, metal)
    last = shells[-1]
    if basis.shell_l[last] < 2:
        return np.array([], dtype=np.intp)
    rows: IntArray = np.flatnonzero(basis.shell_of == last)
    return rows


def _only(basis: Basis, shells: IntArray) -> Basis:
    """The basis with some of its shells."""
    return Basis(
        basis.symbols,
        basis.core_charges,
        basis.shell_atom[shells],
        basis.shell_n[shells],
        basis.shell_l[shells],
        basis.shell_type[shells],
        basis.type_h_ii_eV,
    )


def _atoms(run: ReferenceRun) -> tuple[AtomNumbers, ...]:
    gross = np.add.reduceat((run.densities * run.overlap).sum(axis=2), run.basis.atom_start[:-1], axis=1)
    charges, spins = run.basis.core_charges - gross.sum(axis=0), gross[0] - gross[1]
    return tuple(AtomNumbers(float(charge), float(spin)) for charge, spin in zip(charges, spins, strict=True))


def _bond(report: BondReport, bond: MetalDonorBond, run: ReferenceRun, spectrum: OverlapSpectrum) -> BondNumbers:
    """Overlap population, Mayer and Wiberg order and channels from both spin densities."""
    basis, overlap = run.basis, run.overlap
    on_metal, on_donor = basis.functions_of(bond.metal), basis.functions_of(bond.donor)
    seen = run.densities @ overlap
    mayer = 2 * (seen[:, on_metal, on_donor] * seen[:, on_donor, on_metal].swapaxes(1, 2)).sum()
    half = (spectrum.vectors * np.sqrt(spectrum.eigenvalues)) @ spectrum.vectors.T
    blocks = (half @ run.densities @ half)[:, on_metal, on_donor]
    positions = report.fragment.positions_A
    direction = positions[bond.donor] - positions[bond.metal]
    layouts = basis.layouts[bond.metal], basis.layouts[bond.donor]
    channels = bond_channels(blocks[:, None], (direction / np.linalg.norm(direction))[None], *layouts)
    valence = np.flatnonzero(np.isin(basis.shell_of, valence_shells(basis, bond.metal)))
    between = np.ix_(valence, np.arange(on_donor.start, on_donor.stop))
    kinds = channels.shares[0].argmax(axis=1)
    return BondNumbers(
        overlap_population=float(2 * (run.densities.sum(axis=0)[between] * overlap[between]).sum()),
        mayer=float(mayer),
        wiberg=float(2 * (blocks**2).sum()),
        channels=tuple(
            BondChannel(
                BOND_SYMMETRIES[kinds[k]],
                float(weight),
                channels.shares[0, k],
                channels.metal_hybrids[0, k],
                channels.donor_hybrids[0, k],
            )
            for k, weight in enumerate(channels.weights[0])
            if weight >= SMALLEST_CHANNEL
        ),
    )


def _irreps(
    report: BondReport, spectrum: OverlapSpectrum, state: ElectronicState, valence: Basis, places: IntArray
) -> OrbitalIrreps | None:
    """Irreps in the group of the idealised sphere, judged on the valence functions of metal and donors."""
    if report.irreps is None:
        return None
    symmetry = report.sites[0].symmetry
    rows = places[functions_of_atoms(valence, symmetry.atoms)]
    lowdin = lowdin_rows(spectrum, rows, state.coefficients)
    return orbital_irreps(symmetry, valence, lowdin, state.energies_eV, GRID_DEGENERACY_EV)


def _ladders(
    report: BondReport,
    spectrum: OverlapSpectrum,
    state: ElectronicState,
    valence: Basis,
    places: IntArray,
) -> tuple[tuple[Ladder, ...], str]:
    """Ladders by the report's own way, from the valence functions of the run."""
    bonds, frames = report.coordination.bonds, report.coordination.frames
    bonded = _bonded(bonds, spectrum, state, valence, places)
    spans: Sequence[FloatArray] = ()
    if len(frames) == 1:
        l = 3 if 3 in valence.layouts[frames[0].metal] else 2
        spans = shell_spans(report.sites[0].symmetry, frames[0], l)
    try:
        found = ladders(
            frames,
            valence,
            bonded,
            state,
            _orbital_overlap(bonds, bonded, valence),
            parts=spans,
            counted_electrons=report.electrons.d_electrons,
        )
    except LadderError as error:
        return (), error.fault
    return found, ""


def _bonded(
    bonds: Sequence[MetalDonorBond],
    spectrum: OverlapSpectrum,
    state: ElectronicState,
    valence: Basis,
    places: IntArray,
) -> BondedFunctions:
    """Valence rows of the metals and donors; orthonormalised among all functions, inner shells included."""
    metals = sorted({bond.metal for bond in bonds})
    atoms = np.array(sorted({*metals, *(bond.donor for bond in bonds)}), dtype=np.intp)
    own = functions_of_atoms(valence, atoms)
    rows = places[own]
    return BondedFunctions(
        start=np.searchsorted(own, valence.atom_start[:-1]),
        on_metals=np.isin(valence.atom_of[own], metals),
        overlap=spectrum.matrix[np.ix_(rows, rows)],
        coefficients=state.coefficients[rows],
        overlap_orbitals=spectrum.matrix[rows] @ state.coefficients,
        lowdin_orbitals=lowdin_rows(spectrum, rows, state.coefficients),
    )


def _orbital_overlap(bonds: Sequence[MetalDonorBond], bonded: BondedFunctions, valence: Basis) -> FloatArray:
    """(n_mo,) metal-donor overlap population of each orbital holding two electrons."""
    total = np.zeros(bonded.coefficients.shape[1])
    for bond in bonds:
        metal, donor = (
            slice(bonded.start[atom], bonded.start[atom] + valence.atom_start[atom + 1] - valence.atom_start[atom])
            for atom in (bond.metal, bond.donor)
        )
        between = bonded.overlap[metal, donor]
        total += 4 * (bonded.coefficients[metal] * (between @ bonded.coefficients[donor])).sum(axis=0)
    return total
