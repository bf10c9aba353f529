"""Interpolated overlaps against tables made for the very exponents."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from basis_params import load_set
from ehmo.orbitals.exponents import NODE, exponent_grid, moved_shell
from ehmo.orbitals.overlap import ChannelScale, overlap_matrix, scaled_overlap_matrices
from ehmo.orbitals.pairs import orbital_plan
from tests.geometries import SPECIES

STANDARD = load_set("standard")
SPREAD = 0.03


def grid_and_plan(name: str, *, by_channel: bool = False, relative: float = SPREAD):
    species = SPECIES[name]
    plan = orbital_plan(species.symbols, STANDARD)
    shells = {symbol: STANDARD.element(symbol).shells for symbol in set(species.symbols)}
    sds = {symbol: tuple((relative,) * len(s.zetas) for s in own) for symbol, own in shells.items()}
    return exponent_grid(plan, species.positions_A, shells, sds, by_channel=by_channel), plan, species


def moved_table(symbols, steps: dict[str, float]):
    """The standard set with the exponents of each element moved."""
    elements = {}
    for symbol in set(symbols):
        element = STANDARD.element(symbol)
        shells = (moved_shell(s, (SPREAD,) * len(s.zetas), steps.get(symbol, 0.0)) for s in element.shells)
        elements[symbol] = replace(element, shells=tuple(shells))
    return replace(STANDARD, elements=elements)


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "UO2 2+"])
@pytest.mark.parametrize(("step", "error"), [(0.0, 1e-12), (NODE, 1e-12), (-NODE, 1e-12), (1.0, 2e-4), (-2.5, 3e-3)])
def test_overlaps_are_exact_at_the_nodes_and_close_between_them(name, step, error):
    grid, plan, species = grid_and_plan(name)
    metal = species.symbols[0]
    steps = np.zeros((1, len(plan.basis)))
    steps[0, plan.basis.functions_of(0)] = step
    ours = grid.two_centre(steps)[0, 0] + np.eye(len(plan.basis))
    table = moved_table(species.symbols, {metal: step})
    exact = overlap_matrix(orbital_plan(species.symbols, table), species.positions_A)
    assert np.abs(ours - exact).max() < error


def test_channels_add_up_and_are_those_of_the_scaled_overlaps():
    grid, plan, species = grid_and_plan("[VO(OH2)5]2+", by_channel=True)
    still = np.zeros((1, len(plan.basis)))
    parts = grid.two_centre(still)[0]
    whole = overlap_matrix(plan, species.positions_A)
    assert parts.sum(axis=0) + np.eye(len(plan.basis)) == pytest.approx(whole, abs=1e-12)
    factors = (1.3, 0.7, 2.0, 0.1)
    _, scaled = scaled_overlap_matrices(plan, species.positions_A, ChannelScale(factors))
    assert np.tensordot(factors, parts, axes=1) == pytest.approx(scaled, abs=1e-12)


def test_interpolated_overlaps_are_symmetric():
    grid, plan, _ = grid_and_plan("VOCl3")
    steps = np.random.default_rng(1).standard_normal((3, len(plan.basis.type_h_ii_eV)))[:, plan.basis.type_of]
    parts = grid.two_centre(steps)
    assert parts == pytest.approx(parts.swapaxes(-1, -2), abs=1e-13)


def test_sure_exponents_need_one_node():
    grid, plan, species = grid_and_plan("VOCl3", relative=0.0)
    assert grid.matrices.shape[:3] == (1, 1, 1)
    still = grid.two_centre(np.zeros((2, len(plan.basis))))
    assert still[1, 0] + np.eye(len(plan.basis)) == pytest.approx(overlap_matrix(plan, species.positions_A), abs=1e-12)
