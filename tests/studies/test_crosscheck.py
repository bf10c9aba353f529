"""The cross-check against a direct PySCF script, and what it makes of the comparison.

A density-functional run of vanadate takes ten seconds; it is made once for all tests. ``EHMO_SLOW_TESTS=1`` adds all
species of ``tests/published/pyscf_minimal.xyz`` (about fifteen minutes).
"""

from __future__ import annotations

import os
from dataclasses import replace
from functools import cache
from pathlib import Path

import numpy as np
import pytest

import ehmo
from ehmo.harmonics import real_harmonics
from ehmo.records.bonding import BondChannel
from ehmo.records.crosscheck import AtomNumbers, BondNumbers, Crosscheck, LadderComparison, LadderStep
from ehmo.report.crosscheck_text import crosscheck_text
from ehmo.studies.crosscheck import crosscheck
from ehmo.studies.crosscheck.recipe import minimal_contraction
from ehmo.studies.crosscheck.verdicts import swapped_levels, verdict
from tests.geometries import SPECIES
from tests.published.test_pyscf_minimal import ROWS, reference_fragments
from tests.studies.direct_pyscf import CONTRACTION, Direct, direct_run

REFERENCE = reference_fragments()
SLOW = pytest.mark.skipif(not os.environ.get("EHMO_SLOW_TESTS"), reason="fifteen minutes; set EHMO_SLOW_TESTS=1")
CASES = [
    ("VO4_3-", "pbe"),
    ("VO4_3-", "hf"),
    ("VO", "pbe"),
    ("VO", "hf"),
    ("VO", "b3lyp"),
    pytest.param("VO4_3-", "b3lyp", marks=SLOW),
    pytest.param("MnO4 3-", "pbe", marks=SLOW),
    *(pytest.param(name, "pbe", marks=SLOW) for name in REFERENCE if name != "VO4_3-"),
]


VO = ehmo.Fragment(("V", "O"), [[0, 0, 0], [0, 0, 1.589]], 0, 3)
"""Gas, quartet, V-O 1.589 (Huber, Herzberg 1979; memory): the smallest open shell with a metal-oxo bond."""


def fragment_of(name: str) -> ehmo.Fragment:
    if name == "VO":
        return VO
    return REFERENCE[name] if name in REFERENCE else SPECIES[name].fragment()


@pytest.fixture(scope="session")
def folder(tmp_path_factory) -> Path:
    """Cache of the runs, shared by the processes of one test run."""
    base = tmp_path_factory.getbasetemp()
    return (base.parent if "PYTEST_XDIST_WORKER" in os.environ else base) / "crosscheck-runs"


@pytest.fixture(scope="session")
def compared(folder):
    @cache
    def compare(name: str, theory: str = "pbe") -> Crosscheck:
        return crosscheck(ehmo.bond_report(fragment_of(name)), theory, cache=folder)

    return compare


def direct(found: Crosscheck) -> Direct:
    pairs = [(one.bond.metal, one.bond.donor) for one in found.bonds]
    fragment = found.report.fragment
    return direct_run(fragment, pairs, found.run.theory, follow=bool(fragment.unpaired_electrons))


@pytest.mark.parametrize(("name", "theory"), CASES)
def test_figures_equal_a_direct_script(name, theory, compared):
    found = compared(name, theory)
    wanted = direct(found)
    assert found.run.energy_hartree == pytest.approx(wanted.energy, abs=1e-7)
    assert [theirs.charge for _, theirs in found.atoms] == pytest.approx(wanted.charges, abs=1e-6)
    assert [theirs.spin for _, theirs in found.atoms] == pytest.approx(wanted.spins, abs=1e-6)
    for comparison in found.bonds:
        pair = comparison.bond.metal, comparison.bond.donor
        numbers = comparison.reference
        assert numbers.mayer == pytest.approx(wanted.mayer[pair], abs=1e-6)
        assert numbers.wiberg == pytest.approx(wanted.wiberg[pair], abs=1e-6)
        assert numbers.overlap_population == pytest.approx(wanted.overlap_population[pair], abs=1e-6)
        if wanted.orbital_energies_eV is not None and not found.report.fragment.unpaired_electrons:
            # A closed shell: the weights are squared singular values, and the orbitals are PySCF's own.
            weights = [channel.weight for channel in numbers.channels]
            squares = wanted.squared_singular_values[pair]
            assert weights[0] == pytest.approx(squares[0], abs=1e-6)
            assert sum(weights) == pytest.approx(squares.sum(), abs=5e-3)  # traces are not listed
            assert found.run.energies_eV == pytest.approx(
                wanted.orbital_energies_eV, abs=2e-4
            )  # PySCF keeps those of the last cycle but one


@pytest.mark.parametrize("name", [pytest.param(name, marks=() if name == "VO4_3-" else SLOW) for name in REFERENCE])
def test_figures_are_those_typed_in(name, compared):
    # Density fitting and a coarser grid against exact integrals: 7e-4 at most, and the values have three decimals.
    rows = [row for row in ROWS if row["species"] == name]
    whole = compared(name)
    found = {whole.report.bond_label(one.bond): one.reference for one in whole.bonds}
    for row in rows:
        numbers = found[row["bond"]]
        assert numbers.mayer == pytest.approx(float(row["mayer"]), abs=1.5e-3)
        for key in ("wiberg", "overlap_population"):
            if row[key]:
                assert getattr(numbers, key) == pytest.approx(float(row[key]), abs=1.5e-3)


def test_irreps_of_the_run_are_those_of_the_textbook(compared):
    # Td d0: HOMO t1 below e* and t2* (Ballhausen, Gray 1965, memory); the ladder is e below t2.
    found = compared("VO4_3-")
    highest = next(level for level in reversed(found.frontier.reference) if level.electrons > 0.1)
    assert (highest.irrep, highest.degeneracy, round(highest.electrons, 6)) == ("t1", 3, 6.0)
    assert highest.irrep_share > 0.999
    (ladder,) = found.ladders
    assert [step.label for step in ladder.reference] == ["e", "e", "t2", "t2", "t2"]
    assert [step.label for step in ladder.ours] == ["e", "e", "t2", "t2", "t2"]
    assert ladder.swapped == ()
    assert sum(step.electrons for step in ladder.reference) == pytest.approx(0, abs=1e-6)


def test_ladder_of_an_open_shell_holds_its_electrons(compared):
    # 4 Sigma-: one sigma and two delta electrons (Merer 1989, memory).
    found = compared("VO")
    (ladder,) = found.ladders
    held = {step.label: 0.0 for step in ladder.reference}
    for step in ladder.reference:
        held[step.label] += step.electrons
    assert held["δ"] == pytest.approx(2, abs=0.05)
    assert held["π"] == pytest.approx(0, abs=0.05)
    assert found.run.spin_squared == pytest.approx(3.75, abs=0.1)
    assert sum(theirs.spin for _, theirs in found.atoms) == pytest.approx(3)
    assert "unpaired/e ehmo" in crosscheck_text(found)


def test_every_bond_has_a_verdict_with_reasons(compared):
    found = compared("VO4_3-")
    assert len(found.bonds) == 4
    for comparison in found.bonds:
        assert comparison.verdict.kind == "agrees"
        assert any("Mayer" in reason for reason in comparison.verdict.reasons)
        assert comparison.verdict.mayer_difference == comparison.ours.mayer - comparison.reference.mayer
    text = crosscheck_text(found)
    flat = " ".join(text.split())
    for words in ("V1-O2: agrees", "PBE", "t1", "internally stable", "Ladder of V1"):
        assert words in flat
    assert max(map(len, text.splitlines())) <= 125


def test_contractions_are_those_of_the_direct_script():
    for symbol, contraction in CONTRACTION.items():
        assert minimal_contraction(symbol) == contraction


@pytest.mark.parametrize("symbol", ["K", "Fe", "Sr", "Ru", "Ba", "Lu", "Ra", "Cm"])
def test_contractions_hold_every_shell_that_the_atom_fills(symbol):
    # Shells of the ground configuration by Madelung's rule, and the metal's outer p shell.
    from pyscf import gto
    from pyscf.data.elements import CONFIGURATION, charge

    counts = {"spdf".index(part[1]): int(part[0]) for part in _parts(minimal_contraction(symbol))}
    filled = CONFIGURATION[charge(symbol)]
    for l, electrons in enumerate(filled):
        assert counts.get(l, 0) * (4 * l + 2) >= electrons
    assert len(gto.basis.load(f"ano@{minimal_contraction(symbol)}", symbol)) == len(counts)


def _parts(contraction: str) -> list[str]:
    return [contraction[k : k + 2] for k in range(0, len(contraction), 2)]


def test_functions_stand_in_the_order_of_the_program():
    from pyscf import gto

    from ehmo.studies.crosscheck.recipe import _functions

    atom = gto.M(atom="U 0 0 0", basis={"U": "ano@7s6p4d2f"}, verbose=0)
    shells, order = _functions(atom)
    directions = np.random.default_rng(7).normal(size=(20, 3))
    directions /= np.linalg.norm(directions, axis=1)[:, None]
    values = atom.eval_gto("GTOval_sph", 1.3 * directions)[:, order]
    start = 0
    for _, _, l in shells:
        width = 2 * int(l) + 1
        angular = real_harmonics(directions, int(l))[:, -width:]
        block = values[:, start : start + width]
        radial = (block * angular).sum() / (angular**2).sum()
        assert block == pytest.approx(radial * angular, abs=1e-10)
        start += width
    assert [int(n) for _, n, l in shells if l == 3] == [4, 5]


# Verdicts on made-up figures: invented, to reach every branch.


def numbers(mayer: float, sigma: float = 0.9, pi: float = 1.3) -> BondNumbers:
    none = np.zeros(0)
    channels = (BondChannel("sigma", sigma, none, none, none), BondChannel("pi", pi, none, none, none))
    return BondNumbers(0.9, mayer, sigma + pi, channels)


EMPTY = LadderComparison(0, "3d", (), (), (), ())
NO_SPIN = (AtomNumbers(1.0, 0.0), AtomNumbers(1.0, 0.0))


@pytest.fixture
def run(compared):
    return compared("VO4_3-").run


@pytest.mark.parametrize(
    ("ours", "kind", "words"),
    [(2.2, "agrees", "agrees"), (2.3, "higher", "ehmo higher by 0.30"), (1.7, "lower", "ehmo lower by 0.30")],
)
def test_verdict_goes_by_the_difference_of_mayer_orders(run, ours, kind, words):
    found = verdict(numbers(ours), numbers(2.0), run, NO_SPIN, 0, EMPTY)
    assert (found.kind, found.words) == (kind, words)


@pytest.mark.parametrize(
    ("changes", "metal", "unpaired", "because"),
    [
        ({}, NO_SPIN, 0, "differ by 0.70"),
        ({"doubts": ("the closed shell is unstable",)}, NO_SPIN, 0, "unstable"),
        ({"spin_squared": 1.4}, NO_SPIN, 1, "contaminated"),
        ({}, (AtomNumbers(1.0, 1.0), AtomNumbers(1.0, 1.8)), 1, "1.00 unpaired electrons against 1.80"),
    ],
)
def test_verdict_doubts_a_comparison_that_is_not_to_be_trusted(run, changes, metal, unpaired, because):
    ours = 2.7 if "0.70" in because else 2.0
    run = replace(run, spin_squared=unpaired / 2 * (unpaired / 2 + 1))
    found = verdict(numbers(ours), numbers(2.0), replace(run, **changes), metal, unpaired, EMPTY)
    assert found.kind == "doubtful"
    assert found.words.startswith("doubtful because ")
    assert because in found.words


def steps(*levels: tuple[str, float, float]) -> tuple[LadderStep, ...]:
    return tuple(LadderStep(label, energy, electrons, 0.7) for label, energy, electrons in levels)


def test_other_configuration_is_doubted_and_even_sharing_is_not(run):
    mine = steps(("b2", 0.0, 1.0), ("e", 1.0, 0.0), ("e", 1.0, 0.0))
    other = steps(("e", 0.0, 1.0), ("e", 0.0, 0.0), ("b2", 1.0, 0.0))
    found = verdict(numbers(2.0), numbers(2.0), run, NO_SPIN, 0, LadderComparison(0, "3d", mine, other, (), ()))
    assert found.words == "doubtful because the 3d levels are filled differently: b2 1.0 against e 1.0"
    shared = steps(("δu", 0.0, 0.5), ("δu", 0.0, 0.5), ("φu", 0.0, 0.5), ("φu", 0.0, 0.5))
    whole = steps(("δu", 0.0, 1.0), ("δu", 0.0, 1.0), ("φu", 0.1, 0.0), ("φu", 0.1, 0.0))
    found = verdict(numbers(2.0), numbers(2.0), run, NO_SPIN, 0, LadderComparison(0, "5f", shared, whole, (), ()))
    assert found.kind == "agrees"


def test_levels_are_swapped_only_where_both_sides_are_clear():
    mine = steps(("b2", 0.0, 0), ("e", 1.0, 0), ("e", 1.1, 0), ("a1", 2.0, 0), ("b1", 4.0, 0))
    clear = steps(("b2", 0.0, 0), ("e", 1.0, 0), ("e", 1.1, 0), ("b1", 2.0, 0), ("a1", 2.5, 0))
    near = steps(("b2", 0.0, 0), ("b1", 1.0, 0), ("e", 1.0, 0), ("e", 1.1, 0), ("a1", 1.2, 0))
    assert swapped_levels(mine, clear, {"e": 2}) == (("a1", "b1"),)
    assert swapped_levels(mine, near, {"e": 2}) == ()
