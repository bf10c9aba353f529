"""Orbitals on grids."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.calculate import bond_report
from ehmo.conventions import ORBITAL_NAMES
from ehmo.harmonics import real_harmonics
from ehmo.orbitals.grid import grid_around, grid_values
from ehmo.orbitals.overlap import overlap_matrix
from ehmo.orbitals.pairs import build_basis, orbital_plan
from ehmo.orbitals.radial import orthogonal_radial_functions
from ehmo.records.grid import Grid
from ehmo.units import BOHR_A
from tests.geometries import SPECIES
from tests.numeric_boxes import shell, table

SOFT = table(
    H=(1, (shell(1, 0, 1.3),)),
    O=(6, (shell(2, 0, 2.0), shell(2, 1, 1.9))),
    U=(6, (shell(6, 1, 2.8), shell(7, 1, 1.6), shell(6, 2, 2.6, 1.4, coefficients=(0.6, 0.6)), shell(5, 3, 2.1))),
)
"""A made-up set without steep functions, for which a grid of 0.1 angstrom is fine."""


def integrals(values, grid):
    """Matrix of the integrals over space of products of functions on a grid."""
    flat = values.reshape(len(values), -1)
    return flat @ flat.T * grid.cell_volume_A3 / BOHR_A**3


def test_values_are_the_definition_point_by_point():
    """law: R(r) Y_lm(direction), written out for every function of an atom with p, d and f shells."""
    symbols, positions = ("U",), np.array([[0.1, -0.2, 0.3]])
    basis = build_basis(symbols, SOFT)
    grid = Grid([-1.0, -0.7, -1.3], [0.31, 0.41, 0.37], (5, 4, 6))
    values = grid_values(np.eye(len(basis)), basis, positions, SOFT, grid)
    points = np.stack(np.meshgrid(*grid.axes_A(), indexing="ij"), axis=-1).reshape(-1, 3)
    r = np.linalg.norm(points - positions[0], axis=1) / BOHR_A
    harmonics = real_harmonics((points - positions[0]) / BOHR_A / r[:, None], 3)
    functions = orthogonal_radial_functions(SOFT.element("U").shells)
    for k in range(len(basis)):
        own = basis.shell_of[k]
        l = int(basis.shell_l[own])
        radial = sum(w * r ** (n - 1) * np.exp(-zeta * r) for n, zeta, w in functions[own].primitives)
        column = l * l + k - basis.shell_start[own]
        np.testing.assert_allclose(values[k].ravel(), radial * harmonics[:, column], atol=1e-12)


@pytest.mark.parametrize(
    ("name", "point"),
    [("pz", (0, 0, 1)), ("px", (1, 0, 0)), ("dxy", (1, 1, 0)), ("dyz", (0, 1, 1)), ("dz2", (0, 0, 1))],
)
def test_named_functions_are_positive_where_their_name_says(name, point):
    """law: without the Condon-Shortley sign each function is positive along the product in its name."""
    basis = build_basis(("U",), SOFT)
    l = "spdf".index(name[0])
    shell_index = int(np.flatnonzero(basis.shell_l == l)[0])
    coefficients = np.zeros((len(basis), 1))
    coefficients[basis.shell_start[shell_index] + ORBITAL_NAMES[l].index(name)] = 1
    where = 0.6 * np.array(point, dtype=float)
    grid = Grid(where - 0.01, [0.01] * 3, (3, 3, 3))
    assert grid_values(coefficients, basis, np.zeros((1, 3)), SOFT, grid)[0, 1, 1, 1] > 0


def test_integrals_over_a_fine_grid_are_the_overlap_matrix():
    """cross-check: the two-centre integrals of `overlap_matrix`, by summing over 0.1 angstrom."""
    symbols = ("U", "O", "H")
    positions = np.array([[0, 0, 0], [0.3, 1.6, 0.5], [-0.5, 2.3, 0.4]])
    basis = orbital_plan(symbols, SOFT).basis
    grid = grid_around(positions, 6.0, 0.12)
    found = integrals(grid_values(np.eye(len(basis)), basis, positions, SOFT, grid), grid)
    # The cusp of a 1s function is what a regular grid resolves worst.
    np.testing.assert_allclose(found, overlap_matrix(orbital_plan(symbols, SOFT), positions), atol=1e-3)


def test_orbitals_are_normalised_and_orthogonal(standard):
    """law: C^T S C = 1, over a grid that resolves vanadium's inner 3d exponent of 4.75."""
    fragment = SPECIES["VO4 3-"].fragment()
    report = bond_report(fragment)
    grid = grid_around(fragment.positions_A, 4.5, 0.09)
    chosen = report.state.coefficients[:, [2, 8, report.state.homo, report.state.homo + 1]]
    found = integrals(grid_values(chosen, report.basis, fragment.positions_A, standard, grid), grid)
    np.testing.assert_allclose(found, np.eye(4), atol=1e-3)


def test_a_grid_keeps_its_bounds():
    positions = np.array([[0.0, 0, 0], [10.0, 1, 2]])
    grid = grid_around(positions, 3.0, 0.1, most_points=40_000)
    axes = grid.axes_A()
    assert np.prod(grid.shape) <= 40_000
    assert all(
        axis[0] <= low and axis[-1] >= high for axis, low, high in zip(axes, (-3, -3, -3), (13, 4, 5), strict=True)
    )
    with pytest.raises(ValueError, match="no volume"):
        Grid([0, 0, 0], [0.1, 0.1, 0.1], (1, 4, 4))


def test_atoms_far_from_the_grid_add_nothing(standard):
    fragment = SPECIES["VOCl3"].fragment()
    basis = build_basis(fragment.symbols, standard)
    grid = Grid([60, 60, 60], [0.1] * 3, (4, 4, 4))
    assert not grid_values(np.eye(len(basis)), basis, fragment.positions_A, standard, grid).any()
