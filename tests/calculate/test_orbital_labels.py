"""Labels of accidentally degenerate orbitals and of the levels of several metals."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from ehmo import Fragment, bond_report
from ehmo.conventions import ORBITAL_NAMES
from ehmo.report.text import bond_text
from tests.geometries import SPECIES
from tests.structure.ligand_cases import dichromate

# Harmonics about the axis of a linear ion by |m|: f z(x2-y2), xyz are delta, x(x2-3y2), y(3x2-y2) are phi.
BY_LETTER = {"σ": 0, "π": 1, "δ": 2, "φ": 3}


@pytest.mark.parametrize("name", ["UO2 2+", "NpO2 2+", "PuO2 2+"])
def test_each_f_orbital_of_a_linear_ion_has_the_angular_momentum_of_its_label(name):
    report = bond_report(SPECIES[name].fragment())
    basis, state = report.basis, report.state
    gross = state.coefficients * (report.overlap @ state.coefficients)
    f_shell = np.flatnonzero((basis.shell_l == 3) & (basis.shell_atom == 0))
    rows = np.flatnonzero(basis.shell_of == f_shell[0])
    kinds = np.abs(np.arange(-3, 4))
    judged = 0
    for k, label in enumerate(report.irreps.labels):
        part = gross[rows, k]
        if part.sum() > 0.5:
            assert part[kinds == BY_LETTER[label[0]]].sum() == pytest.approx(part.sum(), abs=1e-6), label
            judged += 1
    assert judged >= 6
    np.testing.assert_allclose(
        state.coefficients.T @ report.overlap @ state.coefficients, np.eye(len(basis)), atol=1e-10
    )
    for level in report.sites[0].ladder.levels:
        m = abs(ORBITAL_NAMES[3].index(level.function) - 3)
        assert BY_LETTER[level.irrep[0]] == m
        assert report.irreps.labels[level.orbital] == level.irrep


def test_forbidden_transfer_of_uranyl_is_not_mixed_with_the_allowed_one():
    # pi g to phi u changes the angular momentum about the axis by two: forbidden (Herzberg 1950; memory).
    bands = bond_report(SPECIES["UO2 2+"].fragment()).spectroscopy.bands
    strengths = {}
    for band in bands:
        lower, upper = band.transition.split()[1], band.transition.split()[4]
        strengths.setdefault((lower, upper), []).append(band.oscillator_strength)
    assert max(strengths["πg", "δu"]) > 0.01
    assert max(strengths.get(("πg", "φu"), [0.0])) < 1e-9


def test_levels_of_distant_metals_have_the_labels_of_one():
    alone = SPECIES["[VO(OH2)5]2+"]
    moved = alone.positions_A + np.array([12.0, 0.0, 0.0])
    pair = Fragment(alone.symbols * 2, np.vstack([alone.positions_A, moved]), 4, 2)
    expected = [(level.irrep, level.function) for level in bond_report(alone.fragment()).sites[0].ladder.levels]
    report = bond_report(pair)
    for site in report.sites:
        assert [(level.irrep, level.function) for level in site.ladder.levels] == expected


def test_orbitals_of_several_metals_are_labelled_in_the_whole_molecule():
    fragment = dichromate()
    report = bond_report(replace(fragment, charge=-2, unpaired_electrons=0))
    assert report.irreps is None
    group = report.molecule_symmetry.group
    labels, shares = report.molecule_irreps.labels, report.molecule_irreps.label_shares
    assert set(labels) <= set(group.irreps)
    assert shares.min() > 0.9
    assert "irreps of the whole molecule" in bond_text(report)
