"""Meshes chosen by the cell, their convergence, paths, gaps and filling."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.calculate.crystal import MESH_LENGTH_A, default_mesh, other_mesh
from ehmo.electronic.band_filling import SMEARING_EV, fill_bands
from ehmo.records.crystal_electronic import CellElectrons, band_gap
from ehmo.structure.lattice_path import lattice_path
from tests.crystal.runs import order_rows, run_crystal
from tests.crystal.structures import REO3, TILTED, V2O5, metal_oxygen_bonds


@pytest.mark.parametrize("crystal", [REO3, V2O5, TILTED], ids=["ReO3", "V2O5", "tilted"])
def test_default_mesh_reaches_the_same_length_in_every_direction(crystal):
    counts = np.array(default_mesh(crystal.cell_A))
    spacing = np.linalg.norm(np.linalg.inv(crystal.cell_A), axis=0) / counts
    assert (spacing <= 1 / MESH_LENGTH_A + 1e-12).all()
    assert ((counts == 1) | (spacing * counts / np.maximum(counts - 1, 1) > 1 / MESH_LENGTH_A - 1e-12)).all()


@pytest.mark.parametrize(
    ("counts", "edges", "expected"),
    [
        ((4, 6, 1), (5, 4, 30), (2, 3, 1)),
        ((5, 5, 5), (4, 4, 4), (3, 3, 3)),
        ((1, 1, 1), (25, 30, 40), (2, 1, 1)),
        ((1, 1, 1), (5, 5, 40), (2, 2, 1)),
    ],
)
def test_mesh_to_compare_with(counts, edges, expected):
    assert other_mesh(counts, np.diag(np.array(edges, dtype=float))) == expected


def test_change_with_the_mesh_is_the_difference_of_two_runs(standard):
    bonds = metal_oxygen_bonds(REO3, 2.0)
    both = run_crystal(REO3, bonds, standard, mesh=(4, 4, 4), compare_mesh=True)
    coarse = run_crystal(REO3, bonds, standard, mesh=(2, 2, 2))
    change = both.mesh_change
    assert change.counts == (2, 2, 2)
    assert change.energy_per_atom_eV == pytest.approx((both.state.energy_eV - coarse.state.energy_eV) / 4, abs=1e-10)
    assert change.largest_charge_e == pytest.approx(np.abs(both.charges - coarse.charges).max(), abs=1e-10)
    difference = np.abs(order_rows(both) - order_rows(coarse))[:, 1:]
    assert change.largest_order == pytest.approx(difference.max(), abs=1e-10)
    assert change.gap_eV is None


def test_change_with_the_mesh_dies_out(standard):
    bonds = metal_oxygen_bonds(V2O5, 2.3)
    changes = [
        run_crystal(V2O5, bonds, standard, mesh=mesh, compare_mesh=True).mesh_change for mesh in [(2, 4, 4), (4, 8, 8)]
    ]
    assert abs(changes[1].energy_per_atom_eV) < abs(changes[0].energy_per_atom_eV) / 5
    assert changes[1].largest_order < 1e-3


def test_start_from_the_charges_of_the_other_mesh_changes_nothing(standard):
    bonds = metal_oxygen_bonds(V2O5, 2.3)
    options = {"mesh": (1, 3, 2), "charge_model": "self-consistent"}
    helped = run_crystal(V2O5, bonds, standard, compare_mesh=True, **options)
    alone = run_crystal(V2O5, bonds, standard, **options)
    assert helped.state.iterations < alone.state.iterations
    assert helped.charges == pytest.approx(alone.charges, abs=1e-9)


def test_standard_path_of_a_cubic_lattice():
    lines = lattice_path(REO3.cell_A, "auto", 60)
    assert len(lines.points) == 60
    assert lines.path.startswith("GXMGR")
    named = {name: lines.points[k] for k, name in lines.labels}
    assert named["G"] == pytest.approx([0, 0, 0], abs=1e-12)
    assert named["R"] == pytest.approx([0.5, 0.5, 0.5], abs=1e-12)
    assert (np.diff(lines.distances) > -1e-12).all()


def test_length_of_a_path_is_that_in_reciprocal_space():
    lines = lattice_path(REO3.cell_A, "GX", 11)
    assert lines.distances[-1] == pytest.approx(np.pi / 3.734, rel=1e-9)  # half a reciprocal vector


@pytest.mark.parametrize("model", ["fixed", "self-consistent"])
def test_levels_on_the_path_are_those_of_the_mesh(standard, model):
    bonding = run_crystal(
        REO3, metal_oxygen_bonds(REO3, 2.0), standard, mesh=(4, 4, 4), path="GXMR", charge_model=model
    )
    found = 0
    for k, point in enumerate(bonding.path.points):
        same = np.abs(bonding.state.mesh.points - point).max(axis=1) < 1e-9
        if same.any():
            found += 1
            on_mesh = bonding.state.energies_eV[same.argmax()]
            assert bonding.path.energies_eV[k] == pytest.approx(on_mesh, abs=1e-8)
    assert found >= 4
    assert bonding.path.energies_eV.shape == (25, len(bonding.basis))


POINTS = np.array([[0, 0, 0], [0.25, 0, 0], [0.5, 0, 0]])
WEIGHTS = np.array([0.25, 0.5, 0.25])


def test_gap_is_told_direct_or_indirect():
    bands = np.array([[-9.0, -3.0], [-8.0, -4.0], [-8.5, -5.0]])
    gap = band_gap(POINTS, bands, 1)
    assert gap.gap_eV == pytest.approx(3.0)
    assert not gap.is_direct
    assert gap.valence_k == (0.25, 0, 0)
    assert gap.conduction_k == (0.5, 0, 0)
    assert gap.direct_eV == pytest.approx(3.5)
    assert band_gap(POINTS, bands[[0, 0, 1]], 1).is_direct


@pytest.mark.parametrize("filled", [0, 2, 0.5])
def test_no_gap_without_filled_and_empty_bands(filled):
    assert band_gap(POINTS, np.array([[-9.0, -3.0]] * 3), filled) is None


def test_overlapping_bands_have_no_gap():
    assert band_gap(POINTS, np.array([[-9.0, -7.0], [-6.0, -5.0], [-9.0, -6.5]]), 1) is None


def test_insulator_is_filled_sharply_and_metal_smeared():
    insulator = np.array([[-9.0, -3.0], [-8.0, -4.0], [-8.5, -5.0]])
    filling = fill_bands(insulator, WEIGHTS, CellElectrons(2))
    assert filling.smearing_eV == 0
    assert (filling.occupations == [[1, 0]] * 3).all()
    assert -8 < filling.fermi_eV[0] < -5
    metal = np.array([[-9.0, -7.0], [-6.0, -5.97], [-9.0, -6.5]])
    filling = fill_bands(metal, WEIGHTS, CellElectrons(3))
    assert filling.smearing_eV == SMEARING_EV
    assert (filling.occupations.sum(axis=(0, 2)) @ WEIGHTS) == pytest.approx(3, abs=1e-9)
    expected = 1 / (1 + np.exp((metal - filling.fermi_eV[0]) / SMEARING_EV))  # Fermi-Dirac, textbook form
    assert filling.occupations[0] == pytest.approx(expected, abs=1e-12)


def test_unpaired_electrons_fill_alpha_and_beta_apart():
    bands = np.array([[-9.0, -3.0, 0.0]] * 3)
    filling = fill_bands(bands, WEIGHTS, CellElectrons(3, 1))
    assert (filling.occupations.sum(axis=2) == [[2] * 3, [1] * 3]).all()
    assert filling.fermi_eV[0] > filling.fermi_eV[1]


def test_bands_that_are_all_full():
    filling = fill_bands(np.array([[-9.0, -3.0]] * 3), WEIGHTS, CellElectrons(4))
    assert (filling.occupations == 1).all()
    assert filling.smearing_eV == 0
