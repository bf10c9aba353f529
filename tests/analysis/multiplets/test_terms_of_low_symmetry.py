"""Terms in tetragonal, linear and distorted fields."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.spatial.transform import Rotation

from ehmo.analysis.multiplets import configuration_terms, multiplet_terms, tetragonal_energies
from ehmo.analysis.symmetry.groups import point_group
from ehmo.records.multiplets import ElectronRepulsion
from ehmo.units import PER_CM_PER_EV
from tests.analysis.multiplets.fields import (
    GROUPS,
    energies,
    n_determinants,
    octahedral_eV,
    racah,
    random_field_eV,
    tetragonal_eV,
    turned,
)

C4V = point_group("C4v")


@pytest.mark.parametrize(("Dq", "Ds", "Dt"), [(1600.0, -2500.0, 300.0), (1100.0, 900.0, -250.0), (1000.0, 0.0, 0.0)])
@pytest.mark.parametrize("name", ["C4v", "D4h"])
def test_d1_in_a_tetragonal_field_ballhausen_1962(Dq, Ds, Dt, name):
    # Ballhausen, Introduction to Ligand Field Theory (1962), chapter 5 (memory), from the crystal-field operators:
    # Ds acts as <3z2-r2>-like diagonal (2, 1, -2) in |m| = 0, 1, 2 times -Ds, Dt as (6, -4, 1) times -Dt.
    m0, m1, m2 = -2 * Ds - 6 * Dt, -Ds + 4 * Dt, 2 * Ds - Dt
    expected = {"b1": 6 * Dq + m2, "a1": 6 * Dq + m0, "b2": -4 * Dq + m2, "e": -4 * Dq + m1}
    assert tetragonal_energies(Dq, Ds, Dt) == pytest.approx(expected)
    terms = multiplet_terms(tetragonal_eV(**expected), 1, None, point_group(name)).terms
    parity = "g" if name == "D4h" else ""
    lowest = min(expected.values())
    found = {term.label: term.energy_per_cm for term in terms}
    assert found == pytest.approx({f"2{k.upper()}{parity}": v - lowest for k, v in expected.items()}, abs=1e-6)


def test_vanadyl_like_d1():
    # 2B2 ground term, first band to 2E, then 2B1, then 2A1 (Ballhausen & Gray 1962; memory).
    terms = multiplet_terms(tetragonal_eV(b1=16000, a1=30000, b2=0, e=13000), 1, None, C4V)
    assert [t.label for t in terms.terms] == ["2B2", "2E", "2B1", "2A1"]
    assert [t.degeneracy for t in terms.terms] == [1, 2, 1, 1]
    assert [t.configuration_text for t in terms.terms] == ["b2¹", "e¹", "b1¹", "a1¹"]
    assert terms.by_symmetry == ("2B2",)


@pytest.mark.parametrize(
    ("n_electrons", "order", "label"),
    [
        # b2 far below e: d2 pairs its electrons, as in nitridoosmium(VI) and trans-dioxorhenium(V) ions; when b2 and e
        # are close the ground term is a triplet or quartet (common practice).
        (2, {"b2": 0, "e": 25000, "b1": 28000, "a1": 45000}, "1A1"),
        (2, {"b2": 0, "e": 8000, "b1": 28000, "a1": 45000}, "3E"),
        (3, {"b2": 0, "e": 3000, "b1": 28000, "a1": 45000}, "4B1"),
        (4, {"b2": 0, "e": 8000, "b1": 9000, "a1": 18000}, "5A1"),
        (4, {"b2": 0, "e": 8000, "b1": 60000, "a1": 70000}, "3A2"),
    ],
)
def test_spin_of_square_pyramids(n_electrons, order, label):
    terms = multiplet_terms(tetragonal_eV(**order), n_electrons, racah(700, 2800), C4V)
    assert terms.ground.label == label
    assert label in terms.by_symmetry


def uranyl_like(phi, delta, pi, sigma):
    """Field of an actinyl: f functions m = -3..3 by |m|."""
    return np.diag([phi, delta, pi, sigma, pi, delta, phi]) / PER_CM_PER_EV


def test_terms_of_actinyl_ions_by_lambda():
    # f1: 2Phi_u, 2Delta_u lowest; f2: (delta_u)(phi_u) gives 3H and 3Pi, phi_u^2 gives 3Sigma-: Denning, Struct.
    # Bonding 79, 215 (1992) (memory).
    group = point_group("D∞h")
    field = uranyl_like(0, 1500, 18000, 30000)
    one = multiplet_terms(field, 1, None, group)
    assert [t.label for t in one.terms] == ["2Φu", "2Δu", "2Πu", "2Σu+"]
    assert [t.degeneracy for t in one.terms] == [2, 2, 2, 1]
    five = "Η"  # capital eta
    assert set(configuration_terms(group, [("δu", 1), ("φu", 1)])) == {
        (mult, irrep, 1) for mult in (1, 3) for irrep in ("Πg", f"{five}g")
    }
    assert set(configuration_terms(group, [("φu", 2)])) == {
        (3, "Σg-", 1),
        (1, "Σg+", 1),
        (1, "Ιg", 1),  # capital iota
    }
    two = multiplet_terms(field, 2, ElectronRepulsion(52000 * 0.8, 41000 * 0.8, 28000 * 0.8), group)
    assert two.ground.label == f"3{five}g"
    assert two.ground.configuration_text == "φu¹ δu¹"
    assert two.ground.parent == "H"


@pytest.mark.parametrize("name", GROUPS)
@pytest.mark.parametrize("n_electrons", [2, 3, 5])
def test_symmetrised_field_gives_pure_irreps_and_full_degeneracy(name, n_electrons):
    group = point_group(name)
    field = symmetrised(random_field_eV(5, n_electrons), group)
    terms = multiplet_terms(field, n_electrons, racah(800, 3100), group).terms
    assert sum(t.multiplicity * t.degeneracy for t in terms) == n_determinants(2, n_electrons)
    dimensions = dict(zip(group.term_irreps, group.dimensions.tolist(), strict=True))
    for term in terms:
        assert term.share == pytest.approx(1, abs=1e-8)
        assert term.degeneracy == dimensions[term.irrep]
        assert term.spread_per_cm < 1e-4


def symmetrised(field, group):
    """Mean of a field over the operations of a group."""
    return np.mean([turned(field, operation) for operation in group.operations], axis=0)


@pytest.mark.parametrize("name", [name for name in GROUPS if name != "D∞h"])
@pytest.mark.parametrize("n_electrons", [2, 3, 4])
def test_full_calculation_has_the_terms_that_the_configurations_allow(name, n_electrons):
    # Law: direct products and the Pauli principle, over all ways to fill the levels, give every term.
    group = point_group(name)
    terms = multiplet_terms(symmetrised(random_field_eV(5, 3), group), n_electrons, racah(800, 3100), group)
    assert {t.label: 0 for t in terms.terms} | counted(t.label for t in terms.terms) == allowed(terms, group)


def counted(labels):
    labels = list(labels)
    return {label: labels.count(label) for label in labels}


def allowed(terms, group):
    bare = [level.label if level.label in group.irreps else level.label.lstrip("123456789") for level in terms.levels]
    sizes = [level.degeneracy for level in terms.levels]
    total = {}
    for filling in np.ndindex(*(2 * size + 1 for size in sizes)):
        if sum(filling) != terms.n_electrons:
            continue
        for multiplicity, irrep, count in configuration_terms(group, list(zip(bare, filling, strict=True))):
            label = f"{multiplicity}{irrep}"
            total[label] = total.get(label, 0) + count
    return total


@pytest.mark.parametrize("n_electrons", [1, 2, 3, 6])
def test_turning_the_molecule_with_its_axes_changes_nothing(n_electrons):
    rotation = Rotation.random(random_state=n_electrons).as_matrix()
    field = tetragonal_eV(b1=15000, a1=26000, b2=0, e=9000)
    repulsion = racah(700, 2900)
    straight = multiplet_terms(field, n_electrons, repulsion, C4V).terms
    askew = multiplet_terms(turned(field, rotation), n_electrons, repulsion, C4V, rotation.T).terms
    assert [t.label for t in straight] == [t.label for t in askew]
    for one, other in zip(straight, askew, strict=True):
        assert one.energy_per_cm == pytest.approx(other.energy_per_cm, abs=1e-5)
        assert one.configuration == other.configuration
        assert other.share == pytest.approx(1, abs=1e-9)


@pytest.mark.parametrize("n_electrons", [1, 2, 3, 8])
def test_a_slight_distortion_keeps_the_labels_and_shows_in_share_and_spread(n_electrons):
    group = point_group("Oh")
    exact = multiplet_terms(octahedral_eV(16000), n_electrons, racah(800, 3200), group)
    bent_field = octahedral_eV(16000) + random_field_eV(5, 11, width_per_cm=150)
    bent = multiplet_terms(bent_field, n_electrons, racah(800, 3200), group)
    assert bent.ground.label == exact.ground.label
    assert bent.ground.configuration == exact.ground.configuration
    assert bent.by_symmetry == exact.by_symmetry
    assert sorted(t.label for t in bent.terms) == sorted(t.label for t in exact.terms)
    assert all(0.2 < t.share < 1 for t in bent.terms)
    degenerate = [t for t in bent.terms if t.degeneracy > 1]
    assert all(t.spread_per_cm > 1 for t in degenerate)
    # The lowest state is the zero of energy, so the mean of a split ground term lies above it.
    assert bent.ground.components_per_cm[0] == pytest.approx(0, abs=0.02)
    # First-order effects are of the size of the distortion.
    for label in {t.label for t in exact.terms if t.multiplicity == exact.ground.multiplicity}:
        np.testing.assert_allclose(energies(bent, label), energies(exact, label), rtol=0, atol=1500)


def test_without_a_group_every_state_stands_alone():
    terms = multiplet_terms(random_field_eV(5, 4), 2, racah(800, 3000))
    assert terms.group == "C1"
    assert {t.label for t in terms.terms} == {"1A", "3A"}
    assert len(terms.terms) == 10 + 15


def test_a_field_that_has_nothing_of_the_group_still_gives_each_irrep_its_states():
    field = random_field_eV(5, 9, width_per_cm=20000)
    group = point_group("Oh")
    terms = multiplet_terms(field, 3, racah(800, 3000), group)
    reference = multiplet_terms(octahedral_eV(15000), 3, racah(800, 3000), group)
    assert sorted(t.label for t in terms.terms) == sorted(t.label for t in reference.terms)
    assert min(t.share for t in terms.terms) < 0.8


def test_the_barycentre_of_the_field_does_not_matter():
    field = tetragonal_eV(b1=15000, a1=26000, b2=0, e=9000)
    low = multiplet_terms(field, 3, racah(700, 2900), C4V)
    high = multiplet_terms(field - 11.3 * np.eye(5), 3, racah(700, 2900), C4V)
    np.testing.assert_allclose(
        [t.energy_per_cm for t in low.terms], [t.energy_per_cm for t in high.terms], rtol=0, atol=1e-6
    )
