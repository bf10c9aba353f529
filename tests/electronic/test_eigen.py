"""Generalised eigenproblem, and what happens when functions are linearly dependent."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import eigh

from ehmo.electronic.eigen import overlap_spectrum, solve
from ehmo.errors import OverlapError
from ehmo.orbitals.overlap import overlap_matrix
from ehmo.orbitals.pairs import orbital_plan
from tests.geometries import SPECIES
from tests.numeric_boxes import Job, matrices, shell, table

DIFFUSE = table(C=(4, (shell(4, 0, 0.5), shell(4, 1, 0.5))))


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "Cr(CO)6", "UO2 2+"])
def test_eigenpairs_against_scipy_and_their_laws(name, standard):
    plan, overlap, hamiltonian = matrices(Job.of(SPECIES[name], standard))
    kept = hamiltonian.copy(), overlap.copy()
    energies, C = solve(hamiltonian, overlap, plan.basis)
    np.testing.assert_allclose(energies, eigh(hamiltonian, overlap, eigvals_only=True), rtol=0, atol=1e-10)
    np.testing.assert_allclose(C.T @ overlap @ C, np.eye(len(C)), rtol=0, atol=1e-12)
    np.testing.assert_allclose(hamiltonian @ C, overlap @ C * energies, rtol=0, atol=1e-10)
    np.testing.assert_array_equal(hamiltonian, kept[0])
    np.testing.assert_array_equal(overlap, kept[1])


def test_spectrum_rebuilds_the_overlap_matrix(standard):
    plan, overlap, _ = matrices(Job.of(SPECIES["VOCl3"], standard))
    spectrum = overlap_spectrum(overlap, plan.basis)
    rebuilt = (spectrum.vectors * spectrum.eigenvalues) @ spectrum.vectors.T
    np.testing.assert_allclose(rebuilt, overlap, rtol=0, atol=1e-13)
    assert (np.diff(spectrum.eigenvalues) >= 0).all()


@pytest.mark.parametrize("route", ["spectrum", "solver"])
def test_duplicated_function_is_named_with_its_atom(route, standard):
    plan, overlap, hamiltonian = matrices(Job.of(SPECIES["VOCl3"], standard))
    basis = plan.basis
    first, twin = basis.functions_of(1).start, basis.functions_of(2).start
    singular = overlap.copy()
    singular[twin] = singular[first]
    singular[:, twin] = singular[:, first]
    singular[twin, twin] = 1.0
    with pytest.raises(OverlapError, match=r"(?=.*2s of O2)(?=.*3s of Cl3)"):
        if route == "spectrum":
            overlap_spectrum(singular, basis)
        else:
            solve(hamiltonian, singular - 1e-9 * np.eye(len(singular)), basis)


def test_diffuse_functions_on_crowded_atoms_are_refused():
    # Nine 4s, 4p atoms on a grid of 0.38 angstrom: functions of bohr-size steps on orbitals of 9 bohr radius.
    positions = np.array([(x, y, 0.0) for x in range(3) for y in range(3)]) * 0.38
    plan = orbital_plan(("C",) * 9, DIFFUSE)
    with pytest.raises(OverlapError, match=r"linearly dependent.*4p[xyz] of C\d") as caught:
        overlap_spectrum(overlap_matrix(plan, positions), plan.basis)
    assert caught.value.mend
