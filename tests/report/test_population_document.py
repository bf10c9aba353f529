"""Populations by shell, function, orbital and irrep add up to those of atoms and bonds."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo import bond_report
from ehmo.analysis.population_parts import orbital_shell_shares
from ehmo.report.document import bond_document
from ehmo.report.population_document import LISTED_POPULATION
from tests.analysis import plain_loops
from tests.geometries import SPECIES

NAMES = ["[VO(OH2)5]2+", "MnO4 -", "UO2 2+", "[FeO(OH2)5]2+"]


@pytest.fixture(scope="module", params=NAMES)
def report(request):
    return bond_report(SPECIES[request.param].fragment())


@pytest.fixture(scope="module")
def document(report):
    return bond_document(report)


def test_shells_add_up_to_the_atom(document):
    for atom in document["atoms"]:
        shells = atom["shells"]
        assert sum(shell["gross_population"] for shell in shells) == pytest.approx(atom["gross_population"])
        for shell in shells:
            assert sum(shell["functions"].values()) == pytest.approx(shell["gross_population"], abs=1e-5)
            assert shell["net_population"] <= atom["net_population"] + 1e-9 or len(shells) > 1


def test_functions_hold_what_plain_sums_say(report, document):
    P = plain_loops.density(report.state.coefficients, report.state.occupations.sum(axis=0))
    gross = plain_loops.gross(P, report.overlap)
    found = [n for atom in document["atoms"] for shell in atom["shells"] for n in shell["functions"].values()]
    np.testing.assert_allclose(found, gross, atol=1e-6)


def test_overlap_parts_add_up_to_the_bond(document):
    for bond in document["bonds"]:
        assert sum(bond["overlap_by_shells"].values()) == pytest.approx(bond["overlap_population"], abs=1e-5)
        short = LISTED_POPULATION * len(document["orbitals"])
        assert sum(bond["overlap_by_irrep"].values()) == pytest.approx(bond["overlap_population"], abs=0.03)
        by_orbital = sum(part["overlap_population"] for part in bond["overlap_by_orbital"])
        assert by_orbital == pytest.approx(bond["overlap_population"], abs=short)


def test_irreps_hold_all_electrons(document):
    total = sum(orbital["occupation"] for orbital in document["orbitals"])
    assert sum(part["electrons"] for part in document["populations_by_irrep"]) == pytest.approx(total)


def test_shells_of_each_orbital_by_plain_sums(report):
    C, S, basis = report.state.coefficients, report.overlap, report.basis
    shares = orbital_shell_shares(report.state, S, basis)
    for k in range(len(C)):
        gross = [sum(C[i, k] * C[j, k] * S[i, j] for j in range(len(C))) for i in range(len(C))]
        np.testing.assert_allclose(shares[:, k], np.bincount(basis.shell_of, weights=gross), atol=1e-10)


def test_nonbonding_t1_of_permanganate_has_nothing_on_the_metal():
    # Wolfsberg & Helmholz 1952 (memory): t1 is made of oxygen 2p pi alone.
    found = bond_document(bond_report(SPECIES["MnO4 -"].fragment()))
    t1 = next(part for part in found["populations_by_irrep"] if part["irrep"] == "t1")
    assert t1["electrons"] == pytest.approx(6)
    assert set(t1["shell_populations"]) == {f"O{k} 2p" for k in (2, 3, 4, 5)}
    assert "t1" not in found["bonds"][0]["overlap_by_irrep"]
