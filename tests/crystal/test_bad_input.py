"""What a periodic calculation refuses, with the mend."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.errors import ConvergenceError, ElectronCountError, InputError, LimitError, OverlapError, ParameterError
from ehmo.records.bloch import LatticeBond, k_mesh
from ehmo.structure.lattice_path import lattice_path
from tests.crystal.runs import run_crystal
from tests.crystal.structures import REO3, TILTED, V2O5, Crystal, metal_oxygen_bonds
from tests.numeric_boxes import shell, table

BONDS = [LatticeBond(0, 1, (0, 0, 0))]


def test_dependent_bloch_functions_name_the_point_the_functions_and_the_mend():
    diffuse = table(H=(1, (shell(1, 0, 0.2),)))
    chain = Crystal(("H", "H"), np.array([[0.0, 0, 0], [0.4, 0, 0]]), np.diag([0.8, 9.0, 9.0]))
    with pytest.raises(OverlapError) as caught:
        run_crystal(chain, BONDS, diffuse, mesh=(4, 1, 1))
    message = str(caught.value)
    assert "at k = (0.5, 0, 0)" in message or "at k = (0, 0, 0)" in message
    assert "1s of H1" in message
    assert "1s of H2" in message
    assert "tighter exponents" in message


def test_dependence_is_found_on_a_path_too():
    diffuse = table(H=(1, (shell(1, 0, 0.2),)))
    chain = Crystal(("H",), np.zeros((1, 3)), np.diag([0.4, 9.0, 9.0]))
    bonds = [LatticeBond(0, 0, (1, 0, 0))]
    with pytest.raises(OverlapError, match="linearly dependent at k"):
        run_crystal(chain, bonds, diffuse, mesh=(1, 1, 1), path="GZ")


def test_atoms_on_top_of_an_image(standard):
    crystal = Crystal(("V", "O"), np.array([[0.0, 0, 0], [3.9, 0.05, 0]]), 4.0 * np.eye(3))
    with pytest.raises(InputError, match=r"atoms O2 and V1 in the next cell are only 0.112 Å apart"):
        run_crystal(crystal, BONDS, standard, mesh=(1, 1, 1))


def test_cell_without_volume(standard):
    flat = Crystal(TILTED.symbols, TILTED.positions_A, np.array([[4.0, 0, 0], [0, 4, 0], [4, 4, 0]]))
    with pytest.raises(InputError, match="no volume"):
        run_crystal(flat, BONDS, standard, mesh=(1, 1, 1))


@pytest.mark.parametrize("mesh", [(0, 1, 1), (2, -1, 2)])
def test_mesh_must_be_positive(mesh):
    with pytest.raises(InputError, match="4,4,4"):
        k_mesh(mesh)


def test_charged_cell_is_refused_where_charges_act_back(standard):
    with pytest.raises(InputError, match=r"charge \+1.*--charges fixed"):
        run_crystal(TILTED, BONDS, standard, mesh=(1, 1, 1), charge=1, charge_model="self-consistent")
    assert run_crystal(TILTED, BONDS, standard, mesh=(1, 1, 1), charge=1).electrons.total == 17


@pytest.mark.parametrize(
    ("options", "said"),
    [
        ({"charge": 18}, "too few"),
        ({"unpaired_electrons": 1}, "even number"),
        ({"charge": -40}, "do not fit"),
    ],
)
def test_electrons_that_do_not_fit(standard, options, said):
    with pytest.raises(ElectronCountError, match=said):
        run_crystal(TILTED, BONDS, standard, mesh=(1, 1, 1), **options)


def test_element_missing_from_the_set(standard):
    crystal = Crystal(("V", "He"), np.array([[0.0, 0, 0], [2.0, 0, 0]]), 5.0 * np.eye(3))
    with pytest.raises(ParameterError, match="He"):
        run_crystal(crystal, BONDS, standard, mesh=(1, 1, 1))


def test_more_functions_than_allowed(standard):
    with pytest.raises(LimitError, match="76 basis functions in the cell, more than the limit of 50"):
        run_crystal(V2O5, BONDS, standard, mesh=(1, 1, 1), max_functions=50)


def test_mesh_that_does_not_fit_into_memory(standard):
    with pytest.raises(LimitError, match="coarser mesh"):
        run_crystal(V2O5, BONDS, standard, mesh=(60, 60, 60))


def test_charges_that_do_not_settle(standard):
    with pytest.raises(ConvergenceError, match="after 3 passes over the mesh"):
        run_crystal(V2O5, BONDS, standard, mesh=(1, 1, 1), charge_model="self-consistent", max_iterations=3)


@pytest.mark.parametrize(("path", "points"), [("GQ", 20), ("", 20), ("GX", 1), ("GX", 10**6), ("<b>", 20)])
def test_path_that_does_not_exist(path, points):
    with pytest.raises(InputError) as caught:
        lattice_path(REO3.cell_A, path, points)
    assert caught.value.mend
    assert str(caught.value).isprintable()


def test_crystal_without_bonds_has_bands_all_the_same(standard):
    bonding = run_crystal(REO3, [], standard, mesh=(2, 2, 2), compare_mesh=True)
    assert bonding.orders == ()
    assert bonding.mesh_change.largest_order == 0
    assert metal_oxygen_bonds(REO3, 1.0) == []
