"""A molecule alone in a large cell is the molecule."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.records.bloch import LatticeBond
from tests.crystal.runs import PLAIN, order_rows, run_crystal
from tests.crystal.structures import Crystal
from tests.geometries import SPECIES
from tests.numeric_boxes import Job, run

CELL = np.array([[34.0, 0, 0], [2.0, 36.0, 0], [-1.0, 3.0, 35.0]])


def in_cell(name, cell) -> tuple[Crystal, list[LatticeBond]]:
    species = SPECIES[name]
    crystal = Crystal(species.symbols, species.positions_A + np.array([3.0, -2.0, 1.0]), cell)
    bonded = np.flatnonzero(np.linalg.norm(species.positions_A - species.positions_A[0], axis=1) < 2.65)
    bonds = [LatticeBond(0, int(k), (0, 0, 0)) for k in bonded if k and species.symbols[k] != "H"]
    return crystal, bonds


@pytest.mark.parametrize("mesh", [(1, 1, 1), (2, 1, 2)])
@pytest.mark.parametrize("name", ["VOCl3", "[VO(OH2)5]2+", "MnO4 -"])
def test_fixed_charges_give_the_molecule(standard, name, mesh):
    species = SPECIES[name]
    crystal, bonds = in_cell(name, CELL)
    molecule = run(Job.of(species, standard))
    bonding = run_crystal(
        crystal, bonds, standard, mesh=mesh, charge=species.charge, unpaired_electrons=species.unpaired_electrons
    )
    assert [bond.donor for bond in bonds] == [bond.donor for bond in molecule.bonds]
    assert bonding.state.energies_eV == pytest.approx(
        np.tile(molecule.state.energies_eV, (len(bonding.state.mesh), 1)), abs=1e-8
    )
    assert bonding.state.energy_eV == pytest.approx(molecule.state.energy_eV, abs=1e-8)
    for kind in ("gross", "net", "charges", "spin", "atom_overlap"):
        assert getattr(bonding.populations, kind) == pytest.approx(getattr(molecule.populations, kind), abs=1e-8)
    expected = [(order.overlap_population, order.mayer, order.wiberg) for order in molecule.orders]
    assert order_rows(bonding) == pytest.approx(np.array(expected), abs=1e-8)
    for ours, theirs in zip(bonding.orders, molecule.orders, strict=True):
        assert ours.channel_weights == pytest.approx(theirs.channel_weights, abs=1e-8)
        listed = theirs.channel_weights > 0.05
        assert ours.channel_shares[listed] == pytest.approx(theirs.channel_shares[listed], abs=1e-6)


@pytest.mark.parametrize("name", ["VOCl3", "CrO2Cl2"])
def test_self_consistent_charges_converge_to_the_molecule_with_cell_size(standard, name):
    molecule = run(Job.of(SPECIES[name], standard, self_consistent=True, settings=PLAIN))
    deviations = []
    for edge in (15.0, 25.0, 50.0):
        crystal, bonds = in_cell(name, edge * np.eye(3))
        bonding = run_crystal(
            crystal, bonds, standard, mesh=(1, 1, 1), unpaired_electrons=0, charge_model="self-consistent"
        )
        deviations.append(np.abs(bonding.populations.charges - molecule.populations.charges).max())
    assert deviations[1] < deviations[0] / 3
    assert deviations[2] < deviations[1] / 3
    assert deviations[2] < 1e-4
