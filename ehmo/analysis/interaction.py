"""How the orbitals of a fragment arise from its metal and from the ligands of one bond."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np
from scipy.linalg import eigh

from ehmo.analysis.channels import squared_momenta
from ehmo.analysis.symmetry import lowdin_rows, orbital_irreps
from ehmo.conventions import BOND_SYMMETRIES, DEGENERACY_TOLERANCE_EV
from ehmo.harmonics import axis_rotations, harmonic_rotations
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.electronic import OverlapSpectrum
from ehmo.records.interaction import Interaction, OrbitalSet, PartLevel
from ehmo.records.report import BondReport

SAME_LENGTH_A: Final = 0.1
"""Bonds of one kind that differ by less belong to one diagram [angstrom]."""

SAME_LEVEL_EV: Final = 0.05
"""Orbitals of one irrep that a slight distortion splits by less are one level [eV]."""

SMALLEST_OVERLAP: Final = 0.03
"""An orbital with less overlap population with the bonds is neither bonding nor antibonding [e]."""

_PARTING_EV = 1e-3  # per m^2, so that sigma and pi functions of a lone donor atom stay apart


@dataclass(frozen=True, slots=True, eq=False)
class _PartOrbitals:
    """Orbitals of a part of the fragment over all its functions, and the levels they form."""

    coefficients: FloatArray
    energies_eV: FloatArray
    level_of: IntArray
    levels: tuple[PartLevel, ...]


def bond_interaction(report: BondReport, bond: int) -> Interaction:
    """Levels of the metal and of the ligands of one bond, and their shares in the orbitals of the fragment.

    The parts are taken in the Hamiltonian of the whole, H = S C E C^T S: shells of the metal are its diagonal
    elements, ligand levels the solutions of its block H_LL C = S_LL C E. Shares are Mulliken gross populations in
    the basis of part orbitals.

    Parameters
    ----------
    report : BondReport
    bond : int
        Place of the bond in the report; bonds of the same kind and length at its metal go with it.

    Returns
    -------
    interaction : Interaction

    References
    ----------
    .. [1] mulliken-1955: R. S. Mulliken, J. Chem. Phys. 23, 1833 (1955).
    """
    bonds, coordination = _bonds_like(report, bond), report.coordination
    metal = coordination.bonds[bond].metal
    ligands = {coordination.bonds[k].ligand for k in bonds}
    atoms = sorted({atom for ligand in ligands for atom in coordination.ligands[ligand].atoms})
    state, overlap = report.state, report.overlap
    turned = overlap @ state.coefficients
    hamiltonian = (turned * state.energies_eV) @ turned.T
    metal_part = _metal_orbitals(report, metal, hamiltonian)
    ligand_part = _ligand_orbitals(report, bonds, atoms, hamiltonian)
    sets, set_of = _orbital_sets(report, bonds, metal, atoms)
    shares = [
        _contributions(part, report, _functions(report.basis, own), set_of, len(sets))
        for part, own in ((metal_part, [metal]), (ligand_part, atoms))
    ]
    return Interaction(
        metal, tuple(bonds), tuple(atoms), metal_part.levels, ligand_part.levels, tuple(sets), shares[0], shares[1]
    )


def _bonds_like(report: BondReport, place: int) -> list[int]:
    """The bond and those of the same kind and length at the same metal."""
    chosen = report.coordination.bonds[place]
    return [
        k
        for k, bond in enumerate(report.coordination.bonds)
        if bond.metal == chosen.metal
        and bond.kind == chosen.kind
        and abs(bond.length_A - chosen.length_A) < SAME_LENGTH_A
    ]


def _functions(basis: Basis, atoms: Sequence[int]) -> IntArray:
    return np.flatnonzero(np.isin(basis.atom_of, np.asarray(atoms)))


def _donors(report: BondReport, bonds: Sequence[int]) -> list[int]:
    return sorted({report.coordination.bonds[k].donor for k in bonds})


def _metal_orbitals(report: BondReport, metal: int, hamiltonian: FloatArray) -> _PartOrbitals:
    """Shells of the metal at their diagonal elements."""
    basis, functions = report.basis, _functions(report.basis, [metal])
    shells = basis.shell_of[functions]
    energy = {int(s): float(hamiltonian[functions, functions][shells == s].mean()) for s in dict.fromkeys(shells)}
    order = sorted(range(len(functions)), key=lambda i: (energy[int(shells[i])], shells[i], i))
    rising = sorted(energy, key=lambda s: (energy[s], s))
    coefficients = np.zeros((len(basis), len(functions)))
    coefficients[functions[order], np.arange(len(functions))] = 1.0
    energies = np.array([energy[int(shells[i])] for i in order])
    level_of = np.array([rising.index(int(shells[i])) for i in order])
    # Levels are told apart by their number here, since two shells may have the same energy.
    labels = _irreps(report, coefficients, level_of.astype(np.float64))
    levels = tuple(
        PartLevel(
            energy[s],
            int((level_of == k).sum()),
            basis.shell_label(s),
            _distinct(report, [labels[i] for i in np.flatnonzero(level_of == k)]),
            "",
        )
        for k, s in enumerate(rising)
    )
    return _PartOrbitals(coefficients, energies, level_of, levels)


def _ligand_orbitals(
    report: BondReport, bonds: Sequence[int], atoms: Sequence[int], hamiltonian: FloatArray
) -> _PartOrbitals:
    """Orbitals of the ligands without the rest."""
    basis, functions = report.basis, _functions(report.basis, atoms)
    block = np.ix_(functions, functions)
    parted = hamiltonian + _PARTING_EV * _squared_momentum(report, bonds)
    energies, vectors = eigh(parted[block], report.overlap[block])
    coefficients = np.zeros((len(basis), len(functions)))
    coefficients[functions] = vectors
    labels = _irreps(report, coefficients, energies)
    level_of = _numbered(energies, labels, _dimensions(report))
    by_m = _donor_parts(report, bonds, coefficients)
    donors = _functions(basis, _donors(report, bonds))
    on_donors = (coefficients * (report.overlap @ coefficients))[donors].sum(axis=0)
    levels = []
    for k in range(int(level_of[-1]) + 1):
        members = np.flatnonzero(level_of == k)
        levels.append(
            PartLevel(
                float(energies[members].mean()),
                len(members),
                _leading_shell(report, bonds, coefficients[:, members]),
                _distinct(report, [labels[i] for i in members]),
                BOND_SYMMETRIES[int(by_m[:, members].sum(axis=1).argmax())],
                float(on_donors[members].mean()),
            )
        )
    return _PartOrbitals(coefficients, energies, level_of, tuple(levels))


def _squared_momentum(report: BondReport, bonds: Sequence[int]) -> FloatArray:
    """(n_ao, n_ao) matrix of m^2 of the donors about their bonds."""
    total = np.zeros(report.overlap.shape)
    for bond in bonds:
        donor = report.coordination.bonds[bond].donor
        functions = report.basis.functions_of(donor)
        total[functions, functions] += squared_momenta(_axis(report, bond)[None], report.basis.layouts[donor])[0]
    return total


def _axis(report: BondReport, bond: int) -> FloatArray:
    """Unit vector from the metal to the donor."""
    positions, ends = report.fragment.positions_A, report.coordination.bonds[bond]
    along: FloatArray = positions[ends.donor] - positions[ends.metal]
    return along / float(np.linalg.norm(along))


def _leading_shell(report: BondReport, bonds: Sequence[int], coefficients: FloatArray) -> str:
    """Shell of the donor atoms that has most of some orbitals."""
    basis = report.basis
    parts: dict[str, float] = {}
    squares = (coefficients**2).sum(axis=1)
    for atom in _donors(report, bonds):
        for i in range(basis.functions_of(atom).start, basis.functions_of(atom).stop):
            label = basis.shell_label(int(basis.shell_of[i]))
            parts[label] = parts.get(label, 0.0) + float(squares[i])
    return max(sorted(parts), key=lambda label: parts[label])


def _irreps(report: BondReport, coefficients: FloatArray, energies: FloatArray) -> tuple[str, ...]:
    """Irrep of each orbital of a part; blank without a single metal to take the group from."""
    if report.irreps is None:
        return ("",) * len(energies)
    eigenvalues, vectors = eigh(report.overlap)
    spectrum = OverlapSpectrum(report.overlap, eigenvalues, vectors)
    lowdin = lowdin_rows(spectrum, np.arange(len(report.basis)), coefficients)
    return orbital_irreps(report.sites[0].symmetry, report.basis, lowdin, energies).labels


def _dimensions(report: BondReport) -> dict[str, int]:
    if report.irreps is None:
        return {}
    group = report.sites[0].symmetry.group
    return dict(zip(group.irreps, group.dimensions.tolist(), strict=True))


def _orbital_labels(report: BondReport) -> tuple[tuple[str, ...], dict[str, int]]:
    """Irrep of each orbital of the fragment, in the group of the sphere or of the molecule, and their dimensions."""
    if report.irreps is not None:
        return report.irreps.labels, _dimensions(report)
    if report.molecule_irreps is None or report.molecule_symmetry is None:
        return ("",) * len(report.state.energies_eV), {}
    group = report.molecule_symmetry.group
    return report.molecule_irreps.labels, dict(zip(group.irreps, group.dimensions.tolist(), strict=True))


def _distinct(report: BondReport, labels: Sequence[str]) -> tuple[str, ...]:
    """Irreps of a level, each as often as it occurs."""
    dimensions = _dimensions(report)
    return tuple(
        label
        for label in dimensions
        for _ in range(max(labels.count(label) // dimensions[label], 1 if label in labels else 0))
    )


def _numbered(energies: FloatArray, labels: Sequence[str], dimensions: dict[str, int]) -> IntArray:
    """Number of the level that each orbital belongs to.

    Degenerate orbitals are one level; so are neighbours of one irrep within `SAME_LEVEL_EV` that a slight
    distortion has split, as many as the irrep has dimensions.
    """
    numbers, size = np.zeros(len(energies), dtype=np.intp), 1
    for k in range(1, len(energies)):
        step = energies[k] - energies[k - 1]
        same = labels[k] == labels[k - 1]
        split = same and size < dimensions.get(labels[k], 1) and step < SAME_LEVEL_EV
        joined = split or (step < DEGENERACY_TOLERANCE_EV and same and (not labels[k] or size < dimensions[labels[k]]))
        size = size + 1 if joined else 1
        numbers[k] = numbers[k - 1] + (not joined)
    return numbers


def _bond_frame(report: BondReport, bond: int, atom: int) -> tuple[slice, FloatArray, IntArray]:
    """Functions of an atom, the matrix to those about the bond axis, and their |m|."""
    axes = axis_rotations(_axis(report, bond)[None])
    layout = report.basis.layouts[atom]
    size = sum(2 * l + 1 for l in layout)
    turn, start, momenta = np.zeros((size, size)), 0, []
    for l in layout:
        stop = start + 2 * l + 1
        turn[start:stop, start:stop] = harmonic_rotations(axes, l)[0].T
        momenta += [abs(m) for m in range(-l, l + 1)]
        start = stop
    return report.basis.functions_of(atom), turn, np.array(momenta)


def _donor_parts(report: BondReport, bonds: Sequence[int], coefficients: FloatArray) -> FloatArray:
    """(4, n) squared coefficients on the donors with |m| = 0 to 3 about their bonds."""
    parts = np.zeros((len(BOND_SYMMETRIES), coefficients.shape[1]))
    for bond in bonds:
        functions, turn, momenta = _bond_frame(report, bond, report.coordination.bonds[bond].donor)
        np.add.at(parts, momenta, (turn @ coefficients[functions]) ** 2)
    return parts


def orbital_overlap_by_part(report: BondReport, bonds: Sequence[int]) -> FloatArray:
    """Overlap population of each orbital with some bonds, by bond part.

    Parameters
    ----------
    report : BondReport
    bonds : sequence of int
        Places of the bonds.

    Returns
    -------
    populations : (4, n_mo) ndarray
        Sigma, pi, delta, phi, the orbital holding two electrons; they add up to `BondOrders.orbital_overlap` [e].
    """
    populations = np.zeros((len(BOND_SYMMETRIES), len(report.state.energies_eV)))
    for bond in bonds:
        ends = report.coordination.bonds[bond]
        metal, to_metal, m_metal = _bond_frame(report, bond, ends.metal)
        donor, to_donor, m_donor = _bond_frame(report, bond, ends.donor)
        overlap = to_metal @ report.overlap[metal, donor] @ to_donor.T
        at_metal = to_metal @ report.state.coefficients[metal]
        at_donor = to_donor @ report.state.coefficients[donor]
        for m in range(len(BOND_SYMMETRIES)):
            some = overlap * np.outer(m_metal == m, m_donor == m)
            populations[m] += 4 * (at_metal * (some @ at_donor)).sum(axis=0)
    return populations


def _orbital_sets(
    report: BondReport, bonds: Sequence[int], metal: int, atoms: Sequence[int]
) -> tuple[list[OrbitalSet], IntArray]:
    """Levels of the fragment, and the level of each orbital."""
    state = report.state
    labels, dimensions = _orbital_labels(report)
    set_of = _numbered(state.energies_eV, labels, dimensions)
    by_part = orbital_overlap_by_part(report, bonds)
    gross = state.coefficients * (report.overlap @ state.coefficients)
    shares = [gross[_functions(report.basis, own)].sum(axis=0) for own in ([metal], atoms, _donors(report, bonds))]
    sizes = np.bincount(set_of)
    # Where a distortion splits degenerate levels, counting them would give both halves of one the same number.
    numbered = all(n == dimensions.get(labels[k], 1) for k, n in zip(np.cumsum(sizes) - 1, sizes, strict=True))
    seen: dict[str, int] = {}
    sets = []
    for k in range(int(set_of[-1]) + 1):
        members = np.flatnonzero(set_of == k)
        irrep = labels[members[0]]
        seen[irrep] = seen.get(irrep, 0) + 1
        parts = by_part[:, members].mean(axis=1)
        main = int(np.abs(parts).argmax())
        sets.append(
            OrbitalSet(
                tuple(members.tolist()),
                float(state.energies_eV[members].mean()),
                irrep,
                seen[irrep] if irrep and numbered else 0,
                float(state.occupations[0, members].sum()),
                float(state.occupations[1, members].sum()),
                BOND_SYMMETRIES[main] if abs(parts[main]) >= SMALLEST_OVERLAP else "",
                float(parts.sum()),
                float(shares[0][members].mean()),
                float(shares[1][members].mean()),
                float(shares[2][members].mean()),
            )
        )
    return sets, set_of


def _contributions(
    part: _PartOrbitals, report: BondReport, functions: IntArray, set_of: IntArray, n_sets: int
) -> FloatArray:
    """(n_sets, n_levels) mean gross share of each level of a part in the orbitals of a set."""
    own = part.coefficients[functions]
    amounts = np.linalg.solve(own, report.state.coefficients[functions])
    population = amounts * (part.coefficients.T @ report.overlap @ report.state.coefficients)
    by_level = np.zeros((len(part.levels), population.shape[1]))
    np.add.at(by_level, part.level_of, population)
    sums = np.zeros((n_sets, len(part.levels)))
    np.add.at(sums, set_of, by_level.T)
    return sums / np.bincount(set_of, minlength=n_sets)[:, None]
