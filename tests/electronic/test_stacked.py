"""Response of the charges, and how fast stacks of draws settle."""

from __future__ import annotations

import numpy as np
import pytest

import ehmo
from ehmo.electronic.charges import ElectronCount, mulliken_charges
from ehmo.electronic.eigen import solve
from ehmo.electronic.occupation import fill
from ehmo.electronic.stacked import Metric, charge_response, settled_charges
from ehmo.studies.ensemble import Ensemble
from ehmo.studies.uncertainty import parameter_model
from tests.geometries import SPECIES


@pytest.mark.parametrize("name", ["VOCl3", "[VOCl4]2-", "[FeO(OH2)5]2+"])
def test_response_is_the_derivative_of_the_gross_populations(name):
    report = ehmo.bond_report(SPECIES[name].fragment())
    basis, S, state = report.basis, report.overlap, report.state
    C = state.coefficients
    H = S @ (C * state.energies_eV) @ C.T @ S
    electrons = round(state.occupations.sum())
    response = charge_response(state, S, basis)
    step = 1e-4
    for atom in range(3):
        found = []
        for sign in (1, -1):
            half = np.where(basis.atom_of == atom, sign * step / 2, 0.0)
            energies, vectors = solve(H + S * (half[:, None] + half), S, basis)
            filling = fill(energies, electrons, report.fragment.unpaired_electrons).sum(axis=0)
            found.append(basis.core_charges - mulliken_charges(vectors, S, filling, basis))
        assert response[:, atom] == pytest.approx((found[0] - found[1]) / (2 * step), abs=1e-6)
    assert response == pytest.approx(response.T, abs=1e-12)
    assert response.sum(axis=0) == pytest.approx(0, abs=1e-10)  # electrons are only moved
    assert np.diag(response).max() < 0


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "[FeO(OH2)5]2+", "W(CCH3)(OCH3)3", "[Fe(CN)5(NO)]2-"])
def test_draws_settle_in_few_diagonalisations(name, standard):
    report = ehmo.bond_report(SPECIES[name].fragment())
    model = parameter_model(report.basis, standard, standard.settings, self_consistent=True)
    iterations = Ensemble(report, standard, model).results(model.draws(16, 11)).iterations
    assert iterations.mean() < 8
    assert iterations.max() <= 15


def test_draws_that_run_out_of_diagonalisations_are_not_settled():
    report = ehmo.bond_report(SPECIES["VOCl3"].fragment())
    basis, S, state = report.basis, report.overlap, report.state
    H = S @ (state.coefficients * state.energies_eV) @ state.coefficients.T @ S
    n_atoms = len(basis.symbols)
    states = settled_charges(
        np.stack([H, H]),
        Metric.of(S, *np.linalg.eigh(S)),
        basis,
        ElectronCount(32, 0),
        np.stack([np.eye(n_atoms), 5 * np.eye(n_atoms)]),
        np.zeros(n_atoms),
        charge_response(state, S, basis),
        limit=1,
    )
    assert not states.settled.any()
    assert np.isnan(states.charges).all()
    assert states.iterations.tolist() == [1, 1]
