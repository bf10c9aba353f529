"""Disordered and partly occupied sites: the fuller alternative is taken, and every choice is said."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.errors import InputError
from ehmo.structure import crystal_contents
from tests.structure.cif_text import INVERSION, cif, tetraoxo, with_occupancy

GROUPS = "occupancy disorder_assembly disorder_group"
CHROMATE = with_occupancy(tetraoxo())


@pytest.fixture
def read(tmp_path):
    def from_text(text: str):
        path = tmp_path / "a.cif"
        path.write_text(text)
        return crystal_contents(path)

    return from_text


def _in_groups(occupancies: dict[str, tuple[float, str, str]], extra: list[str] = ()) -> list[str]:
    """Chromate whose atoms carry occupancy, assembly and group; ordered ones by default."""
    lines = [*tetraoxo(), *extra]
    return [f"{line} {' '.join(map(str, occupancies.get(line.split()[0], (1, '.', '.'))))}" for line in lines]


def _notes(contents) -> str:
    return " ".join(contents.notes)


def test_major_group_of_an_assembly_is_taken(read):
    sites = _in_groups(
        {"O1": (0.7, "A", "1"), "O1B": (0.3, "A", "2"), "O2": (0.4, "B", "1"), "O2B": (0.6, "B", "2")},
        ["O1B O 0.2153 0.1953 0.2053", "O2B O 0.0047 -0.0153 0.2053"],
    )
    (molecule,) = (contents := read(cif(sites, columns=GROUPS))).molecules
    assert molecule.fragment.crystal.labels == ("Cr1", "O1", "O3", "O4", "O2B")
    assert "part 1 (0.70) taken of O1; left out O1B." in _notes(contents)
    assert "part 2 (0.60) taken of O2B; left out O2." in _notes(contents)
    assert all(any("Disorder: part" in note for note in molecule.fragment.notes) for molecule in contents.molecules)


def test_regions_without_assembly_name_are_decided_apart(read):
    sites = _in_groups(
        {"O1": (0.7, ".", "1"), "O1B": (0.3, ".", "2"), "O2": (0.4, ".", "1"), "O2B": (0.6, ".", "2")},
        ["O1B O 0.2153 0.1953 0.2053", "O2B O 0.0047 -0.0153 0.2053"],
    )
    (molecule,) = read(cif(sites, columns=GROUPS)).molecules
    assert set(molecule.fragment.crystal.labels) == {"Cr1", "O1", "O3", "O4", "O2B"}


def test_equal_groups_take_the_first(read):
    sites = _in_groups({"O1": (0.5, "A", "1"), "O1B": (0.5, "A", "2")}, ["O1B O 0.2153 0.1953 0.2053"])
    (molecule,) = read(cif(sites, columns=GROUPS)).molecules
    assert "O1" in molecule.fragment.crystal.labels


def test_groups_need_no_full_occupancy_to_be_ordered(read):
    """A single group, or group 0, is no alternative to anything."""
    sites = _in_groups({"O1": (1, "A", "1"), "O2": (1, ".", "0")})
    (molecule,) = read(cif(sites, columns=GROUPS)).molecules
    assert molecule.fragment.formula == "CrO4"


def test_mixed_metal_site_takes_the_larger_share_and_casts_doubt(read):
    sites = [line.replace("Cr1 Cr 0.1 0.1 0.1 1.0", "Cr1 Cr 0.1 0.1 0.1 0.6") for line in CHROMATE]
    sites += ["Mo1 Mo 0.1 0.1 0.1 0.4", *with_occupancy(["K1 K 0.6 0.6 0.6", "K2 K 0.6 0.1 0.6"])]
    (molecule,) = (contents := read(cif(sites, columns="occupancy"))).molecules
    assert molecule.fragment.formula == "CrO4"
    said = "Mixed sites, taken as the element of larger share: Cr1 0.60 with Mo1 0.40."
    assert said in molecule.fragment.doubts
    assert said in contents.notes
    assert molecule.fragment.charge is None
    assert any("two elements share a site" in note for note in molecule.fragment.notes)


def test_fuller_of_sites_that_exclude_one_another(read):
    sites = [*CHROMATE, "O5 O 0.5 0.5 0.5 0.3", "O6 O 0.55 0.5 0.5 0.7"]
    contents = read(cif(sites, columns="occupancy"))
    assert "O6" in contents.labels
    assert "O5" not in contents.labels
    assert "O6 0.70, not O5 0.30" in _notes(contents)


def test_full_site_wins_over_a_partial_one_and_two_full_ones_overlap(read):
    full = [*CHROMATE, "O5 O 0.5 0.5 0.5 1", "K1 K 0.6 0.5 0.5 0.2"]
    assert "K1" not in read(cif(full, columns="occupancy")).labels
    with pytest.raises(InputError, match="O5 and K1 overlap"):
        read(cif([*full[:-1], "K1 K 0.6 0.5 0.5 1"], columns="occupancy"))


@pytest.mark.parametrize(("occupancy", "kept", "said"), [(0.6, True, "taken as present"), (0.4, False, "left out")])
def test_lone_partial_site_stays_from_half_occupancy(read, occupancy, kept, said):
    contents = read(cif([*CHROMATE, f"O9 O 0.6 0.6 0.6 {occupancy}"], columns="occupancy"))
    assert ("O9" in contents.labels) == kept
    (note,) = [note for note in contents.notes if "O9" in note]
    assert said in note
    assert f"O9 {occupancy:.2f}" in note


def test_split_counter_ion_counts_in_full(read):
    sites = [*CHROMATE, "K1 K 0.6 0.6 0.6 1", "K2 K 0.6 0.1 0.6 0.7", "K3 K 0.65 0.1 0.6 0.3"]
    (molecule,) = (contents := read(cif(sites, columns="occupancy"))).molecules
    assert molecule.fragment.charge == -2
    assert molecule.fragment.charge_reason == "balance of the crystal: 2 K+ for each"
    assert sum(s.count for s in contents.species) == pytest.approx(2.0)


def test_two_parts_of_a_disordered_cation_count_once(read):
    sites = _in_groups(
        {"K1": (1, ".", "."), "K2": (0.7, ".", "1"), "K3": (0.3, ".", "2")},
        ["K1 K 0.6 0.6 0.6", "K2 K 0.6 0.1 0.6", "K3 K 0.65 0.1 0.6"],
    )
    (molecule,) = read(cif(sites, columns=GROUPS)).molecules
    assert molecule.fragment.charge == -2


def test_hydrogens_stay_as_many_as_their_occupancies_add_up_to(read):
    """Water with one ordered hydrogen and one in two places, 0.6 and 0.4."""
    water = ["OW O 0.6 0.6 0.6 1", "H1 H 0.7 0.6 0.6 1", "H2 H 0.57 0.7 0.6 0.4", "H3 H 0.57 0.57 0.7 0.6"]
    contents = read(cif([*CHROMATE, *water], columns="occupancy"))
    assert {"H1", "H3"} <= set(contents.labels)
    assert "H2" not in contents.labels
    assert [s.formula for s in contents.species] == ["H2O"]
    assert "Disordered hydrogens left out: H2." in contents.notes


def test_images_about_a_centre_are_thinned_to_those_that_fit(read):
    """Half an oxygen on either side of an inversion centre, 1.2 A apart: water that sits here or there."""
    sites = [*CHROMATE, "O9 O 0.55 0.55 0.5 0.5"]
    contents = read(cif(sites, operations=INVERSION, columns="occupancy"))
    assert contents.labels.count("O9") == 1
    assert any(
        note.startswith("Disorder about a symmetry element: 1 of 2 images kept of O9") for note in contents.notes
    )
    (water,) = contents.species
    assert (water.formula, water.count) == ("H2O", pytest.approx(1.0))


def test_disordered_group_about_a_centre_moves_as_one(read):
    """A carbon monoxide molecule across an inversion centre keeps carbon and oxygen of one copy."""
    sites = [*CHROMATE, "C1 C 0.55 0.5 0.5 0.5", "O9 O 0.675 0.5 0.5 0.5"]
    contents = read(cif(sites, operations=INVERSION, columns="occupancy"))
    places = np.array([contents.positions_A[contents.labels.index(label)] for label in ("C1", "O9")])
    assert (contents.labels.count("C1"), contents.labels.count("O9")) == (1, 1)
    assert np.linalg.norm(places[0] - places[1]) == pytest.approx(0.125 * 9)


def test_metal_disordered_about_a_centre_is_refused(read):
    sites = ["Cr1 Cr 0.02 0 0 0.5", *(f"{line} 1.0" for line in tetraoxo(centre=(0, 0, 0))[1:])]
    with pytest.raises(InputError, match="Cr1 disordered about a symmetry element") as caught:
        read(cif(sites, operations=INVERSION, columns="occupancy"))
    assert "subgroup" in caught.value.mend


def test_occupancy_above_one_or_negative_is_a_fault(read):
    for value in ("1.5", "-0.2", "nan"):
        with pytest.raises(InputError, match="no usable occupancy: O1"):
            read(cif([CHROMATE[0], CHROMATE[1].replace(" 1.0", f" {value}")], columns="occupancy"))


def test_images_of_a_negative_group_never_bind_each_other(read):
    """Half a carbon chain across a centre: bonded to its image without a group, an alternative with group -1."""
    ends = ["C1 C 0.5427 0.5427 0.5427 0.5 . {0}", "C2 C 0.64 0.58 0.44 0.5 . {0}"]
    ordered = [f"{line} . ." for line in CHROMATE]
    for group, images in ((".", 2), ("-1", 1)):
        sites = [*ordered, *(line.format(group) for line in ends)]
        contents = read(cif(sites, operations=INVERSION, columns=GROUPS))
        assert contents.labels.count("C1") == images
