"""Dipole integrals of the basis functions.

r acts on a function of one atom as r R_l Y_lm times Y_1k, which is a sum over l - 1 and l + 1: dipole integrals are
overlaps with functions of shifted n and l, so they share the tables and blocks of the overlap.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache, lru_cache
from math import pi, sqrt

import numpy as np

from basis_params import ParameterTable
from ehmo.harmonics import product_integrals, real_harmonics
from ehmo.orbitals.blocks import block_structure
from ehmo.orbitals.overlap import channel_blocks, flat_targets, pair_chunks
from ehmo.orbitals.pairs import OrbitalPlan, PairGroup, orbital_plan, stacked_tables
from ehmo.orbitals.radial import RadialFunction, moment_functions, orthogonal_radial_functions
from ehmo.orbitals.tables import OverlapTable, function_table, table_positions
from ehmo.records.arrays import FloatArray
from ehmo.units import BOHR_A

_XYZ = [2, 0, 1]
"""Places of x, y and z among the p functions, whose order is y, z, x."""


@dataclass(frozen=True, slots=True, eq=False)
class DipolePlan:
    """All of the dipole integrals that follows from elements and parameters alone.

    Attributes
    ----------
    groups : tuple of PairGroup
        As in the orbital plan, with the moments of the second atom in place of its functions.
    moments : tuple of (n_moments, n_second * 3) ndarray
        Per group: how x, y, z times each function of the second atom is made of its moments.
    one_centre : dict of str to (3, n, n) ndarray
        Integrals within each element, about its nucleus [bohr].
    """

    groups: tuple[PairGroup, ...]
    moments: tuple[FloatArray, ...]
    one_centre: dict[str, FloatArray]


def dipole_integrals(
    plan: OrbitalPlan, table: ParameterTable, positions_A: FloatArray, overlap: FloatArray
) -> FloatArray:
    """Matrices of x, y and z in the basis functions.

    Parameters
    ----------
    plan : OrbitalPlan
        Basis and pairs of the fragment.
    table : ParameterTable
        Parameter set that the plan was made with.
    positions_A : (n_atoms, 3) ndarray
        Coordinates [angstrom].
    overlap : (n_ao, n_ao) ndarray
        Overlap matrix of the same positions.

    Returns
    -------
    dipoles : (3, n_ao, n_ao) ndarray
        About the origin of the coordinates; each symmetric [angstrom].
    """
    shifted = dipole_plan(plan.basis.symbols, table)
    n_ao = len(plan.basis)
    dipoles = np.zeros((3, n_ao, n_ao))
    vectors = (positions_A[plan.second] - positions_A[plan.first]) * (1 / BOHR_A)
    distances = np.sqrt(np.einsum("pi,pi->p", vectors, vectors))
    origins = positions_A * (1 / BOHR_A)
    flat = dipoles.reshape(3, -1)
    for index, chunk in pair_chunks(plan):
        moved, moments = shifted.groups[index], shifted.moments[index]
        segments, powers = table_positions(distances[chunk])
        harmonics = real_harmonics(vectors[chunk] / distances[chunk, None], moved.structure.l_max)
        blocks = channel_blocks(moved, chunk, segments, powers, harmonics)
        # x, y and z times every function of the second atom at once: columns run over (function, axis).
        about_second = blocks.reshape(-1, len(moments)) @ moments
        targets, _ = flat_targets(plan, plan.groups[index], chunk)
        values = about_second.reshape(*targets.shape, 3)
        values += overlap.reshape(-1)[targets][..., None] * origins[plan.second[chunk], None]
        flat[:, targets] = values.transpose(2, 0, 1)
    dipoles += dipoles.transpose(0, 2, 1)
    for atom, symbol in enumerate(plan.basis.symbols):
        own = plan.basis.functions_of(atom)
        dipoles[:, own, own] = shifted.one_centre[symbol] + origins[atom, :, None, None] * overlap[own, own]
    dipoles *= BOHR_A
    return dipoles


@lru_cache(maxsize=16)
def dipole_plan(symbols: tuple[str, ...], table: ParameterTable) -> DipolePlan:
    """Moments and tables for the pairs of an orbital plan.

    Parameters
    ----------
    symbols : tuple of str
        Chemical symbols.
    table : ParameterTable
        Parameter set.

    Returns
    -------
    plan : DipolePlan
    """
    plan = orbital_plan(symbols, table)
    functions = {symbol: orthogonal_radial_functions(table.element(symbol).shells) for symbol in set(symbols)}
    moments = {symbol: moment_functions(functions[symbol]) for symbol in functions}

    def moment_table(first: str, second: str) -> OverlapTable:
        return function_table(functions[first], moments[second])

    groups, matrices = [], []
    for group in plan.groups:
        first, second = plan.first[group.pairs], plan.second[group.pairs]
        layout_a, layout_b = plan.basis.layouts[first[0]], plan.basis.layouts[second[0]]
        kind, coefficients = stacked_tables(symbols, first, second, moment_table)
        raised = tuple(l for shell in layout_b for l in (shell - 1, shell + 1) if l >= 0)
        groups.append(PairGroup(group.pairs, block_structure(layout_a, raised), kind, coefficients))
        matrices.append(_moment_matrices(layout_b))
    return DipolePlan(tuple(groups), tuple(matrices), {s: _one_centre(functions[s]) for s in functions})


@cache
def _moment_matrices(layout: tuple[int, ...]) -> FloatArray:
    """(n_moments, n * 3) coefficients of the moments in x, y and z times each function of a layout."""
    columns = []
    for l in layout:
        gaunt = sqrt(4 * pi / 3) * product_integrals(1, l)
        degrees = [degree for degree in (l - 1, l + 1) if degree >= 0]
        rows = np.concatenate([np.arange(degree**2, (degree + 1) ** 2) for degree in degrees])
        columns.append(gaunt[_XYZ][:, :, rows].transpose(0, 2, 1))
    n_rows = [part.shape[1] for part in columns]
    matrices = np.zeros((3, sum(n_rows), sum(2 * l + 1 for l in layout)))
    row = column = 0
    for part in columns:
        matrices[:, row : row + part.shape[1], column : column + part.shape[2]] = part
        row += part.shape[1]
        column += part.shape[2]
    columns_last = np.ascontiguousarray(matrices.transpose(1, 2, 0)).reshape(matrices.shape[1], -1)
    columns_last.setflags(write=False)
    return columns_last


def _one_centre(functions: tuple[RadialFunction, ...]) -> FloatArray:
    starts = np.cumsum([0] + [2 * f.l + 1 for f in functions])
    matrix = np.zeros((3, starts[-1], starts[-1]))
    for i, bra in enumerate(functions):
        for j, ket in enumerate(functions):
            if abs(bra.l - ket.l) != 1:
                continue
            raised = RadialFunction(bra.l, tuple((n + 1, zeta, weight) for n, zeta, weight in ket.primitives))
            gaunt = sqrt(4 * pi / 3) * product_integrals(1, ket.l)[_XYZ]
            angular = gaunt[:, :, bra.l**2 : (bra.l + 1) ** 2].transpose(0, 2, 1)
            matrix[:, starts[i] : starts[i + 1], starts[j] : starts[j + 1]] = bra.overlap(raised) * angular
    return matrix
