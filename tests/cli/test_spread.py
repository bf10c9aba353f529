"""The option --spread of bond, ladder and demo."""

from __future__ import annotations

import json
import statistics

import pytest

from ehmo.cli.bond import USUAL_DRAWS
from ehmo.studies.spread import DRAWS


def test_off_by_default(ehmo, put):
    put()
    ran = ehmo("bond", "a.xyz", "--json", "-")
    document = json.loads(ran.out)
    assert document["spread"] is None
    assert {item["spread"] for key in ("atoms", "bonds", "orbitals", "bands") for item in document[key]} == {None}
    assert "±" not in ehmo("bond", "a.xyz").out


def test_json_carries_a_deviation_of_every_number(ehmo, put):
    put()
    document = json.loads(ehmo("bond", "a.xyz", "--spread", "5", "--json", "-").out)
    summary = document["spread"]
    assert (summary["draws"], summary["used"]) == (5, 5)
    assert [p["name"] for p in summary["parameters"]][-2:] == ["K", "lambda"]
    assert all(p["stated"] for p in summary["parameters"])
    for bond in document["bonds"]:
        own = bond["spread"]
        assert min(own["overlap_population"], own["mayer"], own["wiberg"]) > 0
        assert [c["type"] for c in own["channels"]] == [c["type"] for c in bond["channels"]]
        assert {e["parameter"] for e in own["sensitivity"]} == {p["name"] for p in summary["parameters"]}
    assert all(atom["spread"]["mulliken_charge"] > 0 for atom in document["atoms"])
    assert all(orbital["spread"]["energy_eV"] > 0 for orbital in document["orbitals"])
    levels = document["ladder"][0]["levels"]
    assert levels[0]["spread"]["above_lowest_per_cm"] == 0
    assert levels[-1]["spread"]["above_lowest_per_cm"] > 0
    assert all(band["spread"]["wavenumber_per_cm"] > 0 for band in document["bands"])


def test_text_shows_deviations_draws_and_what_moves_the_orders(ehmo, put):
    put()
    text = ehmo("bond", "a.xyz", "--spread", "5").out
    document = json.loads(ehmo("bond", "a.xyz", "--spread", "5", "--json", "-").out)
    bond = document["bonds"][0]
    row = next(line for line in text.splitlines() if line.split()[:2] == ["V1-O2", "oxo"])
    assert f"{bond['mayer']:.2f} ± {bond['spread']['mayer']:.2f}" in row
    assert "5 of 5 draws" in text
    largest = bond["spread"]["sensitivity"][0]
    assert f"{largest['parameter']} {largest['mayer_per_sd']:+.2f}" in text
    assert max(map(len, text.splitlines())) <= 125


def test_ladder_shows_deviations_of_levels_and_bands(ehmo, put):
    put()
    document = json.loads(ehmo("bond", "a.xyz", "--spread", "5", "--json", "-").out)
    text = ehmo("ladder", "a.xyz", "--spread", "5").out
    level, band = document["ladder"][0]["levels"][-1], document["bands"][0]
    assert f"{level['above_lowest_per_cm']:.0f} ± {level['spread']['above_lowest_per_cm']:.0f}" in text
    assert f"{band['wavenumber_per_cm']:.0f} ± {band['spread']['wavenumber_per_cm']:.0f}" in text
    assert "5 of 5 draws" in text


def test_number_of_draws_may_be_left_out(ehmo, put):
    put()
    assert USUAL_DRAWS == DRAWS
    ran = ehmo("bond", "a.xyz", "--spread", "--json", "-", "--charges", "fixed")
    assert json.loads(ran.out)["spread"]["draws"] == DRAWS


def test_more_draws_change_the_deviation_little(ehmo, put):
    # The standard deviation of 64 draws is good to 1 in sqrt(128), a tenth (closed formula for normal numbers).
    put()
    found = [
        json.loads(ehmo("bond", "a.xyz", "--spread", n, "--json", "-", "--charges", "fixed").out)["bonds"][0]
        for n in ("64", "400")
    ]
    deviations = [bond["spread"]["mayer"] for bond in found]
    assert abs(deviations[0] / deviations[1] - 1) < 0.35
    assert statistics.mean(deviations) > 0.05


@pytest.mark.parametrize("words", [("--spread", "1"), ("--spread", "-3"), ("--spread", "1000000")])
def test_impossible_numbers_of_draws_are_refused(refused, put, words):
    put()
    assert "draws" in refused("bond", "a.xyz", *words)


def test_a_file_after_the_option_is_no_number(refused, put):
    put()
    assert "--spread" in refused("bond", "--spread", "a.xyz")


def test_table_without_deviations_says_so(ehmo, put, tmp_path):
    from basis_params import load_set

    rows = []
    for symbol in ("V", "O", "Cl"):
        element = load_set("standard").element(symbol)
        for s in element.shells:
            pairs = [x for pair in zip(s.zetas, s.coefficients, strict=True) for x in pair] + ["", ""]
            cells = (symbol, element.valence_electrons, s.n, s.l, s.h_ii_eV, *pairs[:4], "own", "x", "memory")
            rows.append(",".join(map(str, cells)))
    header = "element,valence_electrons,n,l,h_ii_eV,zeta1,c1,zeta2,c2,source_key,locator,read_or_memory"
    put("# K = 1.75\n# lambda = 0.85\n" + "\n".join([header, *rows]) + "\n", "own.csv")
    put()
    text = ehmo("bond", "a.xyz", "--params", "own.csv", "--spread", "3").out
    assert "states no standard deviation of 16 of 16 parameters" in " ".join(text.split())


def test_demo_takes_the_option(ehmo):
    assert "3 of 3 draws" in ehmo("demo", "--spread", "3").out
