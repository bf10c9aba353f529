"""``ehmo ladder``: sections, observed bands, options and refusals."""

from __future__ import annotations

import json

import pytest

from tests.geometries import SPECIES

VANADYL = "[VO(OH2)5]2+"


@pytest.fixture
def vanadyl(put) -> str:
    """Aqua vanadyl in a file."""
    species = SPECIES[VANADYL]
    rows = [f"{s} {x:.6f} {y:.6f} {z:.6f}" for s, (x, y, z) in zip(species.symbols, species.positions_A, strict=True)]
    put("\n".join((str(len(rows)), "charge=2 unpaired=1", *rows)) + "\n")
    return "a.xyz"


def test_sections_in_full(ehmo, vanadyl):
    ran = ehmo("ladder", vanadyl)
    assert (ran.status, ran.err) == (0, "")
    for words in (
        "Ladder of V1",
        "Crystal field/cm-1",
        "Angular overlap/cm-1",
        "Ground term 2B2 in C4v",
        "Bands",
        "Magnetism",
    ):
        assert words in ran.out
    assert max(map(len, ran.out.splitlines())) <= 125


def test_observed_bands_are_assigned_and_fitted(ehmo, vanadyl):
    ran = ehmo("ladder", vanadyl, "--bands", "13000,16000")
    assert ran.status == 0
    table = ran.out.split("Observed bands")[1]
    rows = [line.split() for line in table.splitlines() if line.split()[:1] in (["13000"], ["16000"])]
    assert [row[1] for row in rows] == ["2E", "2B1"]
    for row in rows:
        assert float(row[3]) == pytest.approx(float(row[0]), abs=20)


def test_json_is_that_of_the_bond_report_with_the_fit(ehmo, vanadyl):
    with_fit = json.loads(ehmo("ladder", vanadyl, "--bands", "13000", "--json", "-").out)
    plain = json.loads(ehmo("bond", vanadyl, "--json", "-").out)
    assert set(with_fit) == set(plain)
    assert with_fit["band_fit"]["assignments"][0]["upper_term"] == "2E"
    assert plain["band_fit"] is None
    assert plain["ground_term"] == "2B2"
    assert plain["bonds"][0]["formal_order"] == 3.0
    assert [orbital["irrep"] for orbital in plain["orbitals"]].count("b2") >= 1


def test_racah_b_moves_the_terms(ehmo, put):
    species = SPECIES["[Ni(OH2)6]2+"]
    rows = [f"{s} {x:.6f} {y:.6f} {z:.6f}" for s, (x, y, z) in zip(species.symbols, species.positions_A, strict=True)]
    put("\n".join((str(len(rows)), "charge=2 unpaired=2", *rows)) + "\n")

    def bands(*words: str) -> list[float]:
        found = json.loads(ehmo("ladder", "a.xyz", "--json", "-", *words).out)["bands"]
        return [b["wavenumber_per_cm"] for b in found if b["kind"] == "d-d" and b["spin_allowed"]]

    free, given = bands(), bands("--racah-b", "1000")
    # 3A2g -> 3T2g is 10 Dq whatever B; 3T1g(P) rises with it (Tanabe & Sugano 1954, memory).
    assert given[0] == pytest.approx(free[0], abs=1)
    assert given[2] > free[2] + 1000


@pytest.mark.parametrize("bands", ["blue", "13000;x", "-5", "nan", "1e4,2e4,3e4,4e4"])
def test_bands_that_cannot_be_used_are_said_to_be_so(ehmo, vanadyl, bands):
    ran = ehmo("ladder", vanadyl, "--bands", bands)
    if ran.status == 2:
        assert len(ran.err.splitlines()) == 1
        assert "13000,16000" in ran.err
    else:
        assert "fit to the observed bands" in ran.out
        assert "Ground term" in ran.out


def test_oxidation_state_option(ehmo, vanadyl):
    found = json.loads(ehmo("bond", vanadyl, "--oxidation-state", "5", "--json", "-").out)
    assert (found["oxidation_state"], found["d_count"]) == (5, 0)


def test_bands_may_name_their_terms(ehmo, vanadyl):
    found = json.loads(ehmo("ladder", vanadyl, "--bands", "2B1:16000, 2E:13000", "--json", "-").out)["band_fit"]
    assert [item["upper_term"] for item in found["assignments"]] == ["2E", "2B1"]
    # With the fitted field g_par falls and g_perp rises towards 1.933 and 1.978 (Ballhausen & Gray 1962, memory).
    assert max(found["fitted_g_tensor"]["values"]) == pytest.approx(1.978, abs=0.01)
    assert min(found["fitted_g_tensor"]["values"]) == pytest.approx(1.933, abs=0.03)
