"""Oxides whose kind is known: d0 insulators, a d1 metal, short oxo bonds first."""

from __future__ import annotations

import numpy as np
import pytest

from tests.crystal.runs import order_rows, run_crystal
from tests.crystal.structures import MOO3, REO3, V2O5, metal_oxygen_bonds

MODELS = ["fixed", "self-consistent"]
SHORTEST = {"V2O5": (V2O5, (2, 4, 4), 1.583), "MoO3": (MOO3, (4, 1, 4), 1.671)}
"""Crystal, mesh and length of its shortest M-O bond in the file's own list of distances [angstrom] (read)."""


@pytest.mark.parametrize("model", MODELS)
@pytest.mark.parametrize("name", SHORTEST)
def test_d0_oxides_are_insulators_with_the_short_bond_first(standard, name, model):
    crystal, mesh, length = SHORTEST[name]
    bonds = metal_oxygen_bonds(crystal, 2.4)
    bonding = run_crystal(crystal, bonds, standard, mesh=mesh, charge_model=model)
    assert bonding.gap is not None
    assert bonding.gap.gap_eV > 1.0  # V2O5 2.3 eV, MoO3 about 3 eV by absorption edges (memory)
    assert bonding.state.filling.smearing_eV == 0
    assert bonding.lengths_A[0] == pytest.approx(length, abs=2e-3)
    short = bonding.lengths_A < length + 1e-3
    assert short.sum() == crystal.symbols.count("V") + crystal.symbols.count("Mo")
    rows = order_rows(bonding)
    assert (rows[short].min(axis=0) > rows[~short].max(axis=0)).all()
    kinds = [channel.type for channel in bonding.orders[0].channels[:3]]
    assert kinds == ["sigma", "pi", "pi"]
    by_metal = np.array([bonding.charges[bond.metal] for bond in bonds])
    assert np.ptp(by_metal) < 1e-6  # all metals of the cell are equivalent by symmetry


@pytest.mark.parametrize("model", MODELS)
def test_rhenium_trioxide_is_a_metal_with_six_equal_bonds(standard, model):
    bonds = metal_oxygen_bonds(REO3, 2.0)
    bonding = run_crystal(REO3, bonds, standard, mesh=(4, 4, 4), charge_model=model)
    assert len(bonds) == 6
    assert bonding.gap is None
    assert bonding.state.filling.smearing_eV == 0.02
    assert np.ptp(order_rows(bonding), axis=0) == pytest.approx(0, abs=1e-7)
    fermi = bonding.state.filling.fermi_eV[0]
    bands = bonding.state.energies_eV
    crossing = [n for n in range(bands.shape[1]) if bands[:, n].min() < fermi < bands[:, n].max()]
    # One d electron in the t2g bands, which hold six; the nine O 2p and three O 2s bands lie below.
    assert crossing == [12, 13, 14] or crossing == [12, 13]
    d_shell = int(np.flatnonzero((bonding.basis.shell_atom == 0) & (bonding.basis.shell_l == 2))[0])
    assert bonding.state.shell_shares[:, d_shell, crossing].mean() > 0.5
