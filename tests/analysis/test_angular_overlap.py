"""Angular-overlap and crystal-field parameters: made-up fields are recovered, textbook relations hold."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.analysis.angular_overlap import angular_overlap, crystal_field_parameters
from ehmo.records.coordination import DonorKind
from ehmo.units import PER_CM_PER_EV
from tests.analysis.ladder_cases import OCTAHEDRON, TETRAHEDRON, field_of, ladder_of_field

SQUARE_PYRAMID = OCTAHEDRON[[4, 0, 1, 2, 3]]


def test_ten_dq_of_an_octahedron_schaffer_jorgensen_1965():
    # 10 Dq = 3 e_sigma - 4 e_pi (Schäffer & Jørgensen 1965).
    field = field_of(OCTAHEDRON, np.full(6, 0.9), np.full(6, 0.2))
    expected = (3 * 0.9 - 4 * 0.2) * PER_CM_PER_EV
    assert crystal_field_parameters(field, "Oh")["10Dq"] == pytest.approx(expected, rel=1e-12)


def test_ten_dq_of_a_tetrahedron_is_four_ninths_schaffer_jorgensen_1965():
    # (4/3) e_sigma - (16/9) e_pi, with e below t2.
    octahedral = crystal_field_parameters(field_of(OCTAHEDRON, np.full(6, 0.9), np.full(6, 0.2)), "Oh")["10Dq"]
    tetrahedral = crystal_field_parameters(field_of(TETRAHEDRON, np.full(4, 0.9), np.full(4, 0.2)), "Td")["10Dq"]
    assert tetrahedral == pytest.approx(4 / 9 * octahedral, rel=1e-12)


def test_made_up_parameters_of_an_oxo_ion_come_back():
    e_sigma, e_pi = np.array([2.3, 0.9, 0.9, 0.9, 0.9]), np.array([1.1, 0.15, 0.15, 0.15, 0.15])
    ladder = ladder_of_field(field_of(SQUARE_PYRAMID, e_sigma, e_pi))
    fitted = angular_overlap(ladder, SQUARE_PYRAMID, [DonorKind.OXO, *[DonorKind.HALIDE] * 4], {})
    found = {(item.kind, item.symmetry): item.value_eV for item in fitted.angular_overlap}
    expected = {("oxo", "sigma"): 2.3, ("oxo", "pi"): 1.1, ("halide", "sigma"): 0.9, ("halide", "pi"): 0.15}
    assert found == pytest.approx(expected, abs=1e-10)
    assert fitted.undetermined == ()
    assert fitted.rms_per_cm == pytest.approx(0, abs=1e-6)


def test_pi_of_saturated_donors_is_zero_by_convention():
    ladder = ladder_of_field(field_of(OCTAHEDRON, np.full(6, 0.9), np.zeros(6)))
    fitted = angular_overlap(ladder, OCTAHEDRON, [DonorKind.AMINE] * 6, {})
    assert [(item.symmetry, item.value_eV) for item in fitted.angular_overlap] == [("sigma", pytest.approx(0.9))]


def test_combinations_that_the_geometry_leaves_open_are_named_and_withheld():
    # Trans donors of two kinds on one axis act alike: only the sum of their parameters shows.
    line = np.array([[0, 0, 1.0], [0, 0, -1.0]])
    ladder = ladder_of_field(field_of(line, np.array([1.0, 0.5]), np.array([0.3, 0.1])))
    fitted = angular_overlap(ladder, line, [DonorKind.OXO, DonorKind.HALIDE], {})
    assert all(item.value_eV is None for item in fitted.angular_overlap)
    assert len(fitted.undetermined) == 2
    for said in fitted.undetermined:
        assert "oxo" in said
        assert "halide" in said


def test_tetragonal_parameters_ballhausen_1962():
    # b1 = 6 Dq + 2 Ds - Dt, a1 = 6 Dq - 2 Ds - 6 Dt, b2 = -4 Dq + 2 Ds - Dt, e = -4 Dq - Ds + 4 Dt.
    dq, ds, dt = 1500.0, -2400.0, 300.0
    b1, a1 = 6 * dq + 2 * ds - dt, 6 * dq - 2 * ds - 6 * dt
    b2, e = -4 * dq + 2 * ds - dt, -4 * dq - ds + 4 * dt
    assert b1 + a1 + b2 + 2 * e == pytest.approx(0, abs=1e-9)  # the barycentre of the formulas
    field = np.diag([b2, e, a1, e, b1]) / PER_CM_PER_EV + 3.7 * np.eye(5)
    assert crystal_field_parameters(field, "C4v") == pytest.approx({"Dq": dq, "Ds": ds, "Dt": dt}, rel=1e-9)


def test_groups_without_such_parameters_give_none():
    assert crystal_field_parameters(np.eye(5), "C2v") == {}
