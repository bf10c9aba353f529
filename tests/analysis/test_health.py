"""Numerical health: what it finds, and that the published cure of counter-intuitive mixing cures it."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

import ehmo
from basis_params import load_set
from ehmo.calculate.health import health_warnings
from ehmo.records.health import Health
from tests.geometries import SPECIES

STANDARD = load_set("standard")
UNWEIGHTED = ehmo.Options(charge_model="fixed", weighting=False)
WEIGHTED = ehmo.Options(charge_model="fixed", weighting=True)


def diffuse_4p(zeta: float):
    """The standard set with a diffuse 4p shell on vanadium."""
    vanadium = STANDARD.element("V")
    shells = tuple(replace(shell, zetas=(zeta,)) if shell.label == "4p" else shell for shell in vanadium.shells)
    return replace(STANDARD, elements={**STANDARD.elements, "V": replace(vanadium, shells=shells)})


def test_diffuse_metal_p_without_weighting_mixes_counter_intuitively():
    # Ammeter, Bürgi, Thibeault, Hoffmann, J. Am. Chem. Soc. 100, 3686 (1978) (memory): negative populations of
    # diffuse metal functions without weighting, cured by it.
    fragment, table = SPECIES["[VO(OH2)5]2+"].fragment(), diffuse_4p(0.8)
    ill, cured = (ehmo.bond_report(fragment, table, options) for options in (UNWEIGHTED, WEIGHTED))
    (shell,) = ill.health.impossible_populations
    assert (shell.atom, shell.shell) == (0, "4p")
    assert shell.population < -0.1
    assert cured.health.impossible_populations == ()
    assert any("4p shell of V1" in warning for warning in ill.warnings)
    assert not any("counter-intuitive" in warning for warning in cured.warnings)


def test_populations_of_health_are_those_of_plain_sums():
    report = ehmo.bond_report(SPECIES["[VO(OH2)5]2+"].fragment(), diffuse_4p(0.8), UNWEIGHTED)
    basis, overlap, state = report.basis, report.overlap, report.state
    density = (state.coefficients * state.occupations.sum(axis=0)) @ state.coefficients.T
    products = density * overlap
    own = [i for i in range(len(basis)) if basis.function_label(i).startswith("4p") and basis.atom_of[i] == 0]
    assert report.health.impossible_populations[0].population == pytest.approx(products[own].sum(), abs=1e-10)
    assert report.health.antibonding_shells
    for item in report.health.antibonding_shells:
        bond = report.coordination.bonds[item.bond]
        donor = np.flatnonzero(basis.atom_of == bond.donor)
        assert item.shell == "4p"
        assert item.overlap_population == pytest.approx(2 * products[np.ix_(own, donor)].sum(), abs=1e-10)


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "MnO4 -", "[UO2(OH2)5]2+", "Cr(CO)6"])
def test_usual_calculations_are_healthy(name):
    report = ehmo.bond_report(SPECIES[name].fragment())
    health = report.health
    assert health.impossible_populations == ()
    assert health.negative_bonds == ()
    assert health_warnings(report.fragment, report.coordination, health) == ()
    assert health.smallest_overlap_eigenvalue == pytest.approx(np.linalg.eigvalsh(report.overlap)[0])
    assert health.charge_residual < 1e-8
    energies, filled = report.state.energies_eV, report.state.occupations.sum(axis=0) > 0
    assert health.frontier_gap_eV == pytest.approx(energies[~filled].min() - energies[filled].max())


def test_shared_electrons_are_nearly_degenerate():
    assert ehmo.bond_report(SPECIES["[Ti(OH2)6]3+"].fragment()).health.nearly_degenerate
    assert not ehmo.bond_report(SPECIES["VOCl3"].fragment()).health.nearly_degenerate


def test_every_ill_sign_has_its_sentence():
    report = ehmo.bond_report(SPECIES["VOCl3"].fragment())
    ill = Health(1e-4, 60, 0.0, (), (1,), (), -0.2, 3.0, False, False)
    said = health_warnings(report.fragment, report.coordination, ill)
    assert len(said) == 4
    for words in ("1.0e-04", "-20 %", report.bond_label(report.coordination.bonds[1]), "60 iterations"):
        assert any(words in sentence for sentence in said)
