"""Constants against CODATA 2022 as carried by SciPy (1.15 or later)."""

from __future__ import annotations

import pytest
from scipy import constants

from ehmo import units


def test_bohr_radius_codata_2022():
    assert pytest.approx(constants.value("Bohr radius") * 1e10, rel=1e-12) == units.BOHR_A


def test_hartree_codata_2022():
    assert pytest.approx(constants.value("Hartree energy in eV"), rel=1e-12) == units.HARTREE_EV


def test_coulomb_constant_codata_2022():
    expected = constants.e / (4 * constants.pi * constants.epsilon_0) * 1e10
    assert pytest.approx(expected, rel=1e-9) == units.COULOMB_EV_A


def test_wavenumber_of_an_electronvolt_codata_2022():
    assert pytest.approx(constants.e / (constants.h * constants.c) / 100, rel=1e-12) == units.PER_CM_PER_EV


def test_boltzmann_constant_in_wavenumbers_codata_2022():
    expected = constants.k / (constants.h * constants.c) / 100
    assert pytest.approx(expected, rel=1e-12) == units.BOLTZMANN_PER_CM_K


def test_electron_g_factor_codata_2022():
    assert pytest.approx(-constants.value("electron g factor"), rel=1e-12) == units.ELECTRON_G


def test_vibrational_units_codata_2022():
    assert pytest.approx(constants.e * 1e20, rel=1e-12) == units.NEWTON_PER_M_PER_EV_A2
    assert pytest.approx(constants.value("atomic mass constant"), rel=1e-9) == units.ATOMIC_MASS_KG
    expected = (constants.e * 1e20 / constants.value("atomic mass constant")) ** 0.5 / (2 * constants.pi * constants.c)
    assert pytest.approx(expected / 100, rel=1e-9) == units.PER_CM_PER_ROOT_EV_A2_U
