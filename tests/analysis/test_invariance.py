"""Laws of the whole report: rotation, reflection, translation, order of the atoms, additivity, sums."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pytest
from scipy.stats import ortho_group, special_ortho_group

from ehmo import bond_report
from ehmo.electronic.charges import CHARGE_TOLERANCE
from ehmo.records.fragment import Fragment
from ehmo.records.options import Options
from ehmo.records.report import BondReport
from tests.geometries import SPECIES, Species

FIXED = Options(charge_model="fixed")
NAMES = [
    "[VO(OH2)5]2+",
    "[FeO(OH2)5]2+",
    "MnO4 -",
    "FeO4 2-",
    "[CrNCl4]2-",
    "V(NC6H5)Cl3",
    "Cr(CO)5(C(OMe)Me)",
    "NpO2 2+",
    "[PuO2(OH2)5]2+",
]
EXACT = 1e-10
FAR_AWAY_A = np.array([0, 60.0, 0])
# Charges stop within CHARGE_TOLERANCE of their fixed point, wherever the starting rounding takes them; orders and
# levels (about 10 eV per e) follow.
SELF_CONSISTENT = 100 * CHARGE_TOLERANCE


@dataclass(frozen=True)
class Move:
    """Another description of the same molecule: atom k of the new one is atom order[k] of the old one."""

    positions_A: np.ndarray
    order: np.ndarray


def rotated(species: Species) -> Move:
    turn = special_ortho_group.rvs(3, random_state=17)
    return Move(species.positions_A @ turn.T, np.arange(len(species.symbols)))


def reflected(species: Species) -> Move:
    turn = ortho_group.rvs(3, random_state=5)
    turn *= -np.sign(np.linalg.det(turn))
    return Move(species.positions_A @ turn.T, np.arange(len(species.symbols)))


def translated(species: Species) -> Move:
    return Move(species.positions_A + np.array([3.7, -11.3, 0.6]), np.arange(len(species.symbols)))


def reordered(species: Species) -> Move:
    order = np.random.default_rng(9).permutation(len(species.symbols))
    return Move(species.positions_A[order], order)


def report_of(species: Species, move: Move, options: Options) -> BondReport:
    fragment = Fragment(
        tuple(species.symbols[k] for k in move.order), move.positions_A, species.charge, species.unpaired_electrons
    )
    return bond_report(fragment, options=options)


def assert_same(found: BondReport, expected: BondReport, order: np.ndarray, tolerance: float) -> None:
    def close(ours, theirs):
        np.testing.assert_allclose(ours, theirs, rtol=0, atol=tolerance)

    close(found.state.energies_eV, expected.state.energies_eV)
    close(found.state.energy_eV, expected.state.energy_eV)
    close(found.populations.charges, expected.populations.charges[order])
    close(found.populations.spin, expected.populations.spin[order])
    close(found.populations.atom_overlap, expected.populations.atom_overlap[np.ix_(order, order)])
    reference = {(bond.metal, bond.donor): (bond, orders) for bond, orders in expected.bonds()}
    assert len(reference) == len(found.orders)
    for bond, orders in found.bonds():
        other, other_orders = reference[order[bond.metal], order[bond.donor]]
        assert bond.kind == other.kind
        close(bond.length_A, other.length_A)
        for name in ("overlap_population", "mayer", "wiberg", "channel_weights"):
            close(getattr(orders, name), getattr(other_orders, name))
        strong = orders.channel_weights > 0.05
        np.testing.assert_array_equal(
            orders.channel_shares[strong].argmax(axis=1), other_orders.channel_shares[strong].argmax(axis=1)
        )


@pytest.mark.parametrize("move", [rotated, reflected, translated, reordered], ids=lambda move: move.__name__)
@pytest.mark.parametrize("name", NAMES)
def test_report_does_not_depend_on_how_the_molecule_lies_in_the_file(name, move):
    species = SPECIES[name]
    moved = move(species)
    still = Move(species.positions_A, np.arange(len(species.symbols)))
    for options, tolerance in ((FIXED, EXACT), (Options(), SELF_CONSISTENT)):
        found, expected = report_of(species, moved, options), report_of(species, still, options)
        assert_same(found, expected, moved.order, tolerance)


@pytest.mark.parametrize("name", ["VOCl3", "MnO4 -", "[VO(OH2)5]2+", "[CrNCl4]2-", "[UO2(OH2)5]2+"])
def test_two_copies_far_apart_add_up(name):
    species = SPECIES[name]
    positions = np.concatenate([species.positions_A, species.positions_A + FAR_AWAY_A])
    pair = Fragment(species.symbols * 2, positions, 2 * species.charge, 2 * species.unpaired_electrons)
    both, single = bond_report(pair, options=FIXED), bond_report(species.fragment(), options=FIXED)
    size = len(species.symbols)
    assert both.state.energy_eV == pytest.approx(2 * single.state.energy_eV, abs=1e-9)
    np.testing.assert_allclose(both.state.energies_eV, np.repeat(single.state.energies_eV, 2), rtol=0, atol=EXACT)
    np.testing.assert_allclose(both.populations.charges, np.tile(single.populations.charges, 2), rtol=0, atol=EXACT)
    np.testing.assert_allclose(both.populations.atom_overlap[:size, size:], 0, rtol=0, atol=EXACT)
    assert both.coordination.metals == (0, size)
    expected = {(bond.metal, bond.donor): orders for bond, orders in single.bonds()}
    for bond, orders in both.bonds():
        alone = expected[bond.metal % size, bond.donor % size]
        for value in ("overlap_population", "mayer", "wiberg", "channel_weights"):
            np.testing.assert_allclose(getattr(orders, value), getattr(alone, value), rtol=0, atol=EXACT)


def test_two_unlike_neutral_molecules_far_apart_add_up():
    first, second = SPECIES["VOCl3"], SPECIES["OsO4"]
    positions = np.concatenate([first.positions_A, second.positions_A + FAR_AWAY_A])
    both = bond_report(Fragment(first.symbols + second.symbols, positions, 0, 0), options=FIXED)
    alone = [bond_report(species.fragment(), options=FIXED) for species in (first, second)]
    assert both.state.energy_eV == pytest.approx(sum(report.state.energy_eV for report in alone), abs=1e-9)
    charges = np.concatenate([report.populations.charges for report in alone])
    np.testing.assert_allclose(both.populations.charges, charges, rtol=0, atol=EXACT)
    mayer = sorted(orders.mayer for report in alone for orders in report.orders)
    np.testing.assert_allclose(sorted(orders.mayer for orders in both.orders), mayer, rtol=0, atol=EXACT)


@pytest.mark.parametrize("name", SPECIES)
def test_overlap_is_positive_definite_and_electrons_add_up(name):
    species = SPECIES[name]
    report = bond_report(species.fragment())
    np.linalg.cholesky(report.overlap)
    smallest = np.linalg.eigvalsh(report.overlap)[0]
    assert report.method.smallest_overlap_eigenvalue == pytest.approx(smallest, abs=1e-10)
    electrons = report.basis.core_charges.sum() - species.charge
    assert report.state.occupations.sum() == pytest.approx(electrons, abs=1e-10)
    assert (report.state.occupations[0] - report.state.occupations[1]).sum() == pytest.approx(
        species.unpaired_electrons, abs=1e-10
    )
    assert report.populations.gross.sum() == pytest.approx(electrons, abs=1e-9)
    assert report.populations.charges.sum() == pytest.approx(species.charge, abs=1e-9)
    C = report.state.coefficients
    np.testing.assert_allclose(C.T @ report.overlap @ C, np.eye(len(C)), rtol=0, atol=1e-11)
