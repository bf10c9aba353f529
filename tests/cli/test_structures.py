"""What is taken from a structure file: --list, --pick, --hydrogens, --cations, and multiplicities in the JSON."""

from __future__ import annotations

import json

import pytest

from ehmo import Options, bond_report
from ehmo.structure import crystal_contents
from ehmo.structure.crystal import molecules_of
from tests.cli.conftest import VOCL3
from tests.structure.cif_text import INVERSION, cif, tetraoxo
from tests.structure.test_crystal_contents import C2, DICHROMATE, FOURFOLD, MONOCLINIC
from tests.structure.test_hydrogens import AQUO

EDGE = 14.0
SALT = cif(
    [*tetraoxo(edge=EDGE), "K1 K 0.6 0.6 0.6", "K2 K 0.6 0.1 0.6"],
    cell=(EDGE, EDGE, EDGE, 90, 90, 90),
    operations=INVERSION,
)
"""Potassium chromate in an invented cell."""

TWO = cif(
    [*tetraoxo(edge=EDGE), "Mo2 Mo 0.55 0.55 0.55", *(f"O1{k} {line.split(' ', 1)[1]}" for k, line in enumerate(
        tetraoxo(edge=EDGE, centre=(0.55, 0.55, 0.55), step=0.1136)[1:])), "Ba1 Ba 0.1 0.6 0.6", "Ba2 Ba 0.6 0.6 0.1"],
    cell=(EDGE, EDGE, EDGE, 90, 90, 90),
)  # fmt: skip
"""Two different tetraoxo ions and their barium ions in one invented cell."""


def test_list_of_a_crystal(ehmo, put):
    put(SALT, "a.cif")
    ran = ehmo("bond", "a.cif", "--list")
    assert ran.status == 0
    assert "1  molecule CrO4 2-, 2 in the cell; charge -2, balance of the crystal: 2 K+ for each" in ran.out
    assert "K+       potassium" in ran.out
    assert "Mayer" not in ran.out
    assert max(map(len, ran.out.splitlines())) <= 120


def test_list_of_frames(ehmo, put):
    put(VOCL3 + VOCL3.replace("VOCl3 charge=0 unpaired=0", "second"))
    ran = ehmo("bond", "a.xyz", "--list")
    assert [line.split()[:4] for line in ran.out.splitlines()[1:]] == [
        ["1", "Cl3OV", "0", "0"],
        ["2", "Cl3OV", "?", "?"],
    ]


def test_every_molecule_is_reported_and_picks_choose(ehmo, put):
    put(TWO, "a.cif")
    both = ehmo("bond", "a.cif", "--charges", "fixed")
    assert both.status == 0
    assert "molecule of Cr1" in both.out
    assert "molecule of Mo2" in both.out
    one = ehmo("bond", "a.cif", "--pick", "2")
    assert "molecule of Mo2" in one.out
    assert "molecule of Cr1" not in one.out
    assert ehmo("bond", "a.cif", "--pick", "2, 1").out.index("Mo2") < len(both.out)


@pytest.mark.parametrize("word", ["0", "3", "x", "1-2", ",", "-1", "1.5", "٣"])
def test_pick_of_what_is_not_there(refused, put, word):
    put(TWO, "a.cif")
    line = refused("bond", "a.cif", f"--pick={word}")
    assert "entries 1 to 2" in line
    assert "--list" in line


def test_frames_can_be_picked(ehmo, put):
    put(VOCL3 + VOCL3.replace("VOCl3 charge=0 unpaired=0", "second"))
    ran = ehmo("bond", "a.xyz", "--pick", "2", "--json", "-")
    assert json.loads(ran.out)["fragment"]["title"] == "second"


def test_one_charge_for_several_molecules_is_refused(refused, put):
    put(TWO, "a.cif")
    line = refused("bond", "a.cif", "--charge", "-2")
    assert "2 molecules with metals" in line
    assert "--pick" in line


def test_json_of_a_crystal_carries_multiplicities_and_labels(ehmo, put):
    put(SALT, "a.cif")
    document = json.loads(ehmo("bond", "a.cif", "--json", "-").out)
    assert document["fragment"]["multiplicity"] == 2
    assert [atom["site_label"] for atom in document["fragment"]["atoms"]] == ["Cr1", "O1", "O2", "O3", "O4"]
    assert [(bond["per_metal"], bond["multiplicity"]) for bond in document["bonds"]] == [(1, 2)] * 4
    assert document["fragment"]["charge_reason"] == "balance of the crystal: 2 K+ for each"
    put(VOCL3)
    plain = json.loads(ehmo("bond", "a.xyz", "--json", "-").out)
    assert plain["fragment"]["multiplicity"] is None
    assert {bond["multiplicity"] for bond in plain["bonds"]} == {None}


def test_equal_bonds_of_a_crystal_are_listed_once(ehmo, put):
    put(cif(["Cr1 Cr 0 0 0", "O1 O 0.1053 0.1053 0.1053", "Ba1 Ba 0.5 0.5 0.5"], operations=FOURFOLD), "a.cif")
    (bond,) = json.loads(ehmo("bond", "a.cif", "--json", "-").out)["bonds"]
    assert (bond["label"], bond["per_metal"], bond["multiplicity"]) == ("Cr1-O2", 4, 4)
    lines = ehmo("bond", "a.cif").out.splitlines()
    (row,) = [line.split() for line in lines if line.startswith("  Cr1-O2  oxo")]
    assert row[3:5] == ["4", "4"]
    assert any(line.split()[:4] == ["O2,", "O3,", "O4,", "O5"] for line in lines)


def test_equal_metals_of_a_crystal_are_listed_once(ehmo, put):
    put(cif(DICHROMATE, cell=MONOCLINIC, operations=C2), "a.cif")
    stated = ("bond", "a.cif", "--charge", "-2", "--unpaired", "0")
    bonds = json.loads(ehmo(*stated, "--json", "-").out)["bonds"]
    assert len(bonds) == 4
    assert {(bond["per_metal"], bond["multiplicity"]) for bond in bonds} == {(1, 4)}
    assert {bond["metal"] for bond in bonds} == {0}
    out = ehmo(*stated).out
    assert out.count("Bonds of Cr") == 1
    assert "\nCr1, Cr2: Cr(VI)" in out or "\nCr1, Cr2: bond-valence" in out


def test_symmetry_makes_the_bonds_equal_that_it_says_it_does(put):
    path = put(cif(DICHROMATE, cell=MONOCLINIC, operations=C2), "a.cif")
    (molecule,) = molecules_of(crystal_contents(path))
    report = bond_report(molecule, options=Options(charge=-2, unpaired_electrons=0))
    first = report.distinct_bonds()
    assert len(first) == 4
    assert len(report.orders) == 8
    mayer = sorted(orders.mayer for orders in report.orders)
    assert mayer == pytest.approx(sorted(2 * [report.orders[place].mayer for place in first]), abs=1e-7)


def test_molecule_that_cannot_be_calculated_does_not_hide_the_others(ehmo, put):
    iron = [line.replace("Cr", "Fe") for line in tetraoxo(edge=EDGE, centre=(0.55, 0.55, 0.55))]
    sites = [*tetraoxo(edge=EDGE), "Fe1 Fe 0.55 0.55 0.55", *(f"O1{k} {line.split(' ', 1)[1]}" for k, line in
             enumerate(iron[1:])), "Te1 Te 0.1 0.6 0.6"]  # fmt: skip
    put(cif(sites, cell=(EDGE, EDGE, EDGE, 90, 90, 90)), "a.cif")
    ran = ehmo("bond", "a.cif")
    assert ran.status == 0
    assert "Cr1: Cr(VI)" in ran.out
    assert "Not calculated:" in ran.out
    assert "molecule of Fe1: no charge is given" in ran.out
    document = json.loads(ehmo("bond", "a.cif", "--json", "-").out)
    assert len(document["reports"]) == 1
    (left,) = document["not_reported"]
    assert left["source"].endswith("molecule of Fe1")
    assert "no charge is given" in left["reason"]


def test_counter_ions_with_functions_on_request(ehmo, put):
    put(SALT, "a.cif")
    document = json.loads(ehmo("bond", "a.cif", "--cations", "basis", "--json", "-").out)
    assert document["fragment"]["formula"] == "CrK2O4"
    assert document["fragment"]["charge"] == 0
    assert len(document["bonds"]) == 4
    assert any("Counter-ions in the fragment" in said for said in document["assumptions"])


def test_missing_hydrogens_are_a_doubt_until_placed(ehmo, put, refused):
    put(cif(AQUO), "a.cif")
    assert "--hydrogens place" in refused("bond", "a.cif")
    ran = ehmo("bond", "a.cif", "--hydrogens", "place")
    assert ran.status == 0
    assert "Cl2H2O2V" in ran.out
    assert "hydrogens of the cell were placed" in ran.out
    given = ehmo("bond", "a.cif", "--charge", "-2", "--unpaired", "1")
    assert given.status == 0
    assert "Hydrogens of water are missing: OW2" in given.out.split("To doubt")[1]


def test_ladder_takes_the_same_options(ehmo, put):
    put(TWO, "a.cif")
    assert "molecule CrO4" in ehmo("ladder", "a.cif", "--list").out
    assert "molecule of Mo2" in ehmo("ladder", "a.cif", "--pick", "2").out


def test_hostile_labels_are_shown_and_not_obeyed(ehmo, put):
    sites = [line.replace("O1 ", "O\x1b[31m ", 1) for line in tetraoxo(edge=EDGE)]
    put(cif([*sites, "K1 K 0.6 0.6 0.6", "K2 K 0.6 0.1 0.6"], cell=(EDGE, EDGE, EDGE, 90, 90, 90)), "a.cif")
    for words in (["bond", "a.cif", "--list"], ["bond", "a.cif"]):
        ran = ehmo(*words)
        assert ran.status in (0, 2)
        assert "\x1b" not in ran.out + ran.err
