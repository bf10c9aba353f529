"""Gross populations in the local axes of the metals."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.stats import special_ortho_group

from ehmo.analysis.local_frame import local_gross_populations
from ehmo.records.coordination import Coordination, LocalFrame
from ehmo.structure import perceive
from tests.analysis import plain_loops
from tests.geometries import SPECIES
from tests.numeric_boxes import Job, Outcome, run

NAMES = ["[VO(OH2)5]2+", "VOCl3", "[UO2(OH2)5]2+", "[MoNCl4]-"]


def framed(species, turn: np.ndarray) -> Coordination:
    """Bonds of a species with the local axes of its metal set to the rows of `turn`."""
    return replace(perceive(species.fragment()), frames=(LocalFrame(0, turn, "", ""),))


def everything(outcome: Outcome, coordination: Coordination) -> np.ndarray:
    orbitals = range(len(outcome.overlap))
    return local_gross_populations(
        orbitals, outcome.state.coefficients, outcome.overlap, outcome.plan.basis, coordination
    )


@pytest.mark.parametrize("name", NAMES)
def test_axes_of_the_file_give_the_plain_gross_populations(name, standard):
    species = SPECIES[name]
    outcome = run(Job.of(species, standard))
    C = outcome.state.coefficients
    found = everything(outcome, framed(species, np.eye(3)))
    np.testing.assert_allclose(found, C * (outcome.overlap @ C), rtol=0, atol=1e-12)
    np.testing.assert_allclose(found.sum(axis=0), 1, rtol=0, atol=1e-12)


@pytest.mark.parametrize("name", NAMES)
def test_turned_axes_against_exponentiated_angular_momentum(name, standard):
    species = SPECIES[name]
    outcome = run(Job.of(species, standard))
    basis, C = outcome.plan.basis, outcome.state.coefficients
    axes = special_ortho_group.rvs(3, random_state=11)
    found = everything(outcome, framed(species, axes))
    partner = outcome.overlap @ C
    for start, l in zip(basis.shell_start, basis.shell_l, strict=True):
        rows = slice(start, start + 2 * l + 1)
        # Coefficients seen from axes turned by A^T are those of the function turned back, by A.
        turn = plain_loops.turned_functions(axes, int(l))
        np.testing.assert_allclose(found[rows], (turn @ C[rows]) * (turn @ partner[rows]), rtol=0, atol=1e-10)


@pytest.mark.parametrize("name", NAMES)
def test_sum_over_a_shell_does_not_depend_on_the_axes(name, standard):
    species = SPECIES[name]
    outcome = run(Job.of(species, standard))
    starts = outcome.plan.basis.shell_start
    plain = np.add.reduceat(everything(outcome, framed(species, np.eye(3))), starts, axis=0)
    for seed in range(3):
        turned = everything(outcome, framed(species, special_ortho_group.rvs(3, random_state=seed)))
        np.testing.assert_allclose(np.add.reduceat(turned, starts, axis=0), plain, rtol=0, atol=1e-10)


def test_a_function_means_the_same_in_every_orientation_of_the_file(standard):
    # Degenerate orbitals may mix, each of the others must keep its functions.
    species = SPECIES["[VO(OH2)5]2+"]
    first = run(Job.of(species, standard))
    expected = everything(first, perceive(species.fragment()))
    turn = special_ortho_group.rvs(3, random_state=2)
    moved = replace(species, positions_A=species.positions_A @ turn.T)
    second = run(Job.of(moved, standard))
    gaps = np.diff(first.state.energies_eV, prepend=-np.inf, append=np.inf)
    alone = (gaps[:-1] > 1e-3) & (gaps[1:] > 1e-3)
    assert alone.sum() > 30
    found = everything(second, perceive(moved.fragment()))
    np.testing.assert_allclose(found[:, alone], expected[:, alone], rtol=0, atol=1e-8)


def test_only_the_orbitals_asked_for_are_given_in_their_order(standard):
    species = SPECIES["VOCl3"]
    outcome = run(Job.of(species, standard))
    coordination = perceive(species.fragment())
    whole = everything(outcome, coordination)
    part = local_gross_populations(
        [7, 2, 7], outcome.state.coefficients, outcome.overlap, outcome.plan.basis, coordination
    )
    np.testing.assert_allclose(part, whole[:, [7, 2, 7]], rtol=0, atol=1e-14)
