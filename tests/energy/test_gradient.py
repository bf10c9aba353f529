"""Analytic gradients against differences of the energy."""

from dataclasses import replace

import numpy as np
import pytest

from ehmo import Options
from ehmo.harmonics import harmonic_gradients, real_harmonics
from tests.energy.fragments import CHANNELS, FIXED, UNWEIGHTED, energy, moved, with_terms

TERMS = with_terms(("V", "O", 800.0, 3.0, 1.4, 2.4), ("O", "H", 60.0, 3.5, 0.8, 1.2))

CASES = [
    # closed shell, open shells, 4d, 5d, 5f with 6p and 7p of one l, organic ligands
    *[(name, Options()) for name in ("VOCl3", "[VO(OH2)5]2+", "[FeO(OH2)5]2+", "TcO4 -", "OsO4", "W(CCH3)(OCH3)3")],
    *[(name, FIXED) for name in ("[MoOCl5]2-", "[UO2(OH2)5]2+", "[Cr(OH2)6]3+")],
    *[(name, CHANNELS) for name in ("VO4 3-", "[ReOCl4]-", "[NpO2(OH2)5]2+", "[VO(OH2)5]2+")],
    *[(name, UNWEIGHTED) for name in ("CrO2Cl2", "UO2 2+")],
]


def numeric(fragment, options, table, atom, axis, step=1e-3):
    """Derivative from four displaced energies, exact to the fourth power of the step [eV/angstrom]."""
    values = []
    for k in (-2, -1, 1, 2):
        positions = np.array(fragment.positions_A)
        positions[atom, axis] += k * step
        values.append(energy(replace(fragment, positions_A=positions), options, table).free_eV)
    return (values[0] - 8 * values[1] + 8 * values[2] - values[3]) / (12 * step)


@pytest.mark.parametrize(("name", "options"), CASES, ids=[f"{name}-{k}" for k, (name, _) in enumerate(CASES)])
def test_gradient_is_the_slope_of_the_energy(name, options):
    fragment = moved(name)
    found = energy(fragment, options, TERMS, gradient=True).gradient_eV_per_A
    for atom, axis in ((0, 0), (0, 2), (1, 1), (len(fragment) - 1, 0)):
        assert found[atom, axis] == pytest.approx(numeric(fragment, options, TERMS, atom, axis), abs=1e-6)  # law


def test_no_net_force_and_no_net_torque():
    fragment = moved("[UO2(OH2)5]2+")
    found = energy(fragment, CHANNELS, gradient=True).gradient_eV_per_A
    np.testing.assert_allclose(found.sum(axis=0), 0, atol=1e-10)  # law
    np.testing.assert_allclose(np.cross(fragment.positions_A, found).sum(axis=0), 0, atol=1e-6)  # law


def test_gradient_belongs_to_the_free_energy_of_a_smeared_filling():
    # Two unpaired electrons too many: levels cross as the charges settle, and the filling is smeared.
    fragment = moved("MnO4 3-").with_electrons(-3, 4)
    found = energy(fragment, gradient=True)
    assert found.smearing_eV > 0
    assert found.entropy_eV < 0
    assert found.free_eV == pytest.approx(found.total_eV + found.entropy_eV)
    for atom, axis in ((0, 2), (1, 2), (2, 0)):
        slope = numeric(fragment, Options(), with_terms(), atom, axis)
        assert found.gradient_eV_per_A[atom, axis] == pytest.approx(slope, abs=1e-6)  # law


def test_gradients_of_harmonics_across_their_direction():
    rng = np.random.default_rng(0)
    directions = rng.normal(size=(5, 3))
    directions /= np.linalg.norm(directions, axis=1)[:, None]
    found = harmonic_gradients(directions, 7)
    step = 1e-5
    for _ in range(3):
        tangent = np.cross(directions, rng.normal(size=(5, 3)))
        # Law: slope along a great circle.
        ahead, behind = (directions + sign * step * tangent for sign in (1, -1))
        scale = np.linalg.norm(ahead, axis=1)[:, None]
        slope = (real_harmonics(ahead / scale, 7) - real_harmonics(behind / scale, 7)) / (2 * step)
        np.testing.assert_allclose(np.einsum("nci,ni->nc", found, tangent), slope, atol=1e-7)
