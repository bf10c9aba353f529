"""One call that runs a crystal, for the tests."""

from __future__ import annotations

import numpy as np

from basis_params import ModelSettings
from ehmo.calculate.crystal import CrystalOptions, crystal_bonding
from ehmo.records.crystal_electronic import CrystalBonding
from ehmo.records.options import Options
from tests.crystal.structures import Crystal

PLAIN = ModelSettings(1.75, True, None, None, None, 0.0, 1.0)


def run_crystal(
    crystal: Crystal,
    bonds,
    table,
    *,
    mesh,
    settings=PLAIN,
    path=None,
    cations_basis=False,
    compare_mesh=False,
    **options,
) -> CrystalBonding:
    """Bands and orders; charges are fixed unless the options say otherwise."""
    return crystal_bonding(
        crystal.symbols,
        crystal.positions_A,
        crystal.cell_A,
        bonds,
        table,
        settings,
        Options(**{"charge_model": "fixed", **options}),
        CrystalOptions(mesh=mesh, path=path, path_points=25, cations_basis=cations_basis, compare_mesh=compare_mesh),
    )


def order_rows(bonding: CrystalBonding) -> np.ndarray:
    """Overlap population, Mayer and Wiberg order of each bond."""
    return np.array([(order.overlap_population, order.mayer, order.wiberg) for order in bonding.orders])
