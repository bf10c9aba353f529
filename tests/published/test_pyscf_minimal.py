"""Mayer orders against PBE in a minimal basis: cross-check on typed-in values (see the head of the CSV file).

Two ways of counting. Every bond counts on its own; or bonds that symmetry makes equal count once, so that four equal
bonds of a tetraoxo ion do not outweigh the one bond of a mono-oxo ion.
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest
from scipy.stats import spearmanr

import ehmo
from ehmo.records.report import BondReport
from ehmo.studies.crosscheck.verdicts import MAYER_AGREES, MAYER_DOUBTFUL

HERE = Path(__file__).parent
TETRAOXO = {"VO4_3-", "CrO4_2-", "MnO4_-", "MoO4_2-", "WO4_2-", "ReO4_-", "OsO4"}


def reference_rows() -> list[dict[str, str]]:
    lines = [line for line in (HERE / "pyscf_minimal.csv").read_text("utf-8").splitlines() if not line.startswith("#")]
    return list(csv.DictReader(lines))


def reference_fragments() -> dict[str, ehmo.Fragment]:
    return {frame.title.split()[0]: frame for frame in ehmo.read_frames(HERE / "pyscf_minimal.xyz")}


ROWS = reference_rows()


def reports(model: str) -> dict[str, BondReport]:
    options = ehmo.Options(charge_model=model)
    return {name: ehmo.bond_report(fragment, options=options) for name, fragment in reference_fragments().items()}


@pytest.fixture(scope="module")
def computed() -> dict[str, dict[tuple[str, str], float]]:
    """Mayer orders by charge model, species and bond; rounded, so that equal bonds stay equal."""
    return {
        model: {
            (name, report.bond_label(bond)): round(orders.mayer, 6)
            for name, report in reports(model).items()
            for bond, orders in report.bonds()
        }
        for model in ("fixed", "self-consistent")
    }


class Sample:
    """Pairs of orders with the figures that are compared."""

    def __init__(self, computed: dict[tuple[str, str], float], rows: list[dict[str, str]]):
        self.ours = np.array([computed[row["species"], row["bond"]] for row in rows])
        self.theirs = np.array([float(row["mayer"]) for row in rows])
        self.difference = self.ours - self.theirs

    @property
    def rank_correlation(self) -> float:
        return float(spearmanr(self.ours, self.theirs)[0])

    @property
    def mean_difference(self) -> float:
        return float(np.abs(self.difference).mean())


def distinct(rows: list[dict[str, str]]) -> list[dict[str, str]]:
    """One row for each set of equal bonds."""
    sets = {(row["species"], row["bond"].split("-")[1][:1], row["mayer"]): row for row in rows}
    return list(sets.values())


def multiple(rows: list[dict[str, str]]) -> list[dict[str, str]]:
    return [row for row in rows if row["multiple"] == "yes"]


def test_typed_values_are_complete(computed):
    assert len({row["species"] for row in ROWS}) == 22
    assert len(ROWS) == 94
    for model in computed:
        assert set(computed[model]) == {(row["species"], row["bond"]) for row in ROWS}


@pytest.mark.parametrize(
    ("model", "rows", "correlation", "difference"),
    [
        ("self-consistent", ROWS, 0.94, 0.12),
        ("self-consistent", distinct(ROWS), 0.97, 0.12),
        ("self-consistent", multiple(ROWS), 0.65, 0.10),
        ("self-consistent", multiple(distinct(ROWS)), 0.86, 0.10),
        ("fixed", ROWS, 0.73, 0.37),
        ("fixed", distinct(ROWS), 0.79, 0.44),
        ("fixed", multiple(ROWS), 0.40, 0.57),
        ("fixed", multiple(distinct(ROWS)), 0.57, 0.65),
    ],
    ids=[
        f"{model}, {which}"
        for model in ("self-consistent", "fixed")
        for which in ("all", "all distinct", "multiple", "multiple distinct")
    ],
)
def test_orders_follow_those_of_the_minimal_basis(computed, model, rows, correlation, difference):
    sample = Sample(computed[model], rows)
    assert sample.rank_correlation >= correlation
    assert sample.mean_difference <= difference


def test_self_consistent_charges_are_what_makes_the_orders_comparable(computed):
    fixed, free = (Sample(computed[model], multiple(ROWS)) for model in ("fixed", "self-consistent"))
    assert fixed.mean_difference > 4 * free.mean_difference
    assert fixed.difference.mean() < -0.4
    assert abs(free.difference.mean()) < 0.05


def test_limits_of_the_verdicts_are_those_of_the_reference(computed):
    size = np.abs(Sample(computed["self-consistent"], ROWS).difference)
    assert pytest.approx(2 * size.mean(), abs=0.03) == MAYER_AGREES
    assert (size <= MAYER_AGREES).mean() == pytest.approx(0.90, abs=0.01)  # as README says
    assert size.max() < 0.6 * MAYER_DOUBTFUL


def test_tetraoxo_ions_are_ranked_the_wrong_way_round(computed):
    # Known fault, listed in README: within this family the orders go with the field the other way.
    rows = [row for row in multiple(distinct(ROWS)) if row["species"] in TETRAOXO]
    others = [row for row in multiple(distinct(ROWS)) if row["species"] not in TETRAOXO]
    assert len(rows) == 7
    assert Sample(computed["self-consistent"], rows).rank_correlation < 0
    assert Sample(computed["self-consistent"], others).rank_correlation > 0.6
