"""Overlap matrices for many sets of exponents at one geometry.

Every function is tabulated with its exponents at three values; the overlap of two functions is interpolated in both.
The functions are normalised and orthogonal at each value, so the interpolated ones stay so on their own atom.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from math import exp, sqrt

import numpy as np

from basis_params import Shell
from ehmo.harmonics import real_harmonics
from ehmo.orbitals.overlap import channel_integrals, flat_targets, pair_chunks, rotated_blocks
from ehmo.orbitals.pairs import OrbitalPlan, PairGroup, stacked_tables
from ehmo.orbitals.radial import RadialFunction, orthogonal_radial_functions
from ehmo.orbitals.tables import function_table, table_positions
from ehmo.records.arrays import FloatArray
from ehmo.units import BOHR_A

NODE = sqrt(3)
"""Steps at which functions are tabulated beside the tabulated exponents [standard deviations].

With 0 and both signs it makes the nodes of Gauss-Hermite quadrature: the error of the interpolation is orthogonal to
all lower powers of a normally distributed step.
"""

CHANNELS = 4


@dataclass(frozen=True, slots=True, eq=False)
class ExponentGrid:
    """Two-centre overlaps with the functions at every pair of nodes.

    Attributes
    ----------
    matrices : (n_parts, n_nodes, n_nodes, n_ao, n_ao) ndarray
        Element i, j of [part, p, q] has function i at node p and function j at node q; zero within an atom. There
        is one part, or one for each of sigma, pi, delta, phi; one node (0), or three (-NODE, 0, NODE).
    """

    matrices: FloatArray

    def two_centre(self, steps: FloatArray) -> FloatArray:
        """Overlaps between atoms for given exponents.

        Parameters
        ----------
        steps : (n_draws, n_ao) ndarray
            How far the exponents of each function are moved [standard deviations].

        Returns
        -------
        parts : (n_draws, n_parts, n_ao, n_ao) ndarray
        """
        n_nodes = self.matrices.shape[1]
        if n_nodes == 1:
            return np.broadcast_to(self.matrices[:, 0, 0], (len(steps), *self.matrices[:, 0, 0].shape))
        weights = _lagrange(steps)
        parts = np.zeros((len(steps), len(self.matrices), *self.matrices.shape[-2:]))
        for p in range(n_nodes):
            half = sum(weights[:, None, None, q] * self.matrices[:, p, q] for q in range(n_nodes))
            parts += weights[:, p, None, :][..., None] * half
        return parts


def _lagrange(steps: FloatArray) -> FloatArray:
    """(n_draws, 3, n_ao) weights of the nodes."""
    scaled = steps / NODE
    return np.stack([scaled * (scaled - 1) / 2, 1 - scaled**2, scaled * (scaled + 1) / 2], axis=1)


def moved_shell(shell: Shell, relative_sd: tuple[float, ...], step: float) -> Shell:
    """Shell whose exponents are zeta_i exp(r_i step), with r_i the relative standard deviation of each."""
    zetas = tuple(zeta * exp(r * step) for zeta, r in zip(shell.zetas, relative_sd, strict=True))
    return replace(shell, zetas=zetas)


def exponent_grid(
    plan: OrbitalPlan,
    positions_A: FloatArray,
    shells: Mapping[str, tuple[Shell, ...]],
    relative_sd: Mapping[str, tuple[tuple[float, ...], ...]],
    *,
    by_channel: bool,
) -> ExponentGrid:
    """Overlaps at all nodes for one geometry.

    Parameters
    ----------
    plan : OrbitalPlan
        Basis and pairs of the fragment.
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].
    shells : mapping of str to tuple of Shell
        Shells of each element.
    relative_sd : mapping of str to tuple of tuple of float
        Relative standard deviation of each exponent of each shell. If all are zero there is one node.
    by_channel : bool
        Whether sigma, pi, delta and phi parts are kept apart.

    Returns
    -------
    grid : ExponentGrid
    """
    vary = any(r for element in relative_sd.values() for shell in element for r in shell)
    nodes = (-NODE, 0.0, NODE) if vary else (0.0,)
    functions = {symbol: [_functions(shells[symbol], relative_sd[symbol], node) for node in nodes] for symbol in shells}
    vectors = (positions_A[plan.second] - positions_A[plan.first]) * (1 / BOHR_A)
    distances = np.sqrt(np.einsum("pi,pi->p", vectors, vectors))
    n_ao = len(plan.basis)
    matrices = np.zeros((CHANNELS if by_channel else 1, len(nodes), len(nodes), n_ao, n_ao))
    groups = {(p, q): _groups(plan, functions, p, q) for p in range(len(nodes)) for q in range(len(nodes))}
    for index, chunk in pair_chunks(plan):
        group = plan.groups[index]
        segments, powers = table_positions(distances[chunk])
        harmonics = real_harmonics(vectors[chunk] / distances[chunk, None], group.structure.l_max)
        angular = harmonics[:, group.structure.angular_column]
        here, mirrored = flat_targets(plan, group, chunk)
        for (p, q), moved in groups.items():
            channels = channel_integrals(moved[index], chunk, segments, powers)
            for m in range(len(matrices)):
                chosen = channels * (group.structure.channel_m == m) if by_channel else channels
                blocks = rotated_blocks(group.structure, chosen, angular)
                matrices[m, p, q].reshape(-1)[here] = blocks
                matrices[m, q, p].reshape(-1)[mirrored] = blocks
    return ExponentGrid(matrices)


def _functions(
    shells: tuple[Shell, ...], relative_sd: tuple[tuple[float, ...], ...], node: float
) -> tuple[RadialFunction, ...]:
    moved = tuple(moved_shell(shell, r, node) for shell, r in zip(shells, relative_sd, strict=True))
    return orthogonal_radial_functions(moved)


def _groups(
    plan: OrbitalPlan, functions: Mapping[str, list[tuple[RadialFunction, ...]]], p: int, q: int
) -> tuple[PairGroup, ...]:
    """Groups of the plan with the first atom's functions at node p and the second's at node q."""
    groups = []
    for group in plan.groups:
        kind, coefficients = stacked_tables(
            plan.basis.symbols,
            plan.first[group.pairs],
            plan.second[group.pairs],
            lambda a, b: function_table(functions[a][p], functions[b][q]),
        )
        groups.append(PairGroup(group.pairs, group.structure, kind, coefficients))
    return tuple(groups)
