"""What has no terms, or more than are computed, is refused with a reason."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.analysis.multiplets import (
    effective_moment,
    free_ion_terms,
    magnetic_properties,
    multiplet_terms,
    orbital_momentum,
    spin_orbit_states,
)
from ehmo.errors import EhmoError, MultipletError
from ehmo.records.multiplets import ElectronRepulsion
from tests.analysis.multiplets.fields import octahedral_eV, racah

FIELD = octahedral_eV(15000)
REPULSION = racah(800, 3200)
SHELLS = [
    (5, 0, "d0 has no terms: the shell is empty"),
    (5, 10, "d10 has no terms: the shell is full"),
    (5, 11, "a d shell holds 0 to 10 electrons, not 11"),
    (5, -1, "a d shell holds 0 to 10 electrons, not -1"),
    (7, 0, "f0 has no terms"),
    (7, 4, "terms of f4 are not computed, only those of f1 to f3"),
    (7, 10, "terms of f10 are not computed"),
    (7, 14, "f14 has no terms: the shell is full"),
]


@pytest.mark.parametrize(("size", "n_electrons", "message"), SHELLS)
def test_shells_without_terms(size, n_electrons, message):
    assert issubclass(MultipletError, EhmoError)
    field = np.zeros((size, size))
    slater = ElectronRepulsion(1.0, 1.0, 1.0)
    for refused in (
        lambda: multiplet_terms(field, n_electrons, slater),
        lambda: spin_orbit_states(field, n_electrons, slater, 100.0),
        lambda: magnetic_properties(field, n_electrons, slater, 100.0),
        lambda: free_ion_terms((size - 1) // 2, n_electrons, slater),
    ):
        with pytest.raises(MultipletError, match=message):
            refused()


def test_p_shells_are_refused():
    with pytest.raises(MultipletError, match="d and f shells, not for p2"):
        free_ion_terms(1, 2, REPULSION)


@pytest.mark.parametrize("n_electrons", [2, 5, 8])
def test_missing_repulsion(n_electrons):
    with pytest.raises(MultipletError, match=f"terms of d{n_electrons} need the repulsion .*; give B and C"):
        multiplet_terms(FIELD, n_electrons, None)
    with pytest.raises(MultipletError, match="need the repulsion"):
        spin_orbit_states(FIELD, n_electrons, None, 100.0)


@pytest.mark.parametrize(
    ("field", "message"),
    [
        (np.zeros((4, 4)), "shape"),
        (np.zeros((3, 3)), "shape"),
        (np.zeros(5), "shape"),
        (np.diag([0, 0, 0, 0, np.nan]), "not finite"),
        (np.diag([0, 0, np.inf, 0, 0]), "not finite"),
        (np.triu(np.ones((5, 5))), "not symmetric"),
    ],
)
def test_fields_that_are_no_fields(field, message):
    with pytest.raises(ValueError, match=message):
        multiplet_terms(field, 2, REPULSION)


def test_momenta_that_are_no_momenta():
    with pytest.raises(ValueError, match="shape"):
        spin_orbit_states(FIELD, 1, None, 100.0, orbital_momentum(3))
    with pytest.raises(ValueError, match="not hermitian"):
        spin_orbit_states(FIELD, 1, None, 100.0, 1j * orbital_momentum(2))


@pytest.mark.parametrize("temperature", [0.0, -5.0, np.nan, np.inf])
def test_temperatures_that_are_none(temperature):
    states = spin_orbit_states(FIELD, 1, None, 100.0)
    with pytest.raises(ValueError, match="temperature"):
        effective_moment(states, temperature)


def test_records_are_read_only():
    terms = multiplet_terms(FIELD, 3, REPULSION)
    with pytest.raises(ValueError, match="read-only"):
        terms.ground.components_per_cm[0] = 1.0
    states = spin_orbit_states(FIELD, 1, None, 100.0)
    for array in (states.energies_per_cm, states.vectors, states.orbital_momentum):
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 0
    # The tables behind the records are shared: a caller cannot spoil them either.
    with pytest.raises(ValueError, match="read-only"):
        orbital_momentum(2)[0, 0, 0] = 1
