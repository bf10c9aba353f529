"""Derivatives of the overlap matrix by the positions, contracted with weights before they fill any matrix."""

from __future__ import annotations

from functools import lru_cache

import numpy as np

from ehmo.harmonics import harmonic_gradients, real_harmonics
from ehmo.orbitals.blocks import BlockStructure
from ehmo.orbitals.overlap import ChannelScale, flat_targets, pair_chunks
from ehmo.orbitals.pairs import OrbitalPlan, PairGroup
from ehmo.orbitals.tables import LOG_STEP, table_positions
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.units import BOHR_A


def overlap_gradient(
    plan: OrbitalPlan,
    positions_A: FloatArray,
    weights: FloatArray,
    *,
    scale: ChannelScale | None = None,
    scaled_weights: FloatArray | None = None,
) -> FloatArray:
    """Derivative of sum_ij w_ij S_ij + sum_ij u_ij (K S)_ij by the positions, at fixed w and u.

    Parameters
    ----------
    plan : OrbitalPlan
        Basis and pairs of the fragment.
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].
    weights : (n_ao, n_ao) ndarray
        w, symmetric; elements within an atom do not count, as S is constant there.
    scale : ChannelScale, optional
        Factors of the channels in K S.
    scaled_weights : (n_ao, n_ao) ndarray, optional
        u, symmetric; needs `scale`.

    Returns
    -------
    gradient : (n_atoms, 3) ndarray
        In the unit of the weights per [angstrom].
    """
    vectors = (positions_A[plan.second] - positions_A[plan.first]) * (1 / BOHR_A)
    distances = np.sqrt(np.einsum("pi,pi->p", vectors, vectors))
    directions = vectors / distances[:, None]
    pulls = np.zeros((len(distances), 3))
    for index, chunk in pair_chunks(plan):
        group = plan.groups[index]
        targets, _ = flat_targets(plan, group, chunk)
        segments, powers = table_positions(distances[chunk])
        values, slopes = _channels(group, chunk, segments, powers, distances[chunk])
        parts = [(weights.reshape(-1)[targets], values, slopes)]
        if scale is not None and scaled_weights is not None:
            excess = distances[chunk] * BOHR_A - scale.pair_radii(plan.first[chunk], plan.second[chunk])
            factors = scale.factors(group.structure.channel_m, excess)
            rise = scale.factor_slopes(group.structure.channel_m, excess) * BOHR_A
            parts.append((scaled_weights.reshape(-1)[targets], values * factors, slopes * factors + values * rise))
        pulls[chunk] = _pulls(group, parts, directions[chunk], distances[chunk])
    pulls *= 2 / BOHR_A  # both halves of the matrix
    gradient = np.zeros_like(positions_A)
    np.add.at(gradient, plan.second, pulls)
    np.subtract.at(gradient, plan.first, pulls)
    return gradient


def _channels(
    group: PairGroup, chunk: slice, segments: IntArray, powers: FloatArray, distances: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Two-centre integrals (n_pairs, n_channels) and their derivatives by the distance [bohr^-1]."""
    kind = group.kind[chunk.start - group.pairs.start : chunk.stop - group.pairs.start]
    pieces = group.coefficients[kind, np.minimum(segments, group.coefficients.shape[1] - 1)]
    both = np.zeros((len(powers), 2, powers.shape[1]))
    both[:, 0] = powers
    # t = 2 (ln(R/R0)/step - segment) - 1, so dt/dR = 2/(step R).
    both[:, 1, 1:] = powers[:, :-1] * np.arange(1, powers.shape[1]) * (2 / LOG_STEP / distances)[:, None]
    result = both @ pieces
    return result[:, 0], result[:, 1]


def _pulls(
    group: PairGroup,
    parts: list[tuple[FloatArray, FloatArray, FloatArray]],
    directions: FloatArray,
    distances: FloatArray,
) -> FloatArray:
    """(n_pairs, 3) derivative of the weighted elements of one block by the position of the second atom [bohr^-1]."""
    structure = group.structure
    harmonics = real_harmonics(directions, structure.l_max)
    angular = harmonics[:, structure.angular_column]
    radial_pull = np.zeros(len(distances))
    by_harmonic = np.zeros_like(harmonics)
    for weights, values, slopes in parts:
        terms = weights @ structure.coupling.T
        radial_pull += np.einsum("pt,pt,pt->p", terms, (slopes @ structure.mixing)[:, structure.radial_column], angular)
        terms *= (values @ structure.mixing)[:, structure.radial_column]
        by_harmonic += terms @ _column_sum(structure)
    turning = np.einsum("pc,pci->pi", by_harmonic, harmonic_gradients(directions, structure.l_max))
    turning -= directions * np.einsum("pi,pi->p", turning, directions)[:, None]
    pulls: FloatArray = radial_pull[:, None] * directions + turning / distances[:, None]
    return pulls


@lru_cache(maxsize=256)
def _column_sum(structure: BlockStructure) -> FloatArray:
    """Matrix (n_terms, n_harmonics) that adds up the terms of each harmonic."""
    columns = np.arange((structure.l_max + 1) ** 2)
    same: FloatArray = np.equal.outer(structure.angular_column, columns).astype(np.float64)
    return same
