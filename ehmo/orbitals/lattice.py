"""Overlap of basis functions across a lattice, and its Bloch sums.

Every pair of atoms is listed with the lattice translation of its second atom, each once, until every overlap left
out is below 1e-10. The Bloch phase goes by translation, not by atom position: S(k) = sum_T exp(2 pi i k.T) S(T).
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import product

import numpy as np
from scipy.sparse import csr_array

from basis_params import ParameterTable
from ehmo.conventions import NEGLECTED_OVERLAP, atom_label
from ehmo.errors import InputError, LimitError
from ehmo.harmonics import real_harmonics
from ehmo.orbitals.blocks import block_structure
from ehmo.orbitals.overlap import ChannelScale, channel_integrals, rotated_blocks
from ehmo.orbitals.pairs import PairGroup, build_basis, stacked_tables
from ehmo.orbitals.tables import DEGREE, LOG_STEP, SHORTEST_BOHR, OverlapTable, overlap_table, table_positions
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.basis import Basis
from ehmo.records.bloch import BlochSeries, KMesh, MatrixArray, hermitian, is_real_point
from ehmo.units import BOHR_A

MAX_PAIRS = 5_000_000
"""Pairs with translation beyond which a cell is refused: their blocks would fill gigabytes."""

SERIES_BYTES = 1 << 30
"""Size up to which the matrices of a mesh are summed beforehand [bytes]."""

_CHUNK = 4096
_DISTANCES_AT_ONCE = 1 << 20


@dataclass(frozen=True, slots=True, eq=False)
class LatticePairs:
    """Pairs of atoms within reach of one another, the second one in any cell; each pair once.

    Attributes
    ----------
    basis : Basis
        Functions of one cell.
    first, second : (n_pairs,) ndarray of int
        Atoms; the first lies in the home cell.
    translations : (n_pairs, 3) ndarray of int
        Cell of the second atom, in cell vectors.
    vectors_bohr : (n_pairs, 3) ndarray
        From the first to the second atom [bohr].
    groups : tuple of PairGroup
        Consecutive ranges of the pairs with the same shell layouts.
    """

    basis: Basis
    first: IntArray
    second: IntArray
    translations: IntArray
    vectors_bohr: FloatArray
    groups: tuple[PairGroup, ...]

    def __len__(self) -> int:
        return len(self.first)


@dataclass(frozen=True, slots=True, eq=False)
class LatticeMatrix:
    """Two-centre blocks of a real matrix on the lattice, with the same constant on the whole diagonal.

    Attributes
    ----------
    pairs : LatticePairs
        Where each block belongs.
    blocks : tuple of ndarray
        Per group of pairs: (n_pairs, n_first * n_second).
    constant : float
        On the diagonal: 1 for the overlap.
    """

    pairs: LatticePairs
    blocks: tuple[FloatArray, ...]
    constant: float

    def sums(self, points: FloatArray) -> Iterator[MatrixArray]:
        """M(k) at any fractional k-points, straight from the pairs; see `BlochSum`."""
        home = np.zeros(len(self.pairs), dtype=np.intp)
        for point in points:
            phases = 2 * np.pi * (self.pairs.translations @ point)
            even, odd = self._gathered(home, 1, np.cos(phases), np.sin(phases))
            yield hermitian(even[0], odd[0], self.constant, is_real_point(point))

    def on_mesh(self, mesh: KMesh) -> BlochSeries | LatticeMatrix:
        """The same with translations folded by the periodicity of a mesh, so that each k costs few products.

        On the mesh exp(2 pi i k.T) depends on T modulo the counts only; T and -T share a term.
        """
        sizes = np.array(mesh.counts)
        wrapped = self.pairs.translations % sizes
        own = np.ravel_multi_index(tuple(wrapped.T), mesh.counts)
        mirrored = np.ravel_multi_index(tuple((-wrapped % sizes).T), mesh.counts)
        terms, place = np.unique(np.minimum(own, mirrored), return_inverse=True)
        n_terms = max(len(terms), 1)
        n_ao = len(self.pairs.basis)
        if 16 * n_terms * n_ao**2 > SERIES_BYTES:
            return self
        signs = np.where(own <= mirrored, 1.0, -1.0)
        even, odd = self._gathered(place.astype(np.intp), n_terms, np.ones(len(signs)), signs)
        translations = np.zeros((n_terms, 3), dtype=np.intp)
        translations[: len(terms)] = np.stack(np.unravel_index(terms, mesh.counts), axis=1)
        return BlochSeries(translations, even, odd, self.constant)

    def _gathered(
        self, term: IntArray, n_terms: int, even_factors: FloatArray, odd_factors: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Symmetric and antisymmetric matrices (n_terms, n, n) of the blocks times their factors, summed by term."""
        basis, n_atoms = self.pairs.basis, len(self.pairs.basis.symbols)
        even, odd = (np.zeros((n_terms, len(basis), len(basis))) for _ in range(2))
        for group, blocks in zip(self.pairs.groups, self.blocks, strict=True):
            first, second = self.pairs.first[group.pairs], self.pairs.second[group.pairs]
            key = (term[group.pairs] * n_atoms + first) * n_atoms + second
            places, row = np.unique(key, return_inverse=True)
            pair_place, second_place = np.divmod(places, n_atoms)
            term_place, first_place = np.divmod(pair_place, n_atoms)
            i = basis.atom_start[first_place, None] + group.structure.element_rows
            j = basis.atom_start[second_place, None] + group.structure.element_columns
            for matrix, factors, sign in ((even, even_factors, 1.0), (odd, odd_factors, -1.0)):
                shape = (len(places), len(blocks))
                sums = csr_array((factors[group.pairs], (row, np.arange(len(blocks)))), shape=shape) @ blocks
                matrix[term_place[:, None], i, j] += sums
                matrix[term_place[:, None], j, i] += sign * sums
        return even, odd

    def block(self, first: int, second: int, translation: Sequence[int]) -> FloatArray:
        """Block between an atom of the home cell and one of some cell; zero beyond reach.

        Parameters
        ----------
        first, second : int
            Different atoms, or one atom with an image of itself.
        translation : sequence of int
            Cell of the second atom.

        Returns
        -------
        block : (n_first, n_second) ndarray
        """
        there = self._listed(first, second, np.array(translation))
        if there is not None:
            return there
        back = self._listed(second, first, -np.array(translation))
        if back is not None:
            return back.T
        sizes = self.pairs.basis.atom_start[[first + 1, second + 1]] - self.pairs.basis.atom_start[[first, second]]
        return np.zeros(tuple(sizes))

    def _listed(self, first: int, second: int, translation: IntArray) -> FloatArray | None:
        """Block of a pair if the list has it in this direction."""
        pairs, starts = self.pairs, self.pairs.basis.atom_start
        same = (pairs.first == first) & (pairs.second == second) & (pairs.translations == translation).all(axis=1)
        if not same.any():
            return None
        index = int(same.argmax())
        group, blocks = next(
            (group, blocks) for group, blocks in zip(pairs.groups, self.blocks, strict=True) if index < group.pairs.stop
        )
        n_first = int(starts[first + 1] - starts[first])
        block: FloatArray = blocks[index - group.pairs.start].reshape(n_first, -1)
        return block


def lattice_pairs(
    symbols: Sequence[str], positions_A: FloatArray, cell_A: FloatArray, table: ParameterTable
) -> LatticePairs:
    """Basis of a cell and every pair whose overlap may reach 1e-10.

    Parameters
    ----------
    symbols : sequence of str
        Chemical symbols of the atoms in the cell.
    positions_A : (n_atoms, 3) ndarray
        Cartesian coordinates [angstrom].
    cell_A : (3, 3) ndarray
        Cell vectors as rows [angstrom].
    table : ParameterTable
        Parameter set.

    Returns
    -------
    pairs : LatticePairs

    Raises
    ------
    ParameterError
        If the set lacks an element.
    InputError
        If two atoms, or an atom and an image, lie on top of each other.
    LimitError
        If there are more than `MAX_PAIRS` pairs.
    """
    symbols = tuple(symbols)
    basis = build_basis(symbols, table)
    shells = {symbol: table.element(symbol).shells for symbol in set(symbols)}
    positions, cell = positions_A / BOHR_A, cell_A / BOHR_A

    def table_of(a: str, b: str) -> OverlapTable:
        return overlap_table(shells[a], shells[b])

    reach = {(a, b): table_reach(table_of(a, b).coefficients) for a in shells for b in shells}
    members: dict[tuple[int, ...], list[int]] = {}
    for atom, layout in enumerate(basis.layouts):
        members.setdefault(layout, []).append(atom)
    ordered = sorted(members)
    parts: list[tuple[IntArray, IntArray, IntArray, FloatArray]] = []
    groups: list[PairGroup] = []
    start = 0
    for i, layout_a in enumerate(ordered):
        for layout_b in ordered[i:]:
            lists = np.array(members[layout_a]), np.array(members[layout_b])
            found = _pairs_within(symbols, positions, cell, lists, reach, start)
            if not len(found[0]):
                continue
            kind, coefficients = stacked_tables(symbols, found[0], found[1], table_of)
            stop = start + len(found[0])
            groups.append(PairGroup(slice(start, stop), block_structure(layout_a, layout_b), kind, coefficients))
            parts.append(found)
            start = stop
    if not parts:
        none = np.zeros(0, dtype=np.intp)
        return LatticePairs(basis, none, none, np.zeros((0, 3), dtype=np.intp), np.zeros((0, 3)), ())
    first, second, translations, vectors = (np.concatenate(column) for column in zip(*parts, strict=True))
    _refuse_overlapping_atoms(symbols, first, second, translations, vectors)
    return LatticePairs(basis, first, second, translations, vectors, tuple(groups))


def lattice_overlaps(
    pairs: LatticePairs, scale: ChannelScale | None = None
) -> tuple[LatticeMatrix, LatticeMatrix | None]:
    """Overlap blocks of all pairs, and on request the same with each channel multiplied by its own factor.

    Parameters
    ----------
    pairs : LatticePairs
        Pairs with their vectors.
    scale : ChannelScale, optional
        Factors by |m| and distance, with a covalent radius for each atom of the cell.

    Returns
    -------
    overlap : LatticeMatrix
        With 1 on the diagonal.
    scaled : LatticeMatrix or None
        With 0 on the diagonal: one-centre elements have no channel.
    """
    distances = np.sqrt(np.einsum("pi,pi->p", pairs.vectors_bohr, pairs.vectors_bohr))
    plain: list[FloatArray] = []
    weighted: list[FloatArray] = []
    for group in pairs.groups:
        count, size = group.pairs.stop - group.pairs.start, len(group.structure.element_rows)
        blocks = np.empty((count, size))
        scaled = None if scale is None else np.empty((count, size))
        for start in range(group.pairs.start, group.pairs.stop, _CHUNK):
            chunk = slice(start, min(start + _CHUNK, group.pairs.stop))
            own = slice(chunk.start - group.pairs.start, chunk.stop - group.pairs.start)
            segments, powers = table_positions(distances[chunk])
            harmonics = real_harmonics(pairs.vectors_bohr[chunk] / distances[chunk, None], group.structure.l_max)
            angular = harmonics[:, group.structure.angular_column]
            channels = channel_integrals(group, chunk, segments, powers)
            blocks[own] = rotated_blocks(group.structure, channels, angular)
            if scale is not None and scaled is not None:
                excess = distances[chunk] * BOHR_A - scale.pair_radii(pairs.first[chunk], pairs.second[chunk])
                factors = scale.factors(group.structure.channel_m, excess)
                scaled[own] = rotated_blocks(group.structure, channels * factors, angular)
        plain.append(blocks)
        if scaled is not None:
            weighted.append(scaled)
    overlap = LatticeMatrix(pairs, tuple(plain), 1.0)
    return overlap, None if scale is None else LatticeMatrix(pairs, tuple(weighted), 0.0)


def table_reach(coefficients: FloatArray) -> float:
    """Distance beyond which every overlap of a table is below 1e-10 [bohr].

    Parameters
    ----------
    coefficients : (n_segments, DEGREE + 1, n_channels) ndarray
        See `OverlapTable`.

    Returns
    -------
    reach : float
    """
    t = np.linspace(-1, 1, 17)
    values = np.abs(np.vander(t, DEGREE + 1, increasing=True) @ coefficients).max(axis=2)
    positions = np.arange(len(coefficients))[:, None] + (t + 1) / 2
    last = positions[values >= NEGLECTED_OVERLAP].max(initial=0.0)
    return float(SHORTEST_BOHR * np.exp(LOG_STEP * (last + (t[1] - t[0]) / 2)))


def translations_within(cell: FloatArray, positions: FloatArray, reach: float) -> IntArray:
    """Lattice translations T for which some atom lies within reach of some atom moved by T.

    Parameters
    ----------
    cell : (3, 3) ndarray
        Cell vectors as rows.
    positions : (n, 3) ndarray
        Cartesian coordinates in the same unit.
    reach : float
        Distance in the same unit.

    Returns
    -------
    translations : (n_t, 3) ndarray of int
        In cell vectors; a box, so that some lie farther.

    Raises
    ------
    LimitError
        If there are far too many.
    """
    heights = 1 / np.linalg.norm(np.linalg.inv(cell), axis=0)
    fractional = positions @ np.linalg.inv(cell)
    spread = fractional.max(axis=0) - fractional.min(axis=0)
    bounds = np.floor(reach / heights + spread).astype(int)
    if np.prod(2.0 * bounds + 1) > MAX_PAIRS:
        raise LimitError(
            "too many cells lie within reach of the basis functions",
            mend="check the cell, and give every atom within or near it",
        )
    return np.array(list(product(*(range(-n, n + 1) for n in bounds))), dtype=np.intp)


def _pairs_within(
    symbols: tuple[str, ...],
    positions: FloatArray,
    cell: FloatArray,
    lists: tuple[IntArray, IntArray],
    reach: Mapping[tuple[str, str], float],
    so_far: int,
) -> tuple[IntArray, IntArray, IntArray, FloatArray]:
    """Pairs of one atom of each list, the second one in any cell; of two equal lists each pair once."""
    a, b = lists
    limits = np.array([[reach[symbols[i], symbols[j]] for j in b] for i in a])
    translations = translations_within(cell, positions, float(limits.max()))
    same = len(a) == len(b) and bool((a == b).all())
    forward = _forward(translations)
    between = positions[b] - positions[a][:, None]
    firsts, seconds, cells, vectors = [], [], [], []
    step = max(1, _DISTANCES_AT_ONCE // limits.size)
    for start in range(0, len(translations), step):
        some = translations[start : start + step]
        moved = between + (some @ cell)[:, None, None, :]
        near = np.einsum("tabi,tabi->tab", moved, moved) < limits**2
        if same:
            near &= (a[:, None] < b) | ((a[:, None] == b) & forward[start : start + step, None, None])
        t, i, j = near.nonzero()
        firsts.append(a[i])
        seconds.append(b[j])
        cells.append(some[t])
        vectors.append(moved[near])
        so_far += len(t)
        if so_far > MAX_PAIRS:
            raise LimitError(
                f"more than {MAX_PAIRS} pairs of atoms lie within reach of the basis functions",
                mend="use a smaller cell, or a set with tighter exponents",
            )
    return np.concatenate(firsts), np.concatenate(seconds), np.concatenate(cells), np.concatenate(vectors)


def _forward(translations: IntArray) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
    """One of each T, -T: whether the first component that is not zero is positive."""
    x, y, z = translations.T
    chosen: np.ndarray[tuple[int], np.dtype[np.bool_]] = (x > 0) | ((x == 0) & ((y > 0) | ((y == 0) & (z > 0))))
    return chosen


def _refuse_overlapping_atoms(
    symbols: tuple[str, ...], first: IntArray, second: IntArray, translations: IntArray, vectors: FloatArray
) -> None:
    squares = np.einsum("pi,pi->p", vectors, vectors)
    worst = int(np.argmin(squares))
    distance = float(np.sqrt(squares[worst]))
    if distance >= SHORTEST_BOHR:
        return
    names = [atom_label(symbols[atom], int(atom)) for atom in (first[worst], second[worst])]
    where = " in the next cell" if translations[worst].any() else ""
    raise InputError(
        f"atoms {names[0]} and {names[1]}{where} are only {distance * BOHR_A:.3f} Å apart",
        mend="remove the duplicate or correct the coordinates",
    )
