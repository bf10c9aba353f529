"""Orbitals of a fragment out of metal and ligand levels."""

from functools import cache

import numpy as np
import pytest

from ehmo import Fragment, Options, bond_report
from ehmo.analysis.interaction import bond_interaction, orbital_overlap_by_part
from tests.geometries import SPECIES

MOLECULES = ("VOCl3", "MnO4 -", "[VO(OH2)5]2+", "[UO2(OH2)5]2+", "CrO2Cl2", "V(NC6H5)Cl3")


@cache
def interaction(name):
    report = bond_report(SPECIES[name].fragment())
    return report, bond_interaction(report, 0)


@pytest.mark.parametrize("name", MOLECULES)
def test_shares_and_electrons_add_up(name):
    """Law: shares of the part levels are those of the part; electrons and orbitals are all there, once."""
    report, found = interaction(name)
    assert sorted(k for s in found.sets for k in s.orbitals) == list(range(len(report.state.energies_eV)))
    np.testing.assert_allclose(found.metal_contributions.sum(axis=1), [s.metal_share for s in found.sets], atol=1e-9)
    np.testing.assert_allclose(found.ligand_contributions.sum(axis=1), [s.ligand_share for s in found.sets], atol=1e-9)
    electrons = sum(s.alpha + s.beta for s in found.sets)
    assert electrons == pytest.approx(report.state.occupations.sum())
    assert sum(level.degeneracy for level in found.metal_levels) == len(
        range(*report.basis.functions_of(found.metal).indices(len(report.basis)))
    )


@pytest.mark.parametrize("name", MOLECULES)
def test_parts_add_up_to_the_overlap_population(name):
    """Law: |m| about the bond is diagonal in the overlap of two atoms."""
    report, found = interaction(name)
    whole = sum(report.orders[k].orbital_overlap for k in found.bonds)
    np.testing.assert_allclose(orbital_overlap_by_part(report, found.bonds).sum(axis=0), whole, atol=1e-10)


def test_levels_of_the_parts_are_diagonal_elements():
    """Law: with fixed charges a shell of the metal, and a lone donor atom, keep the energies of the parameter set."""
    report = bond_report(SPECIES["VOCl3"].fragment(), options=Options(charge_model="fixed"))
    found = bond_interaction(report, 0)
    h_ii = {
        (report.basis.symbols[a], report.basis.shell_label(s)): report.basis.type_h_ii_eV[report.basis.shell_type[s]]
        for s, a in enumerate(report.basis.shell_atom)
    }
    for level in found.metal_levels:
        assert level.energy_eV == pytest.approx(h_ii["V", level.label], abs=1e-9)
    for level in found.ligand_levels:
        assert level.energy_eV == pytest.approx(h_ii["O", level.label], abs=2e-3)
    assert [(level.label, level.symmetry, level.degeneracy) for level in found.ligand_levels] == [
        ("2s", "sigma", 1),
        ("2p", "sigma", 1),
        ("2p", "pi", 2),
    ]


def test_permanganate():
    """Published: 1t1, nonbonding oxygen, is the highest filled level and 2e the lowest empty one, of d and pi*
    (Wolfsberg, Helmholz 1952; memory).

    Law: d spans e + t2, four sigma functions a1 + t2, eight pi functions e + t1 + t2.
    """
    _, found = interaction("MnO4 -")
    assert len(found.bonds) == 4
    filled = [s for s in found.sets if s.alpha > 0]
    empty = [s for s in found.sets if s.alpha == 0]
    assert (filled[-1].label, filled[-1].part, len(filled[-1].orbitals)) == ("1t1", "", 3)
    assert (empty[0].label, empty[0].part, len(empty[0].orbitals)) == ("2e", "pi*", 2)
    by_shell = {level.label: level for level in found.metal_levels}
    assert by_shell["3d"].irreps == ("e", "t2")
    assert [level.irreps for level in found.ligand_levels if level.label == "2s"] == [("a1",), ("t2",)]
    of_p = sorted(irrep for level in found.ligand_levels if level.label == "2p" for irrep in level.irreps)
    assert of_p == ["a1", "e", "t1", "t2", "t2"]


def test_vanadyl():
    """Published: one electron in b2, nonbonding to the oxo; above it e pi*, then b1 and a1 (Ballhausen, Gray 1962;
    memory)."""
    report, found = interaction("[VO(OH2)5]2+")
    one = next(s for s in found.sets if s.alpha != s.beta)
    assert (one.irrep, one.alpha, one.beta, one.part) == ("b2", 1.0, 0.0, "")
    above = [s for s in found.sets if s.alpha == 0 and s.metal_share > 0.5][:3]
    assert [(s.irrep, s.part) for s in above] == [("e", "pi*"), ("b1", ""), ("a1", "sigma*")]
    assert [report.bond_label(report.coordination.bonds[k]) for k in found.bonds] == ["V1-O2"]


def test_several_metals_have_the_irreps_of_the_whole():
    species = SPECIES["VOCl3"]
    twice = Fragment(
        species.symbols * 2, np.concatenate([species.positions_A, species.positions_A + np.array([0, 30.0, 0])]), 0, 0
    )
    report = bond_report(twice)
    found = bond_interaction(report, 0)
    assert {s.irrep for s in found.sets} == set(report.molecule_irreps.labels) == {"a'", "a''"}
    assert found.sets[0].label == "1a'"
    assert {irreps for level in (*found.metal_levels, *found.ligand_levels) for irreps in level.irreps} == set()
