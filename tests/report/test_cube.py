"""Cube and XYZ files read back by ASE and by the program itself."""

from __future__ import annotations

import io

import numpy as np
import pytest
from ase.io import read as ase_read
from ase.io.cube import read_cube

from ehmo import bond_report
from ehmo.orbitals.parameters import load_parameters
from ehmo.report.cube import SMALLEST, cube_text, xyz_text
from ehmo.report.page.shown import orbital_grid, orbital_values
from ehmo.structure import read
from ehmo.units import BOHR_A
from tests.geometries import SPECIES

TABLE = load_parameters("standard")


@pytest.fixture(scope="module")
def report():
    return bond_report(SPECIES["VOCl3"].fragment(), TABLE)


def test_cube_read_by_ase_equals_the_grid(report):
    grid = orbital_grid(report, 0.4, 20_000)
    values = orbital_values(report, TABLE, [report.state.homo], grid)[0]
    found = read_cube(io.StringIO(cube_text(report.fragment, grid, values, "a\nb\x1b")))
    assert found["atoms"].get_chemical_symbols() == list(report.fragment.symbols)
    np.testing.assert_allclose(found["atoms"].positions, report.fragment.positions_A, atol=2e-6)
    np.testing.assert_allclose(found["origin"], grid.origin_A, atol=2e-6)
    np.testing.assert_allclose(np.diag(found["spacing"]), grid.spacing_A, atol=2e-6)
    np.testing.assert_allclose(found["data"], values, atol=0.51 * SMALLEST, rtol=1e-6)


def test_cube_holds_one_electron(report):
    grid = orbital_grid(report, 0.2, 200_000)
    values = orbital_values(report, TABLE, [report.state.homo], grid)[0]
    found = read_cube(io.StringIO(cube_text(report.fragment, grid, values, "highest filled")))
    cell = np.diag(found["spacing"]).prod() / BOHR_A**3
    assert (found["data"] ** 2).sum() * cell == pytest.approx(1.0, abs=0.01)


def test_xyz_keeps_atoms_charge_and_spin(tmp_path):
    fragment = SPECIES["[VO(OH2)5]2+"].fragment()
    path = tmp_path / "a.xyz"
    path.write_text(xyz_text(fragment), encoding="utf-8")
    again = read(path)
    assert (again.symbols, again.charge, again.unpaired_electrons) == (fragment.symbols, 2, 1)
    np.testing.assert_allclose(again.positions_A, fragment.positions_A, atol=1e-8)
    np.testing.assert_allclose(ase_read(path).positions, fragment.positions_A, atol=1e-8)
