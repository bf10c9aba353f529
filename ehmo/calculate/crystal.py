"""Crystal with known bonds -> bands, populations and bond orders: where the numeric boxes meet for a crystal."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

import basis_params
from basis_params import ModelSettings, ParameterTable
from ehmo.analysis.crystal import crystal_orders, crystal_populations
from ehmo.calculate.numbers import channel_constants, threads_for
from ehmo.electronic.bloch import BlochProblem, band_energies, bloch_problem, fixed_bands, self_consistent_bands
from ehmo.electronic.ewald import lattice_interaction
from ehmo.errors import InputError, LimitError
from ehmo.orbitals.lattice import LatticeMatrix, lattice_overlaps, lattice_pairs
from ehmo.orbitals.overlap import ChannelScale
from ehmo.orbitals.parameters import element_parameters
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.bloch import KMesh, LatticeBond, k_mesh
from ehmo.records.bonding import BondOrders
from ehmo.records.crystal_electronic import (
    BandGap,
    BandPath,
    BandState,
    CellElectrons,
    CrystalBonding,
    CrystalPopulations,
    MeshChange,
    band_gap,
)
from ehmo.records.options import Options
from ehmo.structure.elements import ALKALI, ALKALINE_EARTH
from ehmo.structure.lattice_path import lattice_path
from ehmo.units import COULOMB_EV_A

MESH_LENGTH_A = 20.0
"""Smallest repeat length that the default mesh stands for along each reciprocal vector [angstrom]."""

MAX_ORBITAL_BYTES = 2 << 30
"""Size up to which the orbitals of a mesh are kept [bytes]."""


@dataclass(frozen=True, slots=True)
class CrystalOptions:
    """Choices for a crystal beyond those of any calculation.

    Attributes
    ----------
    mesh : tuple of int or None
        k-points along each reciprocal vector; None for a mesh by the size of the cell.
    path : str or None
        Names of special points such as "GXMG", "auto" for the standard path of the lattice, None for no path.
    path_points : int
        k-points along the path.
    cations_basis : bool
        Whether cations of groups 1 and 2 carry functions; else they are point charges.
    compare_mesh : bool
        Whether the calculation is repeated on a second mesh.
    """

    mesh: tuple[int, int, int] | None = None
    path: str | None = None
    path_points: int = 120
    cations_basis: bool = False
    compare_mesh: bool = True


def crystal_bonding(
    symbols: Sequence[str],
    positions_A: FloatArray,
    cell_A: FloatArray,
    bonds: Sequence[LatticeBond],
    table: ParameterTable,
    settings: ModelSettings,
    options: Options,
    crystal: CrystalOptions | None = None,
) -> CrystalBonding:
    """Bands, populations and bond orders of a crystal.

    Parameters
    ----------
    symbols : sequence of str
        Every atom of the cell.
    positions_A : (n_atoms, 3) ndarray
        Cartesian coordinates [angstrom].
    cell_A : (3, 3) ndarray
        Cell vectors as rows [angstrom].
    bonds : sequence of LatticeBond
        Pairs of atoms to analyse.
    table : ParameterTable
        Parameter set.
    settings : ModelSettings
        Constants of the Hamiltonian.
    options : Options
        Charge of the cell (0 by default), unpaired electrons of the cell, charge model and limits.
    crystal : CrystalOptions, optional
        Mesh, path and the treatment of cations.

    Returns
    -------
    bonding : CrystalBonding

    Raises
    ------
    EhmoError
        If the cell is flat, an element is missing from the set, electrons do not fit, functions are dependent at some
        k-point, charges do not settle or are asked to in a charged cell, or a limit is passed.
    """
    crystal = crystal or CrystalOptions()
    cell = _Cell.of(symbols, positions_A, cell_A, bonds, table, settings, options, crystal)
    mesh = k_mesh(crystal.mesh or default_mesh(cell_A))
    with threads_for(len(cell.overlap.pairs.basis)):
        other = cell.run(k_mesh(other_mesh(mesh.counts, cell_A))) if crystal.compare_mesh else None
        run = cell.run(mesh, None if other is None else other.state.charges)
        change = None if other is None else _mesh_change(run, other, cell)
        path = None
        if crystal.path is not None:
            path = _bands_along(cell, run.state, crystal.path, crystal.path_points)
    return CrystalBonding(
        basis=cell.overlap.pairs.basis,
        atoms=cell.atoms,
        ions=cell.ions,
        ion_charges=cell.ion_charges,
        electrons=cell.electrons,
        state=run.state,
        populations=run.populations,
        bonds=tuple(bonds),
        lengths_A=np.linalg.norm(cell.bond_vectors_A, axis=1),
        orders=run.orders,
        gap=_gap(run.state, cell.electrons),
        mesh_change=change,
        path=path,
    )


def _gap(state: BandState, electrons: CellElectrons) -> BandGap | None:
    """Gap above the bands that the majority spin fills."""
    return band_gap(state.mesh.points, state.energies_eV, electrons.by_spin[0])


def _mesh_change(run: _Run, other: _Run, cell: _Cell) -> MeshChange:
    gaps = [_gap(each.state, cell.electrons) for each in (run, other)]
    orders = [np.array([(order.mayer, order.wiberg) for order in each.orders]) for each in (run, other)]
    return MeshChange(
        counts=other.state.mesh.counts,
        energy_per_atom_eV=(run.state.energy_eV - other.state.energy_eV) / len(cell.atoms),
        largest_charge_e=float(np.abs(run.populations.charges - other.populations.charges).max()),
        largest_order=float(np.abs(orders[0] - orders[1]).max(initial=0.0)),
        gap_eV=None if gaps[0] is None or gaps[1] is None else gaps[0].gap_eV - gaps[1].gap_eV,
    )


def _bands_along(cell: _Cell, state: BandState, path: str, n_points: int) -> BandPath:
    lines = lattice_path(cell.cell_A, path, n_points)
    energies = band_energies(cell.problem(None), lines.points, state.potential_eV)
    return BandPath(lines.path, lines.points, lines.distances, lines.labels, energies)


def default_mesh(cell_A: FloatArray) -> tuple[int, int, int]:
    """Mesh whose supercell is at least `MESH_LENGTH_A` high in every direction.

    Parameters
    ----------
    cell_A : (3, 3) ndarray
        Cell vectors as rows [angstrom].

    Returns
    -------
    counts : tuple of int
    """
    counts = np.ceil(MESH_LENGTH_A / _heights(cell_A) - 1e-9).astype(int)
    return int(counts[0]), int(counts[1]), int(counts[2])


def other_mesh(counts: tuple[int, int, int], cell_A: FloatArray) -> tuple[int, int, int]:
    """Mesh to compare with: half as dense, or twice along the shortest directions where there is one point only.

    Parameters
    ----------
    counts : tuple of int
        The mesh that is reported.
    cell_A : (3, 3) ndarray
        Cell vectors as rows [angstrom].

    Returns
    -------
    counts : tuple of int
    """
    if max(counts) > 1:
        halves = [(n + 1) // 2 for n in counts]
    else:
        heights = _heights(cell_A)
        halves = [2 if height < max(MESH_LENGTH_A, heights.min() + 1e-6) else 1 for height in heights]
    return halves[0], halves[1], halves[2]


def _heights(cell_A: FloatArray) -> FloatArray:
    heights: FloatArray = 1 / np.linalg.norm(np.linalg.inv(cell_A), axis=0)
    return heights


@dataclass(frozen=True, slots=True, eq=False)
class _Run:
    """What one mesh gives."""

    state: BandState
    populations: CrystalPopulations
    orders: tuple[BondOrders, ...]


@dataclass(frozen=True, slots=True, eq=False)
class _Cell:
    """All that does not depend on the mesh."""

    atoms: IntArray
    ions: IntArray
    ion_charges: FloatArray
    electrons: CellElectrons
    overlap: LatticeMatrix
    scaled: LatticeMatrix | None
    interaction_eV: FloatArray | None
    bonds: tuple[LatticeBond, ...]
    bond_vectors_A: FloatArray
    cell_A: FloatArray
    settings: ModelSettings
    options: Options

    @classmethod
    def of(
        cls,
        symbols: Sequence[str],
        positions_A: FloatArray,
        cell_A: FloatArray,
        bonds: Sequence[LatticeBond],
        table: ParameterTable,
        settings: ModelSettings,
        options: Options,
        crystal: CrystalOptions,
    ) -> _Cell:
        if not np.isfinite(cell_A).all() or abs(np.linalg.det(cell_A)) < 1e-3:
            raise InputError("the cell has no volume", mend="give three cell vectors that span space")
        in_bonds = {end for bond in bonds for end in (bond.metal, bond.donor)}
        is_ion = np.array(
            [
                not crystal.cations_basis and symbol in ALKALI | ALKALINE_EARTH and place not in in_bonds
                for place, symbol in enumerate(symbols)
            ]
        )
        atoms, ions = np.flatnonzero(~is_ion), np.flatnonzero(is_ion)
        ion_charges = np.array([1.0 if symbols[int(ion)] in ALKALI else 2.0 for ion in ions])
        kept = [symbols[int(atom)] for atom in atoms]
        _refuse_too_many_functions(kept, table, options.max_functions)
        pairs = lattice_pairs(kept, positions_A[atoms], cell_A, table)
        charge = options.charge or 0
        total = round(float(pairs.basis.core_charges.sum() + ion_charges.sum())) - charge
        interaction = None
        if options.charge_model == "self-consistent":
            if charge:
                raise InputError(
                    f"the cell has the charge {charge:+d}: charges that act back on a lattice need a neutral cell",
                    mend="add the counter-ions, or use --charges fixed",
                )
            softness = [COULOMB_EV_A / basis_params.atom(symbol).hardness_U_eV for symbol in kept] + [0.0] * len(ions)
            order = np.concatenate([atoms, ions])
            interaction = lattice_interaction(positions_A[order], np.array(softness), cell_A, settings.lambda_)
        overlap, scaled = lattice_overlaps(pairs, _channel_scale(kept, settings))
        place = {int(atom): number for number, atom in enumerate(atoms)}
        vectors = [
            positions_A[bond.donor] + np.array(bond.translation) @ cell_A - positions_A[bond.metal] for bond in bonds
        ]
        return cls(
            atoms=atoms,
            ions=ions,
            ion_charges=ion_charges,
            electrons=CellElectrons(total, options.unpaired_electrons),
            overlap=overlap,
            scaled=scaled,
            interaction_eV=interaction,
            bonds=tuple(LatticeBond(place[bond.metal], place[bond.donor], bond.translation) for bond in bonds),
            bond_vectors_A=np.array(vectors).reshape(-1, 3),
            cell_A=cell_A,
            settings=settings,
            options=options,
        )

    def problem(self, mesh: KMesh | None) -> BlochProblem:
        """H(k) and S(k), with sums prepared for a mesh or for any k-point."""
        overlap = self.overlap if mesh is None else self.overlap.on_mesh(mesh)
        scaled = self.scaled if mesh is None or self.scaled is None else self.scaled.on_mesh(mesh)
        K = channel_constants(self.settings)[0]
        return bloch_problem(self.overlap.pairs.basis, overlap, K, weighting=self.settings.weighting, scaled=scaled)

    def run(self, mesh: KMesh, start_charges: FloatArray | None = None) -> _Run:
        """Bands, populations and orders on a mesh."""
        basis = self.overlap.pairs.basis
        if 16 * len(mesh) * len(basis) ** 2 > MAX_ORBITAL_BYTES:
            raise LimitError(
                f"the orbitals of {len(basis)} functions on {len(mesh)} k-points do not fit into memory",
                mend="use a coarser mesh",
            )
        problem = self.problem(mesh)
        if self.interaction_eV is None:
            state = fixed_bands(problem, mesh, self.electrons)
        else:
            state = self_consistent_bands(
                problem,
                mesh,
                self.electrons,
                self.interaction_eV,
                self.ion_charges,
                start_charges=start_charges,
                max_iterations=self.options.max_iterations,
            )
        overlaps = [self.overlap.block(bond.metal, bond.donor, bond.translation) for bond in self.bonds]
        populations = crystal_populations(state, problem.overlap, basis)
        orders = crystal_orders(self.bonds, self.bond_vectors_A, overlaps, state, problem.overlap, basis)
        return _Run(state, populations, orders)


def _channel_scale(symbols: Sequence[str], settings: ModelSettings) -> ChannelScale | None:
    """Factors of the channels, where the settings tell them apart."""
    by_channel = channel_constants(settings)
    if len(set(by_channel)) == 1 and not settings.K_decay_per_A:
        return None
    radii = tuple(basis_params.atom(symbol).covalent_radius_A for symbol in symbols)
    return ChannelScale(by_channel, settings.K_decay_per_A, radii)


def _refuse_too_many_functions(symbols: Sequence[str], table: ParameterTable, limit: int) -> None:
    """Count before anything is built."""
    sizes = {s: sum(2 * shell.l + 1 for shell in element_parameters(table, s).shells) for s in set(symbols)}
    count = sum(sizes[symbol] for symbol in symbols)
    if count > limit:
        raise LimitError(
            f"{count} basis functions in the cell, more than the limit of {limit}",
            mend="use a smaller cell, or raise the limit with --max-functions",
        )
