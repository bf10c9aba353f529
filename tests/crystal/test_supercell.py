"""A supercell is its folded mesh: same energy per formula unit, populations, orders and channels.

This fixes every sign of the phases, and shows that orders come from real-space blocks.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from ehmo.orbitals.lattice import lattice_overlaps, lattice_pairs
from tests.analysis import plain_loops
from tests.crystal.runs import PLAIN, order_rows, run_crystal
from tests.crystal.structures import MOO3, REO3, TILTED, metal_oxygen_bonds

CASES = {
    "insulator": (MOO3, (2, 1, 2), 2.4, {}, PLAIN),
    "metal": (REO3, (2, 3, 2), 2.0, {}, PLAIN),
    "no symmetry, odd electrons": (TILTED, (3, 2, 1), 2.4, {"charge": 1}, PLAIN),
    "unpaired electron": (TILTED, (2, 2, 2), 2.4, {"charge": 1, "unpaired_electrons": 1}, PLAIN),
    "K by channel and distance": (
        TILTED,
        (1, 2, 3),
        2.4,
        {},
        replace(PLAIN, K_sigma=1.67, K_pi=2.0, K_decay_per_A=0.2),
    ),
    "self-consistent charges": (MOO3, (2, 1, 2), 2.4, {"charge_model": "self-consistent"}, PLAIN),
    "self-consistent metal": (REO3, (2, 2, 2), 2.0, {"charge_model": "self-consistent"}, PLAIN),
}


@pytest.mark.parametrize("name", CASES)
def test_supercell_equals_its_folded_mesh(standard, name):
    crystal, counts, reach, options, settings = CASES[name]
    copies = int(np.prod(counts))
    bonds = metal_oxygen_bonds(crystal, reach)
    assert any(any(bond.translation) for bond in bonds)
    folded = run_crystal(crystal, bonds, standard, mesh=counts, settings=settings, **options)
    larger = {
        key: value * copies if key in {"charge", "unpaired_electrons"} else value for key, value in options.items()
    }
    whole = run_crystal(
        crystal.supercell(counts),
        [crystal.bond_in_supercell(bond, counts) for bond in bonds],
        standard,
        mesh=(1, 1, 1),
        settings=settings,
        **larger,
    )
    assert folded.state.filling.smearing_eV == whole.state.filling.smearing_eV
    assert whole.state.band_energy_eV / copies == pytest.approx(folded.state.band_energy_eV, abs=1e-8)
    assert whole.state.energy_eV / copies == pytest.approx(folded.state.energy_eV, abs=1e-8)
    for kind in ("gross", "net", "charges", "spin"):
        mine, theirs = getattr(folded.populations, kind), getattr(whole.populations, kind)
        assert theirs == pytest.approx(np.tile(mine, copies), abs=1e-8)
    assert order_rows(whole) == pytest.approx(order_rows(folded), abs=1e-8)
    for small, large in zip(folded.orders, whole.orders, strict=True):
        assert large.channel_weights == pytest.approx(small.channel_weights, abs=1e-8)


def test_orders_at_the_zone_centre_are_those_of_plain_loops(standard):
    # Every pair of a cell at one k-point, against the definitions written as loops over the matrices.
    crystal = TILTED
    bonds = metal_oxygen_bonds(crystal, 2.4)
    bonding = run_crystal(crystal, bonds, standard, mesh=(1, 1, 1), charge=1, unpaired_electrons=1)
    overlap, _ = lattice_overlaps(lattice_pairs(crystal.symbols, crystal.positions_A, crystal.cell_A, standard))
    (S,) = overlap.sums(np.zeros((1, 3)))
    spins = bonding.state.filling.occupations[:, 0]
    densities = [plain_loops.density(bonding.state.coefficients[0], occupations) for occupations in spins]
    lowdin = [plain_loops.lowdin(P, S) for P in densities]
    for bond, order in zip(bonds, bonding.orders, strict=True):
        i, j = (np.flatnonzero(bonding.basis.atom_of == atom) for atom in (bond.metal, bond.donor))
        assert order.mayer == pytest.approx(plain_loops.mayer(densities, S, i, j), abs=1e-10)
        assert order.wiberg == pytest.approx(plain_loops.wiberg(lowdin, i, j), abs=1e-10)
