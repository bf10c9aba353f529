"""Total energies: laws of the parts, size consistency, independent routes."""

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad

import basis_params
from ehmo import Fragment, Options, bond_report
from ehmo.orbitals.radial import orthogonal_radial_functions
from ehmo.orbitals.two_body import (
    atom_density,
    lowest_configuration,
    neutral_atom_repulsion,
    neutral_configuration,
)
from ehmo.units import BOHR_A, COULOMB_EV_A
from tests.energy.fragments import STANDARD, energy, moved, with_terms
from tests.geometries import SPECIES


@pytest.mark.parametrize("symbol", ["H", "O", "Fe", "U"])
def test_a_lone_neutral_atom_is_the_zero(symbol):
    electrons = STANDARD.element(symbol).valence_electrons
    atom = Fragment((symbol,), [[0, 0, 0]], 0, electrons % 2)
    assert energy(atom).total_eV == pytest.approx(0, abs=1e-9)  # law


def test_electronic_energy_is_that_of_the_report():
    fragment = SPECIES["VOCl3"].fragment()
    report = bond_report(fragment)
    parts = energy(fragment)
    assert parts.electronic_eV == pytest.approx(report.state.energy_eV, abs=1e-9)
    np.testing.assert_allclose(parts.charges, report.populations.charges, atol=1e-7)
    assert parts.total_eV == pytest.approx(parts.electronic_eV + parts.repulsion_eV - parts.atoms_eV)


@pytest.mark.parametrize("symbol", ["H", "O", "Mn", "Os", "U"])
def test_density_of_an_atom_holds_its_electrons(symbol):
    element = STANDARD.element(symbol)
    functions = orthogonal_radial_functions(element.shells)
    density = atom_density(element)

    def d(r):
        return sum(w * r**p * np.exp(-a * r) for p, a, w in density.terms)

    # Independent route: quadrature of the functions themselves.
    direct = sum(
        n * sum(w * r ** (k - 1) * np.exp(-z * r) for k, z, w in f.primitives) ** 2 * r**2
        for f, n, r in ((f, n, 1.3) for f, n in zip(functions, neutral_configuration(element), strict=True))
    )
    assert d(1.3) == pytest.approx(direct, rel=1e-10)
    assert quad(d, 0, 60, limit=200)[0] == pytest.approx(element.valence_electrons, rel=1e-8)  # law


def test_repulsion_of_neutral_atoms_is_their_electrostatics():
    """Law: potential of a spherical density by quadrature, core of B in the field of A, mean of both ways."""
    a, b = STANDARD.element("V"), STANDARD.element("O")
    R = 1.6 / BOHR_A
    expected = 0.0
    for cloud, core in ((a, b), (b, a)):
        terms = atom_density(cloud).terms

        def d(r, terms=terms):
            return sum(w * r**p * np.exp(-z * r) for p, z, w in terms)

        inside = quad(d, 0, R, epsabs=1e-12)[0] / R
        outside = quad(lambda r: d(r) / r, R, 60, limit=200, epsabs=1e-12)[0]
        expected += 0.5 * core.valence_electrons * (cloud.valence_electrons / R - inside - outside)
    found, _ = neutral_atom_repulsion(a, b, np.array([1.6]))
    assert found[0] == pytest.approx(expected * COULOMB_EV_A / BOHR_A, rel=1e-7)


def test_repulsion_does_not_depend_on_the_order_of_the_atoms_and_falls_off():
    v, o = STANDARD.element("V"), STANDARD.element("O")
    lengths = np.linspace(1.2, 30, 50)
    one, slope = neutral_atom_repulsion(v, o, lengths)
    np.testing.assert_allclose(one, neutral_atom_repulsion(o, v, lengths)[0], rtol=1e-12)
    assert (one > 0).all()
    assert (np.diff(one) < 0).all()
    assert (slope < 0).all()
    assert one[-1] < 1e-6


def test_ground_configurations_and_their_stand_in():
    # Published: V 3d3 4s2 (any table of ground configurations; memory). Order of the shells: 4s, 4p, 3d.
    assert neutral_configuration(STANDARD.element("V")) == (2.0, 0.0, 3.0)
    assert lowest_configuration(STANDARD.element("V")) == (0.0, 0.0, 5.0)
    without_d = replace(STANDARD.element("V"), shells=STANDARD.element("V").shells[:2], valence_electrons=3)
    assert neutral_configuration(without_d) == (2.0, 1.0, 0.0)[:2]


def test_terms_of_the_set_replace_the_electrostatics():
    fragment = SPECIES["VOCl3"].fragment()
    table = with_terms(("V", "O", 800.0, 3.0, 1.4, 2.4))
    term = table.pair_repulsion("V", "O")
    length = np.linalg.norm(fragment.positions_A[1] - fragment.positions_A[0])
    pair, _ = neutral_atom_repulsion(STANDARD.element("V"), STANDARD.element("O"), np.array([length]))
    change = energy(fragment, table=table).repulsion_eV - energy(fragment).repulsion_eV
    assert change == pytest.approx(term.energy_eV(length) - pair[0], abs=1e-9)


@pytest.mark.parametrize("charges", ["self-consistent", "fixed"])
def test_far_neutral_fragments_add_up(charges):
    """Law: size consistency of neutral closed-shell pieces."""
    options = Options(charge_model=charges)
    one, two = SPECIES["VOCl3"].fragment(), SPECIES["TiCl4"].fragment()
    both = Fragment(
        one.symbols + two.symbols, np.concatenate([one.positions_A, two.positions_A + np.array([400.0, 0, 0])]), 0, 0
    )
    apart = energy(one, options).total_eV + energy(two, options).total_eV
    assert energy(both, options).total_eV == pytest.approx(apart, abs=1e-6)


def test_far_ions_keep_their_coulomb_energy():
    """Law: far ions add up but for the Coulomb law between their charges, here where no electron would move over."""
    ion, distance = SPECIES["MnO4 -"].fragment(), 500.0
    both = Fragment(
        ion.symbols * 2,
        np.concatenate([ion.positions_A, ion.positions_A + np.array([distance, 0, 0])]),
        2 * ion.charge,
        0,
    )
    coulomb = STANDARD.settings.lambda_ * COULOMB_EV_A / distance
    found = energy(both)
    assert found.charges[: len(ion)].sum() == pytest.approx(-1, abs=1e-6)
    assert found.total_eV == pytest.approx(2 * energy(ion).total_eV + coulomb, abs=1e-5)
    fixed = Options(charge_model="fixed")
    assert energy(both, fixed).total_eV == pytest.approx(2 * energy(ion, fixed).total_eV, abs=1e-6)


def test_energy_does_not_depend_on_place_or_turn():
    fragment = moved("[VO(OH2)5]2+")
    turn = np.linalg.qr(np.random.default_rng(3).normal(size=(3, 3)))[0]
    other = replace(fragment, positions_A=fragment.positions_A @ turn.T + [1.0, -2.0, 3.0])
    assert energy(other).total_eV == pytest.approx(energy(fragment).total_eV, abs=1e-7)  # law


def test_it_is_the_same_set_whatever_its_terms():
    assert basis_params.load_set("standard").repulsion == STANDARD.repulsion
    assert not STANDARD.repulsion
