"""Terms in an octahedron against the matrices of Tanabe and Sugano, J. Phys. Soc. Jpn. 9, 753 (1954) (memory).

Griffith (1961), table A24-A31, has the same matrices (memory).
"""

from __future__ import annotations

from math import sqrt

import numpy as np
import pytest
from scipy.optimize import brentq

from ehmo.analysis.multiplets import multiplet_terms
from ehmo.analysis.symmetry.groups import point_group
from tests.analysis.multiplets.fields import energies, octahedral_eV, racah

OH = point_group("Oh")
B, C = 860.0, 3850.0
DELTAS = [6000.0, 17400.0, 34000.0]


def terms_of(n_electrons, delta, b=B, c=C):
    return multiplet_terms(octahedral_eV(delta), n_electrons, racah(b, c), OH)


def pair(first, second, coupling):
    """Eigenvalues of a 2 x 2 matrix."""
    return np.linalg.eigvalsh([[first, coupling], [coupling, second]])


def two_electrons(delta):
    """d2 with Racah's A left out, t2g at -0.4 and eg at 0.6 of delta; d8 is the same with -delta."""
    low, middle, high = -0.8 * delta, 0.2 * delta, 1.2 * delta
    return {
        "3T1g": pair(low - 5 * B, middle + 4 * B, 6 * B),
        "3T2g": [middle - 8 * B],
        "3A2g": [high - 8 * B],
        "1A1g": pair(low + 10 * B + 5 * C, high + 8 * B + 4 * C, sqrt(6) * (2 * B + C)),
        "1Eg": pair(low + B + 2 * C, high + 2 * C, 2 * sqrt(3) * B),
        "1T2g": pair(low + B + 2 * C, middle + 2 * C, 2 * sqrt(3) * B),
        "1T1g": [middle + 4 * B + 2 * C],
    }


@pytest.mark.parametrize("delta", DELTAS)
@pytest.mark.parametrize("n_electrons", [2, 8])
def test_all_terms_of_d2_and_d8(n_electrons, delta):
    expected = two_electrons(delta if n_electrons == 2 else -delta)
    terms = terms_of(n_electrons, delta)
    assert terms.ground.label == ("3T1g" if n_electrons == 2 else "3A2g")
    lowest = min(expected[terms.ground.label])
    assert {t.label for t in terms.terms} == set(expected)
    for label, values in expected.items():
        np.testing.assert_allclose(energies(terms, label), np.sort(values) - lowest, rtol=0, atol=1e-6, err_msg=label)


@pytest.mark.parametrize("delta", DELTAS)
def test_quartets_and_lowest_doublets_of_d3(delta):
    terms = terms_of(3, delta)
    ground = -1.2 * delta - 15 * B
    assert terms.ground.label == "4A2g"
    np.testing.assert_allclose(energies(terms, "4T2g"), [delta], rtol=0, atol=1e-6)
    quartets = pair(-0.2 * delta - 3 * B, 0.8 * delta - 12 * B, 6 * B)
    np.testing.assert_allclose(energies(terms, "4T1g"), quartets - ground, rtol=0, atol=1e-6)
    # 2E: t2g3, t2g2(1A1)eg, t2g2(1E)eg, eg3.
    r2, r3 = sqrt(2), sqrt(3)
    doublets = (
        np.array(
            [
                [-6 * B + 3 * C, -6 * r2 * B, -3 * r2 * B, 0],
                [0, 8 * B + 6 * C, 10 * B, r3 * (2 * B + C)],
                [0, 0, -B + 3 * C, 2 * r3 * B],
                [0, 0, 0, -8 * B + 4 * C],
            ]
        )
        + np.diag([-1.2, -0.2, -0.2, 1.8]) * delta
    )
    doublets = np.linalg.eigvalsh(doublets, UPLO="U")
    np.testing.assert_allclose(energies(terms, "2Eg"), doublets - ground, rtol=0, atol=1e-6)


@pytest.mark.parametrize("strength", [25, 30, 35])
def test_spin_flip_of_d3_in_the_range_of_real_ions(strength):
    # 4A2g -> 2Eg about 9B + 3C - 50 B^2/delta for C = 4B: Tanabe & Sugano 1954 (memory), to within 10 B^2/delta.
    shift = energies(terms_of(3, strength * B, B, 4 * B), "2Eg")[0]
    assert (shift - 21 * B) * strength / B == pytest.approx(-50, abs=10)


# C. K. Jorgensen, Absorption Spectra and Chemical Bonding (1962); A. B. P. Lever, Inorganic Electronic Spectroscopy
# (1984): low-spin d6 above 1A1g, second order in B (memory).
LOW_SPIN_D6 = {"1T1g": (0, -1, 86), "1T2g": (16, -1, 2), "3T1g": (0, -3, 50), "3T2g": (8, -3, 14)}


@pytest.mark.parametrize("label", LOW_SPIN_D6)
@pytest.mark.parametrize("delta", [4e5, 1e6, 4e6])
def test_first_excited_terms_of_low_spin_d6(label, delta):
    # The second-order figures are for C = 4B.
    b, c, second = LOW_SPIN_D6[label]
    terms = terms_of(6, delta, B, 4 * B)
    assert terms.ground.label == "1A1g"
    shift = energies(terms, label)[0] - delta - b * B - 4 * c * B
    assert shift * delta / B**2 == pytest.approx(second, abs=3000 * B / delta)


@pytest.mark.parametrize("delta", DELTAS)
def test_spin_allowed_band_of_high_spin_d6_is_delta(delta):
    terms = terms_of(6, delta)
    quintets = [t for t in terms.terms if t.multiplicity == 5]
    assert [t.label for t in quintets] == ["5T2g", "5Eg"]
    assert quintets[1].energy_per_cm - quintets[0].energy_per_cm == pytest.approx(delta, abs=1e-6)


# Spin crossing in the diagrams of Tanabe & Sugano (1954): delta/B where the ground term changes, for their C/B
# (memory, read off to about one unit).
CROSSINGS = [(4, 4.61, "5Eg", "3T1g", 27.0), (5, 4.477, "6A1g", "2T2g", 28.0), (6, 4.8, "5T2g", "1A1g", 20.0)]


@pytest.mark.parametrize(
    ("n_electrons", "ratio", "high", "low", "published"), [*CROSSINGS, (7, 4.63, "4T1g", "2Eg", 22)]
)
def test_spin_crossings(n_electrons, ratio, high, low, published):
    def difference(strength):
        terms = terms_of(n_electrons, strength * 1000, 1000, ratio * 1000)
        return energies(terms, high)[0] - energies(terms, low)[0]

    assert brentq(difference, 5, 60, xtol=1e-3) == pytest.approx(published, abs=1.0)
    assert terms_of(n_electrons, (published - 2) * 1000, 1000, ratio * 1000).ground.label == high
    assert terms_of(n_electrons, (published + 2) * 1000, 1000, ratio * 1000).ground.label == low


@pytest.mark.parametrize("n_electrons", range(1, 10))
def test_holes_equal_electrons_in_the_field_of_opposite_sign(n_electrons):
    repulsion = racah(B, C) if 1 < n_electrons < 9 else None
    electrons = multiplet_terms(octahedral_eV(15000), n_electrons, repulsion, OH).terms
    holes = multiplet_terms(octahedral_eV(-15000), 10 - n_electrons, repulsion, OH).terms
    assert sorted(t.label for t in electrons) == sorted(t.label for t in holes)
    for label in {t.label for t in electrons}:
        ours = [t.energy_per_cm for t in electrons if t.label == label]
        np.testing.assert_allclose(ours, [t.energy_per_cm for t in holes if t.label == label], rtol=0, atol=1e-6)


# Free-ion parentage, ground term and configuration in a weak and a strong field: Griffith 1961 (memory).
GROUND = [
    (1, 10000, "2T2g", "t2g¹", "D"),
    (2, 15000, "3T1g", "t2g²", "F"),
    (3, 15000, "4A2g", "t2g³", "F"),
    (4, 10000, "5Eg", "t2g³ eg¹", "D"),
    (4, 40000, "3T1g", "t2g⁴", "H"),
    (5, 10000, "6A1g", "t2g³ eg²", "S"),
    (5, 40000, "2T2g", "t2g⁵", "I"),
    (6, 10000, "5T2g", "t2g⁴ eg²", "D"),
    (6, 40000, "1A1g", "t2g⁶", "I"),
    (7, 10000, "4T1g", "t2g⁵ eg²", "F"),
    (7, 40000, "2Eg", "t2g⁶ eg¹", "G"),
    (8, 10000, "3A2g", "t2g⁶ eg²", "F"),
    (9, 10000, "2Eg", "t2g⁶ eg³", "D"),
]


@pytest.mark.parametrize(("n_electrons", "delta", "label", "configuration", "parent"), GROUND)
def test_ground_term_with_its_configuration(n_electrons, delta, label, configuration, parent):
    terms = multiplet_terms(octahedral_eV(delta), n_electrons, racah(B, C), OH)
    ground = terms.ground
    assert (ground.label, ground.configuration_text) == (label, configuration)
    # The configuration alone settles these.
    assert terms.by_symmetry == (label,)
    if delta == 10000 or n_electrons < 4:
        assert ground.parent == parent
    assert ground.energy_per_cm == pytest.approx(0, abs=1e-6)
    assert [level.label for level in terms.levels] == ["t2g", "eg"]


def test_3T1g_of_d2_keep_their_free_ion_names():
    # 3T1g(F) and 3T1g(P), the customary names.
    terms = [t for t in terms_of(2, 17000).terms if t.label == "3T1g"]
    assert [t.parent for t in terms] == ["F", "P"]
    assert all(0.5 < t.parent_share < 1 for t in terms)


def test_weights_of_configurations_follow_the_two_by_two_matrix():
    # 3T1g of d2: the square of the t2g2 coefficient, matrix as above.
    _, vectors = np.linalg.eigh([[-0.8 * 17000 - 5 * B, 6 * B], [6 * B, 0.2 * 17000 + 4 * B]])
    lowest = terms_of(2, 17000).ground
    assert lowest.configuration == (("t2g", 2), ("eg", 0))
    assert lowest.configuration_share == pytest.approx(vectors[0, 0] ** 2, abs=1e-9)


@pytest.mark.parametrize("n_electrons", [2, 3, 7, 8])
def test_tetrahedron_is_the_octahedron_of_opposite_sign_without_parity(n_electrons):
    # 10Dq(Td) = -4/9 10Dq(Oh): the donors of a tetrahedron lie on the corners of a cube (Ballhausen 1962; memory).
    octahedral = multiplet_terms(octahedral_eV(-7000), n_electrons, racah(B, C), OH).terms
    tetrahedral = multiplet_terms(octahedral_eV(-7000), n_electrons, racah(B, C), point_group("Td")).terms
    key = lambda t: (round(t.energy_per_cm, 4), t.label)  # noqa: E731
    plain = sorted((round(t.energy_per_cm, 4), t.label.replace("g", "")) for t in octahedral)
    assert sorted(map(key, tetrahedral)) == plain
