"""``ehmo crosscheck`` as people type it. One run in restricted Hartree-Fock, the quickest theory, serves all."""

from __future__ import annotations

import json
import os
from pathlib import Path

import pytest

from ehmo.report.cautions import CAUTIONS

CHROMATE = """5
CrO4 2- charge=-2 unpaired=0
Cr 0 0 0
O 0.9486 0.9486 0.9486
O -0.9486 -0.9486 0.9486
O -0.9486 0.9486 -0.9486
O 0.9486 -0.9486 -0.9486
"""
"""Chromate, Cr-O 1.643 (McGinnety, Acta Cryst. B28, 2845 (1972), K2CrO4; read)."""

README = Path(__file__).parents[2] / "README.md"


@pytest.fixture(scope="session")
def cache(tmp_path_factory):
    """Cache of the runs, shared by the processes of one test run."""
    base = tmp_path_factory.getbasetemp()
    return (base.parent if "PYTEST_XDIST_WORKER" in os.environ else base) / "crosscheck-runs"


@pytest.fixture
def crosscheck(ehmo, put, cache):
    put(CHROMATE)
    return lambda *words: ehmo("crosscheck", "a.xyz", "--theory", "hf", "--cache", cache, *words)


def test_text_sets_both_sides_beside_each_other(crosscheck):
    ran = crosscheck()
    assert ran.status == 0, ran.err
    for words in ("Cr1-O2: ", "Mayer ehmo", "HF", "PySCF", "Ladder of Cr1", "Frontier orbitals", "t1", "a.xyz"):
        assert words in ran.out
    assert all(" ".join(caution.split()) in " ".join(ran.out.split()) for caution in CAUTIONS)
    # Progress goes to the error stream only.
    assert ran.err.startswith("ehmo: ")
    assert max(map(len, ran.out.splitlines())) <= 125


def test_hartree_fock_that_would_unpair_is_doubted_in_every_verdict(crosscheck):
    # RHF of most d0 oxo ions is unstable against unpairing; PBE is not.
    document = json.loads(crosscheck("--json", "-").out)
    assert document["run"]["doubts"]
    assert {bond["verdict"] for bond in document["bonds"]} == {"doubtful"}


def test_second_run_comes_from_the_cache(crosscheck):
    first, second = crosscheck("--json", "-"), crosscheck("--json", "-")
    assert json.loads(second.out)["run"]["from_cache"] is True
    assert "cache" in second.err
    assert json.loads(first.out)["bonds"] == json.loads(second.out)["bonds"]


def test_json_in_a_file_comes_beside_the_text(crosscheck, tmp_path):
    crosscheck()
    plain, ran = crosscheck(), crosscheck("--json", "found.json")
    assert ran.out == plain.out
    written = (tmp_path / "found.json").read_text(encoding="utf-8")
    assert json.loads(written) == json.loads(crosscheck("--json", "-").out)


def test_options_of_the_calculation_reach_the_report_and_not_the_run(crosscheck):
    plain = json.loads(crosscheck("--json", "-").out)
    fixed = json.loads(crosscheck("--json", "-", "--charges", "fixed").out)
    for ours, theirs in zip(plain["bonds"], fixed["bonds"], strict=True):
        assert ours["numbers"]["reference"] == theirs["numbers"]["reference"]
        assert ours["numbers"]["ehmo"]["mayer"] > theirs["numbers"]["ehmo"]["mayer"] + 0.2


def test_json_fields_are_those_in_readme(crosscheck):
    document = json.loads(crosscheck("--json", "-").out)
    described = set()
    for line in README.read_text("utf-8").split("### JSON of the cross-check")[1].split("\n## ")[0].splitlines():
        described |= set(line.split("`")[1::2])
    assert _keys(document) == described - {"ehmo crosscheck 1", "crosschecks"}


def _keys(value) -> set[str]:
    if isinstance(value, list):
        return set().union(*(_keys(item) for item in value))
    if not isinstance(value, dict):
        return set()
    return set(value).union(*(_keys(item) for item in value.values()))


def test_time_limit_is_one_line_and_leaves_nothing(refused, put, tmp_path):
    # The progress line comes first if the process gets that far, which it does not within a millisecond.
    put(CHROMATE)
    line = refused("crosscheck", "a.xyz", "--timeout", "0.001", "--cache", "off", "--json", "found.json")
    assert "--timeout" in line
    assert line.startswith("ehmo: a.xyz: ")


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("--timeout", "0"), "positive number of seconds"),
        (("--timeout", "nan"), "positive number of seconds"),
        (("--timeout", "soon"), "invalid float value"),
        (("--theory", "magic"), "invalid choice"),
        (("--cache", ""), "--cache needs a folder"),
        (("--json", ""), "--json needs a path"),
        (("--unpaired", "1"), "electron"),
    ],
)
def test_options_that_cannot_be_used_are_refused(words, said, refused, put):
    put(CHROMATE)
    assert said in refused("crosscheck", "a.xyz", *words)


def test_cache_that_is_a_file_is_refused(refused, put):
    put(CHROMATE)
    put("", "taken")
    assert "cache folder" in refused("crosscheck", "a.xyz", "--cache", "taken")
