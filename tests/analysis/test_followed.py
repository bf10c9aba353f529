"""Levels of a ladder keep their names when they cross."""

from __future__ import annotations

import numpy as np
import pytest

import ehmo
from ehmo.analysis.followed import follow_ladders, follow_orbitals
from tests.geometries import SPECIES


@pytest.fixture(scope="module")
def report():
    return ehmo.bond_report(SPECIES["[VO(OH2)5]2+"].fragment())


def lowdin(report) -> np.ndarray:
    values, vectors = np.linalg.eigh(report.overlap)
    return (vectors * np.sqrt(values)) @ vectors.T @ report.state.coefficients


def followed(report, energies, filling, orbitals=None):
    own = lowdin(report)
    stack = (own if orbitals is None else orbitals)[None]
    ladder = report.sites[0].ladder
    frames = report.coordination.frames
    return follow_ladders([ladder], frames, report.basis, own, energies[None], stack, filling[None])[0]


def test_a_level_that_crosses_the_others_is_still_itself(report):
    ladder = report.sites[0].ladder
    energies = np.array(report.state.energies_eV)
    filling = report.state.occupations.sum(axis=0)
    assert ladder.levels[0].function == "dxy"
    energies[ladder.levels[0].orbital] += 10.0  # far above dz2, filling unchanged
    found = followed(report, energies, filling)
    expected = np.array([level.energy_eV for level in ladder.levels])
    expected[0] += 10.0
    assert found.energies_eV[0] == pytest.approx(expected, abs=1e-6)
    assert found.electrons[0] == pytest.approx([1, 0, 0, 0, 0], abs=1e-9)
    assert found.same_filling[0]


def test_an_electron_in_another_level_is_another_filling(report):
    levels = report.sites[0].ladder.levels
    filling = report.state.occupations.sum(axis=0)
    filling[[levels[0].orbital, levels[-1].orbital]] = filling[[levels[-1].orbital, levels[0].orbital]]
    assert not followed(report, np.array(report.state.energies_eV), filling).same_filling[0]


def test_an_electron_within_a_degenerate_set_is_the_same_filling():
    # Half of the e level either way: which of two degenerate partners holds it means nothing.
    report = ehmo.bond_report(SPECIES["MnO4 -"].fragment())
    levels = report.sites[0].ladder.levels
    filling = report.state.occupations.sum(axis=0)
    filling[levels[0].orbital] += 0.4
    filling[levels[1].orbital] -= 0.4
    assert abs(levels[0].energy_eV - levels[1].energy_eV) < 1e-6
    assert followed(report, np.array(report.state.energies_eV), filling).same_filling[0]


def test_orbitals_are_followed_through_a_change_of_order(report):
    own = lowdin(report)
    shuffled = np.random.default_rng(3).permutation(own.shape[1])
    signs = np.where(np.arange(own.shape[1]) % 2, 1, -1)
    found = follow_orbitals(own[:, [2, 20]], (own * signs)[None][:, :, shuffled])
    assert shuffled[found[0]].tolist() == [2, 20]


def test_a_ladder_without_its_shell_is_lost(report):
    own = lowdin(report)
    shell = report.basis.functions_of(0)
    without = own.copy()
    without[shell] = 0.0
    found = followed(report, np.array(report.state.energies_eV), report.state.occupations.sum(axis=0), without)
    assert np.isnan(found.energies_eV).all()
    assert not found.same_filling[0]
