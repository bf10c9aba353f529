"""Overlap matrix of a fragment."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from ehmo.conventions import atom_label
from ehmo.errors import InputError
from ehmo.harmonics import real_harmonics
from ehmo.orbitals.blocks import BlockStructure
from ehmo.orbitals.pairs import OrbitalPlan, PairGroup
from ehmo.orbitals.tables import SHORTEST_BOHR, table_positions
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.units import BOHR_A

_CHUNK = 4096  # pairs per step: keeps the temporaries in cache and far below one matrix


@dataclass(frozen=True, slots=True)
class ChannelScale:
    """Factor of each two-centre integral before its block is turned into the molecule's axes.

    K_m(R) = 1 + (K_m - 1) exp(-decay (R - R0)), with R0 the sum of the covalent radii; without decay it is K_m.

    Attributes
    ----------
    by_m : tuple of float
        K of the sigma, pi, delta and phi channel.
    decay_per_A : float
        Decay with distance, 0 for none [A^-1].
    radii_A : tuple of float
        Covalent radius of each atom of the fragment [angstrom].

    References
    ----------
    .. [1] wolfsberg-1952: K differs for sigma and pi.
    .. [2] calzaferri-1989: exponential dependence on distance.
    """

    by_m: tuple[float, float, float, float]
    decay_per_A: float = 0.0
    radii_A: tuple[float, ...] = ()

    def pair_radii(self, first: IntArray, second: IntArray) -> FloatArray:
        """Sum of the radii of each pair [angstrom]; zero where distance does not matter."""
        if not self.decay_per_A:
            return np.zeros(len(first))
        radii = np.array(self.radii_A)
        sums: FloatArray = radii[first] + radii[second]
        return sums

    def factors(self, channel_m: IntArray, excess_A: FloatArray) -> FloatArray:
        """Factors (n_pairs, n_channels) of pairs longer than the sum of radii by `excess_A`."""
        constants = np.array(self.by_m)[channel_m]
        factors: FloatArray = 1 + (constants - 1) * np.exp(-self.decay_per_A * excess_A)[:, None]
        return factors

    def factor_slopes(self, channel_m: IntArray, excess_A: FloatArray) -> FloatArray:
        """Derivative of `factors` by the distance [A^-1]."""
        return -self.decay_per_A * (self.factors(channel_m, excess_A) - 1)


def overlap_matrix(plan: OrbitalPlan, positions_A: FloatArray) -> FloatArray:
    """Overlap matrix of the basis functions.

    Parameters
    ----------
    plan : OrbitalPlan
        Basis and pairs of the fragment.
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].

    Returns
    -------
    overlap : (n_ao, n_ao) ndarray
        Symmetric, with unit diagonal.

    Raises
    ------
    InputError
        If two atoms lie on top of each other.
    """
    return _assemble(plan, positions_A, None)[0]


def scaled_overlap_matrices(
    plan: OrbitalPlan, positions_A: FloatArray, scale: ChannelScale
) -> tuple[FloatArray, FloatArray]:
    """Overlap matrix, and the same with every channel multiplied by its own factor.

    Parameters
    ----------
    plan, positions_A
        As in `overlap_matrix`.
    scale : ChannelScale
        Factors; they act in the frame of each bond, so the result turns with the molecule.

    Returns
    -------
    overlap, scaled : (n_ao, n_ao) ndarray
        The diagonal of `scaled` is zero: one-centre elements have no channel.
    """
    overlap, scaled = _assemble(plan, positions_A, scale)
    assert scaled is not None
    return overlap, scaled


def _assemble(
    plan: OrbitalPlan, positions_A: FloatArray, scale: ChannelScale | None
) -> tuple[FloatArray, FloatArray | None]:
    vectors = (positions_A[plan.second] - positions_A[plan.first]) * (1 / BOHR_A)
    distances = np.sqrt(np.einsum("pi,pi->p", vectors, vectors))
    if len(distances) and distances.min() < SHORTEST_BOHR:
        _refuse_overlapping_atoms(plan, distances)
    n_ao = len(plan.basis)
    overlap = np.eye(n_ao)
    scaled = None if scale is None else np.zeros((n_ao, n_ao))
    for index, chunk in pair_chunks(plan):
        group = plan.groups[index]
        segments, powers = table_positions(distances[chunk])
        harmonics = real_harmonics(vectors[chunk] / distances[chunk, None], group.structure.l_max)
        angular = harmonics[:, group.structure.angular_column]
        channels = channel_integrals(group, chunk, segments, powers)
        targets = flat_targets(plan, group, chunk)
        _put(overlap, targets, rotated_blocks(group.structure, channels, angular))
        if scale is not None and scaled is not None:
            excess = distances[chunk] * BOHR_A - scale.pair_radii(plan.first[chunk], plan.second[chunk])
            factors = scale.factors(group.structure.channel_m, excess)
            _put(scaled, targets, rotated_blocks(group.structure, channels * factors, angular))
    return overlap, scaled


def pair_chunks(plan: OrbitalPlan) -> Iterator[tuple[int, slice]]:
    """Group number and range of the pairs that are worked on at once."""
    for index, group in enumerate(plan.groups):
        for start in range(group.pairs.start, group.pairs.stop, _CHUNK):
            yield index, slice(start, min(start + _CHUNK, group.pairs.stop))


def channel_blocks(
    group: PairGroup, chunk: slice, segments: IntArray, powers: FloatArray, harmonics: FloatArray
) -> FloatArray:
    """Blocks (n_pairs, n_first * n_second) of some pairs from table positions and harmonics of their directions."""
    channels = channel_integrals(group, chunk, segments, powers)
    return rotated_blocks(group.structure, channels, harmonics[:, group.structure.angular_column])


def channel_integrals(group: PairGroup, chunk: slice, segments: IntArray, powers: FloatArray) -> FloatArray:
    """Two-centre integrals (n_pairs, n_channels) of some pairs out of the tables."""
    kind = group.kind[chunk.start - group.pairs.start : chunk.stop - group.pairs.start]
    pieces = group.coefficients[kind, np.minimum(segments, group.coefficients.shape[1] - 1)]
    channels: FloatArray = (powers[:, None, :] @ pieces)[:, 0]
    return channels


def rotated_blocks(structure: BlockStructure, channels: FloatArray, angular: FloatArray) -> FloatArray:
    """Blocks (n_pairs, n_first * n_second) from channel integrals and harmonics of the directions."""
    terms = (channels @ structure.mixing)[:, structure.radial_column] * angular
    blocks: FloatArray = terms @ structure.coupling
    return blocks


def flat_targets(plan: OrbitalPlan, group: PairGroup, chunk: slice) -> tuple[IntArray, IntArray]:
    """Positions of each block's elements in the flattened matrix, and of their mirror images."""
    n_ao = len(plan.basis)
    rows, columns = group.structure.element_rows, group.structure.element_columns
    first = plan.basis.atom_start[plan.first[chunk], None]
    second = plan.basis.atom_start[plan.second[chunk], None]
    return (first * n_ao + second) + (rows * n_ao + columns), (second * n_ao + first) + (columns * n_ao + rows)


def _put(matrix: FloatArray, targets: tuple[IntArray, IntArray], blocks: FloatArray) -> None:
    flat = matrix.reshape(-1)
    flat[targets[0]] = blocks
    flat[targets[1]] = blocks


def _refuse_overlapping_atoms(plan: OrbitalPlan, distances: FloatArray) -> None:
    worst = int(np.argmin(distances))
    names = [atom_label(plan.basis.symbols[atom], int(atom)) for atom in (plan.first[worst], plan.second[worst])]
    raise InputError(
        f"atoms {names[0]} and {names[1]} are only {distances[worst] * BOHR_A:.3f} Å apart",
        mend="remove the duplicate or correct the coordinates",
    )
