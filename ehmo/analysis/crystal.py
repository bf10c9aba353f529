"""Populations, bond orders and channels of a crystal, averaged over a mesh of k-points.

With P(k) = C n C^+ the block between an atom of the home cell and one of cell T is
P(T) = sum_k w_k exp(-2 pi i k.T) P(k). Orders and channels come from such real-space blocks, never from k-averaged
squares, so that a supercell gives the same as its folded mesh.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from ehmo.analysis.bonds import same_layout
from ehmo.analysis.channels import bond_channels
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.bloch import BlochSum, LatticeBond, MatrixArray
from ehmo.records.bonding import BondOrders
from ehmo.records.crystal_electronic import BandState, CrystalPopulations


def crystal_populations(state: BandState, overlap: BlochSum, basis: Basis) -> CrystalPopulations:
    """Mulliken populations of the functions, shells and atoms of a cell.

    Parameters
    ----------
    state : BandState
        Bands and their filling.
    overlap : BlochSum
        S(k).
    basis : Basis
        Functions of one cell.

    Returns
    -------
    populations : CrystalPopulations

    References
    ----------
    .. [1] mulliken-1955: R. S. Mulliken, J. Chem. Phys. 23, 1833 (1955).
    """
    n_ao = len(basis)
    pairs, net = np.zeros((n_ao, n_ao)), np.zeros(n_ao)
    for k, S, C, filling in _points(state, overlap):
        density = (C * filling) @ C.conj().T
        net += density.diagonal().real * state.mesh.weights[k]
        pairs += np.multiply(density, S.conj()).real * state.mesh.weights[k]
    gross = pairs.sum(axis=1)
    difference = (state.filling.occupations[0] - state.filling.occupations[1]) * state.mesh.weights[:, None]
    shell_spin = np.einsum("ksb,kb->s", state.shell_shares, difference)
    spin: FloatArray = np.zeros(len(basis.symbols))
    np.add.at(spin, basis.shell_atom, shell_spin)
    starts = basis.atom_start[:-1]
    by_atom = np.add.reduceat(np.add.reduceat(pairs, starts, axis=0), starts, axis=1)
    return CrystalPopulations(
        gross=gross,
        net=net,
        charges=basis.core_charges - np.add.reduceat(gross, starts),
        spin=spin,
        shell_gross=np.add.reduceat(gross, basis.shell_start),
        atom_overlap=by_atom + by_atom.T - np.diag(by_atom.diagonal()),
    )


def _points(state: BandState, overlap: BlochSum) -> Iterator[tuple[int, MatrixArray, MatrixArray, FloatArray]]:
    """Number, S(k), orbitals that hold electrons anywhere, and their electrons at that k."""
    filling = state.filling.occupations.sum(axis=0)
    n_occupied = int(filling.max(axis=0).nonzero()[0][-1]) + 1
    for k, S in enumerate(overlap.sums(state.mesh.points)):
        yield k, S, state.coefficients[k][:, :n_occupied], filling[k, :n_occupied]


def crystal_orders(
    bonds: Sequence[LatticeBond],
    bond_vectors_A: FloatArray,
    bond_overlaps: Sequence[FloatArray],
    state: BandState,
    overlap: BlochSum,
    basis: Basis,
) -> tuple[BondOrders, ...]:
    """Overlap populations, Mayer and Wiberg orders and channels of lattice bonds.

    Mayer: 2 sum over spins of (PS)_ij(T) (PS)_ji(-T); Wiberg and channels from the Löwdin density
    S^(1/2) P S^(1/2) at each k, summed into its real-space block.

    Parameters
    ----------
    bonds : sequence of LatticeBond
        Pairs of atoms with the cell of the donor.
    bond_vectors_A : (n_bonds, 3) ndarray
        From metal to donor [angstrom].
    bond_overlaps : sequence of (n_metal, n_donor) ndarray
        S between the two atoms of each bond.
    state : BandState
        Bands and their filling.
    overlap : BlochSum
        S(k).
    basis : Basis
        Functions of one cell.

    Returns
    -------
    orders : tuple of BondOrders
        One per bond. `orbital_overlap` runs over k and, fastest, over bands: overlap population of a band that holds
        two electrons at that k.

    References
    ----------
    .. [1] mayer-1983: I. Mayer, Chem. Phys. Lett. 97, 270 (1983).
    .. [2] wiberg-1968: K. B. Wiberg, Tetrahedron 24, 1083 (1968).
    .. [3] lowdin-1950: P.-O. Löwdin, J. Chem. Phys. 18, 365 (1950).
    """
    if not bonds:
        return ()
    rows = _BondedRows.of(bonds, basis)
    ends = (np.array([getattr(bond, end) for bond in bonds]) for end in ("metal", "donor"))
    members = same_layout(basis, *ends)
    lots = [_Lot.of(lot, bonds, bond_overlaps, state, rows) for lot in members]
    for k, S in enumerate(overlap.sums(state.mesh.points)):
        _add_point(k, S, state, rows, lots)
    directions = bond_vectors_A / np.linalg.norm(bond_vectors_A, axis=1, keepdims=True)
    filling = state.weighted_filling
    result: dict[int, BondOrders] = {}
    for lot in lots:
        first = bonds[lot.members[0]]
        layouts = basis.layouts[first.metal], basis.layouts[first.donor]
        result |= zip(lot.members, lot.orders(directions[lot.members], layouts, filling), strict=True)
    return tuple(result[index] for index in range(len(bonds)))


@dataclass(frozen=True, slots=True, eq=False)
class _BondedRows:
    """Functions of the metals and of the donors, and where each atom's begin among them."""

    metals: IntArray
    donors: IntArray
    metal_start: IntArray
    donor_start: IntArray

    @classmethod
    def of(cls, bonds: Sequence[LatticeBond], basis: Basis) -> _BondedRows:
        metals = np.flatnonzero(np.isin(basis.atom_of, [bond.metal for bond in bonds]))
        donors = np.flatnonzero(np.isin(basis.atom_of, [bond.donor for bond in bonds]))
        starts = (np.searchsorted(rows, basis.atom_start[:-1]) for rows in (metals, donors))
        return cls(metals, donors, *starts)


@dataclass(frozen=True, slots=True, eq=False)
class _Lot:
    """Bonds whose atoms carry the same shells, with the blocks that are summed for them over the mesh.

    `blocks` holds, for alpha and beta, (PS)(T), the transpose of (PS)(-T), and the Löwdin density.
    """

    members: list[int]
    phases: MatrixArray
    on_metal: IntArray
    on_donor: IntArray
    overlap: FloatArray
    blocks: FloatArray
    orbital_overlap: FloatArray

    @classmethod
    def of(
        cls,
        members: list[int],
        bonds: Sequence[LatticeBond],
        bond_overlaps: Sequence[FloatArray],
        state: BandState,
        rows: _BondedRows,
    ) -> _Lot:
        overlap = np.array([bond_overlaps[m] for m in members])
        translations = np.array([bonds[m].translation for m in members])
        return cls(
            members=members,
            phases=np.exp(-2j * np.pi * (state.mesh.points @ translations.T))[:, :, None, None],
            on_metal=rows.metal_start[[bonds[m].metal for m in members], None] + np.arange(overlap.shape[1]),
            on_donor=rows.donor_start[[bonds[m].donor for m in members], None] + np.arange(overlap.shape[2]),
            overlap=overlap,
            blocks=np.zeros((2, 3, *overlap.shape)),
            orbital_overlap=np.zeros((len(members), *state.energies_eV.shape)),
        )

    def orders(
        self, directions: FloatArray, layouts: tuple[tuple[int, ...], tuple[int, ...]], filling: FloatArray
    ) -> list[BondOrders]:
        forward, backward, lowdin = self.blocks.swapaxes(0, 1)
        channels = bond_channels(lowdin, directions, *layouts)
        mayer = 2 * (forward * backward).sum(axis=(0, 2, 3))
        wiberg = 2 * (lowdin * lowdin).sum(axis=(0, 2, 3))
        population = np.einsum("bkn,kn->b", self.orbital_overlap, filling) / 2
        return [
            BondOrders(
                overlap_population=float(population[b]),
                mayer=float(mayer[b]),
                wiberg=float(wiberg[b]),
                channel_weights=channels.weights[b],
                channel_shares=channels.shares[b],
                metal_hybrids=channels.metal_hybrids[b],
                donor_hybrids=channels.donor_hybrids[b],
                orbital_overlap=self.orbital_overlap[b].ravel(),
            )
            for b in range(len(self.members))
        ]


def _add_point(k: int, S: MatrixArray, state: BandState, rows: _BondedRows, lots: list[_Lot]) -> None:
    """Add the part of one k-point to every bond."""
    C = state.coefficients[k]
    eigenvalues, vectors = np.linalg.eigh(S)
    whole = np.ascontiguousarray(C), S @ C, (vectors * np.sqrt(eigenvalues)) @ (vectors.conj().T @ C)
    metal = [part[rows.metals] for part in whole]
    donor = [part[rows.donors] for part in whole]
    occupations = state.filling.occupations[:, k]
    spins = (0,) if np.array_equal(occupations[0], occupations[1]) else (0, 1)
    for spin in spins:
        held = np.flatnonzero(occupations[spin])
        filling = occupations[spin, held] * state.mesh.weights[k]
        kets = [part[:, held] * filling for part in metal]
        bras = [part[:, held].conj().T for part in donor]
        densities = kets[0] @ bras[1], kets[1] @ bras[0], kets[2] @ bras[2]
        for lot in lots:
            between = lot.on_metal[:, :, None], lot.on_donor[:, None, :]
            for which, density in enumerate(densities):
                part = _real_product(density[between], lot.phases[k])
                lot.blocks[spin, which] += part
                if len(spins) == 1:
                    lot.blocks[1, which] += part
    for lot in lots:
        towards_donor = lot.overlap @ donor[0].conj()[lot.on_donor] * lot.phases[k]
        lot.orbital_overlap[:, k] = 4 * (metal[0][lot.on_metal] * towards_donor).sum(axis=1).real


def _real_product(blocks: MatrixArray, phases: MatrixArray) -> FloatArray:
    """Real part of the product: the part of -k cancels the imaginary one."""
    if np.iscomplexobj(blocks):
        product: FloatArray = blocks.real * phases.real - blocks.imag * phases.imag
        return product
    return np.asarray(blocks * phases.real)
