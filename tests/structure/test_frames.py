"""Local frames: what fixes z and x, and that they turn with the molecule."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.spatial.transform import Rotation

from ehmo.records.fragment import Fragment
from ehmo.structure import perceive
from tests.geometries import SPECIES
from tests.structure.ligand_cases import dichromate, ferrocene

Z = np.array([0.0, 0.0, 1.0])
Z_REASONS = {
    "[VO(OH2)5]2+": (Z, "shortest multiply bonded donor O2"),
    "[UO2(OH2)5]2+": (Z, "trans pair O2, O3"),
    "UO2 2+": (Z, "trans pair O2, O3"),
    "trans-[OsO2Cl4]2-": (Z, "trans pair O2, O3"),
    "CrO2Cl2": (Z, "2-fold axis"),
    "cis-[MoO2Cl4]2-": (Z, "2-fold axis"),
    "fac-[MoO3F3]3-": (Z, "3-fold axis"),
    "CH3ReO3": (-Z, "3-fold axis"),
    "MnO4 -": (Z, "lowest index of equal donors, O2"),
    "[Co(OH2)6]2+": (Z, "trans pair O2, O5"),
    "[Fe(CN)5(NO)]2-": (Z, "4-fold axis"),
    "[Co(NH3)5(NO)]2+": (Z, "4-fold axis"),
    "Cr(CO)5(C(OMe)Me)": (Z, "shortest multiply bonded donor C12"),
    "V(NC6H5)Cl3": (Z, "shortest multiply bonded donor N5"),
    "VOS3 3-": (Z, "shortest multiply bonded donor O2"),
    "Ti(NMe2)Cl3": (Z, "3-fold axis"),
}


@pytest.mark.parametrize("name", Z_REASONS)
def test_z_axis(name):
    axis, reason = Z_REASONS[name]
    (frame,) = perceive(SPECIES[name].fragment()).frames
    np.testing.assert_allclose(frame.axes[2], axis, atol=1e-6)
    assert frame.z_reason.startswith(reason)


@pytest.mark.parametrize("name", SPECIES)
def test_axes_are_right_handed_and_orthonormal(name):
    for frame in perceive(SPECIES[name].fragment()).frames:
        np.testing.assert_allclose(frame.axes @ frame.axes.T, np.eye(3), atol=1e-12)
        assert np.linalg.det(frame.axes) == pytest.approx(1.0)


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "[MoOCl5]2-", "[Co(OH2)6]2+", "trans-[OsO2Cl4]2-"])
def test_x_points_at_an_equatorial_donor(name):
    """Law: in C4v and Oh, dx2-y2 is the sigma antibonding function when x points at a donor."""
    fragment = SPECIES[name].fragment()
    coordination = perceive(fragment)
    (frame,) = coordination.frames
    vectors = fragment.positions_A[[bond.donor for bond in coordination.bonds]] @ frame.axes.T
    units = vectors / np.linalg.norm(vectors, axis=1)[:, None]
    x2_y2 = np.abs(units[:, 0] ** 2 - units[:, 1] ** 2) ** 2
    xy = np.abs(2 * units[:, 0] * units[:, 1]) ** 2
    assert x2_y2.sum() > 3.8
    assert xy.sum() == pytest.approx(0.0, abs=1e-6)


@settings(max_examples=40, deadline=None, derandomize=True)
@given(seed=st.integers(0, 10**6), name=st.sampled_from(sorted(SPECIES.keys() - {"UO2 2+", "NpO2 2+", "PuO2 2+"})))
def test_frames_turn_with_the_molecule(seed, name):
    species = SPECIES[name]
    turn = Rotation.random(rng=np.random.default_rng(seed))
    (before,) = perceive(species.bare()).frames
    (after,) = perceive(Fragment(species.symbols, turn.apply(np.array(species.positions_A)))).frames
    np.testing.assert_allclose(after.axes, turn.apply(np.array(before.axes)), atol=1e-6)
    assert (after.z_reason, after.x_reason) == (before.z_reason, before.x_reason)


def test_every_metal_has_its_own_frame():
    fragment = dichromate()
    coordination = perceive(fragment)
    first, second = coordination.frames
    assert (first.metal, second.metal) == coordination.metals
    assert abs(first.axes[2] @ second.axes[2]) < 0.99


def test_side_on_ligands_count_by_their_centres():
    (frame,) = perceive(ferrocene()).frames
    np.testing.assert_allclose(np.abs(frame.axes[2]), Z, atol=1e-9)


def test_linear_ion_x_is_any_perpendicular():
    for name in ("UO2 2+", "NpO2 2+", "PuO2 2+"):
        (frame,) = perceive(SPECIES[name].fragment()).frames
        assert frame.axes[0] @ frame.axes[2] == pytest.approx(0.0, abs=1e-12)
        assert "free" in frame.x_reason
