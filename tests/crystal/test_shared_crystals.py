"""Deposited extended structures kept beside the checkout, where they are present."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from ehmo.calculate.crystal import CrystalOptions
from ehmo.calculate.crystal_report import crystal_report
from ehmo.errors import EhmoError
from ehmo.records.options import Options
from ehmo.report.bands_document import crystal_json
from ehmo.report.bands_text import crystal_text
from ehmo.structure import read_crystals

CRYSTALS = Path(__file__).parents[3] / "shared" / "crystals"
FILES = sorted(CRYSTALS.glob("*.cif"))
SKIP = pytest.param(None, marks=pytest.mark.skip(reason="no crystal structures beside the checkout"))
QUICK = CrystalOptions(mesh=(1, 1, 1), compare_mesh=False)


@pytest.mark.parametrize("path", [pytest.param(path, id=path.stem) for path in FILES] or [SKIP])
def test_extended_structures_run_or_say_why_not(path):
    try:
        crystals = [contents for contents in read_crystals(path) if contents.networks]
    except EhmoError as error:
        assert error.mend
        return
    for contents in crystals:
        try:
            report = crystal_report(contents, options=Options(charge_model="fixed"), crystal=QUICK)
        except EhmoError as error:
            assert error.mend
            assert str(error).isprintable()
            continue
        # Zones of the atoms in the primitive cell and bonds per cell are whole numbers of the file's multiplicities.
        assert len(report.symbols) * report.cell_ratio == len(contents.symbols)
        assert all(unit.multiplicity % report.cell_ratio == 0 for unit in report.units)
        assert report.bonding.lengths_A == pytest.approx([unit.length_A for unit in report.units], abs=1e-6)
        assert crystal_text(report)
        assert crystal_json([report])


KINDS = {
    # d0 oxides are insulators, d1 ReO3 is a metal (Greenwood & Earnshaw, Chemistry of the Elements, 1997; memory).
    "V2O5_9012221": ("insulator", (1, 3, 2), 1.583),
    "MoO3_Kihlborg_amcsd18982": ("insulator", (3, 1, 3), 1.671),
    "TiO2_rutile_9009083": ("insulator", (2, 2, 3), None),
    "ReO3_amcsd16967": ("metal", (3, 3, 3), None),
}


@pytest.mark.parametrize("stem", KINDS)
def test_kind_and_first_bond_of_known_oxides(stem):
    path = CRYSTALS / f"{stem}.cif"
    if not path.exists():
        pytest.skip("no crystal structures beside the checkout")
    kind, mesh, shortest = KINDS[stem]
    (contents,) = read_crystals(path)
    report = crystal_report(contents, crystal=CrystalOptions(mesh=mesh, compare_mesh=False))
    assert ("metal" if report.bonding.gap is None else "insulator") == kind
    if shortest:
        first = int(np.argmax([order.mayer for order in report.bonding.orders]))
        assert report.units[first].length_A == pytest.approx(shortest, abs=2e-3)


def test_narrow_d_bands_settle_their_charges():
    # MoAlP2O9, molybdenum(V) d1: four d bands 0.03 eV wide, whose filling goes to and fro as the charges settle.
    path = CRYSTALS / "AlMoP2O9_amcsd10997.cif"
    if not path.exists():
        pytest.skip("no crystal structures beside the checkout")
    (contents,) = read_crystals(path)
    report = crystal_report(contents, crystal=CrystalOptions(mesh=(2, 2, 2), compare_mesh=False))
    state = report.bonding.state
    assert state.filling.smearing_eV == 0.02
    assert state.charge_residual < 1e-8
    metals = [k for k, symbol in enumerate(report.symbols) if symbol == "Mo"]
    assert np.ptp(report.bonding.charges[metals]) < 5e-3  # equivalent but for the rounding of the coordinates
    held = state.weighted_filling.sum(axis=0)
    narrow = [n for n in range(len(held)) if 0.01 < held[n] < 1.99]
    assert held[narrow].sum() == pytest.approx(4, abs=0.01)  # one electron for each Mo(V)
