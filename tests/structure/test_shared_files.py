"""Deposited structures and idealised geometries kept beside the checkout, where they are present."""

from __future__ import annotations

import time
from pathlib import Path

import pytest

from ehmo.errors import EhmoError
from ehmo.structure import assign_electrons, perceive, read_frames

SHARED = Path(__file__).parents[3] / "shared"
CRYSTALS = sorted((SHARED / "crystals").glob("*.cif"))
MOLECULES = sorted((SHARED / "reference" / "xyz").glob("*.xyz"))


def _or_skip(paths: list[Path], what: str):
    skip = pytest.param(None, marks=pytest.mark.skip(reason=f"no {what} beside the checkout"))
    return [pytest.param(path, id=path.stem) for path in paths] or [skip]


@pytest.mark.parametrize("path", _or_skip(CRYSTALS, "crystal structures"))
def test_crystals_read_or_say_why_not(path):
    start = time.perf_counter()
    try:
        fragments = read_frames(path)
    except EhmoError as error:
        assert path.name in str(error)
        assert str(error).isprintable()
        assert error.mend
    else:
        assert all(perceive(fragment).bonds for fragment in fragments)
    assert time.perf_counter() - start < 5.0


EXPECTED = {
    "KCrClO3_amcsd10390": ("ClCrO3", {"oxo": 3, "halide": 1}),
    "Pt_NH3_4_TcO4_2_amcsd10085": ("O4Tc", {"oxo": 4}),
    "TiO2_rutile_9009083": ("polymeric", None),
    "MoO3_Kihlborg_amcsd18982": ("polymeric", None),
    "VO_Klaui_2219463": ("not listed whole", None),
    "K2Cr2O7_amcsd10323": ("not listed whole", None),
    "SiW11_lacunary_Keggin_7006802": ("disordered", None),
}


@pytest.mark.parametrize("stem", EXPECTED)
def test_known_crystals(stem):
    path = SHARED / "crystals" / f"{stem}.cif"
    if not path.exists():
        pytest.skip("no crystal structures beside the checkout")
    said, kinds = EXPECTED[stem]
    if kinds is None:
        with pytest.raises(EhmoError, match=said):
            read_frames(path)
        return
    (fragment,) = read_frames(path)
    assert fragment.formula == said
    found = [bond.kind.value for bond in perceive(fragment).bonds]
    assert {kind: found.count(kind) for kind in set(found)} == kinds


@pytest.mark.parametrize("path", _or_skip(MOLECULES, "reference geometries"))
def test_reference_molecules_state_charge_and_spin(path):
    (fragment,) = read_frames(path)
    assignment = assign_electrons(fragment, perceive(fragment))
    assert assignment.charge == fragment.charge
    assert assignment.unpaired_electrons == fragment.unpaired_electrons
    assert assignment.charge_reason == "given in the file"
