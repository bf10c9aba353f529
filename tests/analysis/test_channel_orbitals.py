"""Hybrids of a channel as orbitals, and the orbitals that carry it."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.analysis.channel_orbitals import channel_orbitals, half_overlap
from ehmo.calculate import bond_report
from tests.geometries import SPECIES

NAMES = ("[VO(OH2)5]2+", "MnO4 -", "[FeO(OH2)5]2+", "UO2 2+")


@pytest.fixture(scope="module", params=NAMES)
def report(request):
    return bond_report(SPECIES[request.param].fragment())


def every_channel(report):
    root = half_overlap(report.overlap)
    for bond, orders in report.bonds():
        found = channel_orbitals(bond, orders.channels, report.basis, root, report.state)
        yield from ((bond, channel, orbitals) for channel, orbitals in zip(orders.channels, found, strict=True))


def test_shares_times_weight_are_the_pieces_of_the_wiberg_sum(report):
    """law: in plain loops, w_k = 2 sum_s n_k (u_M m) (u_X P_XM m), and the pieces add up to the weight."""
    root = half_overlap(report.overlap)
    u = root @ report.state.coefficients
    densities = [(u * n) @ u.T for n in report.state.occupations]
    for bond, channel, orbitals in every_channel(report):
        on_metal, on_donor = report.basis.functions_of(bond.metal), report.basis.functions_of(bond.donor)
        pieces = np.zeros(len(u))
        for n, density in zip(report.state.occupations, densities, strict=True):
            image = density[on_donor, on_metal] @ channel.metal_hybrid
            for k in range(len(u)):
                pieces[k] += 2 * n[k] * (u[on_metal, k] @ channel.metal_hybrid) * (u[on_donor, k] @ image)
        assert pieces.sum() == pytest.approx(channel.weight, abs=1e-10)
        np.testing.assert_allclose(orbitals.shares * channel.weight, pieces, atol=1e-10)
        assert orbitals.shares.sum() == pytest.approx(1)


def test_hybrids_are_normalised_and_meet_in_phase(report):
    """law: S^-1/2 h has the norm of h; the product of amplitudes summed over electrons is the density element."""
    u = half_overlap(report.overlap) @ report.state.coefficients
    electrons = report.state.occupations.sum(axis=0)
    for bond, channel, orbitals in every_channel(report):
        for vector in (orbitals.metal_orbital, orbitals.donor_orbital):
            assert vector @ report.overlap @ vector == pytest.approx(1)
        total = electrons @ orbitals.couplings
        on_metal, on_donor = report.basis.functions_of(bond.metal), report.basis.functions_of(bond.donor)
        block = (u[on_metal] * electrons) @ u[on_donor].T
        assert total == pytest.approx(abs(channel.metal_hybrid @ block @ channel.donor_hybrid))


def test_pi_channel_of_vanadyl_is_carried_by_one_orbital_and_opposed_by_its_antibonding_partner():
    """published: Ballhausen & Gray, Inorg. Chem. 1, 111 (1962), scheme of VO2+ (memory): e bonds, e* lies above b2."""
    report = bond_report(SPECIES["[VO(OH2)5]2+"].fragment())
    pi = [orbitals for bond, channel, orbitals in every_channel(report) if bond.donor == 1 and channel.type == "pi"]
    for orbitals in pi[:2]:
        carrier = orbitals.carriers(0.05)[0]
        assert report.irreps.labels[carrier] == "e"
        assert orbitals.shares[carrier] > 0.9
        assert report.irreps.labels[orbitals.antibonding] == "e"
        assert orbitals.antibonding > report.state.homo
        assert orbitals.couplings[orbitals.antibonding] < -0.3
        assert orbitals.shares[orbitals.antibonding] == 0
    assert {orbitals.carriers(0.05)[0] for orbitals in pi[:2]} == {21, 22}
