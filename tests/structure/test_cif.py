"""CIF: sites, symmetry and labels are read; what cannot be used is refused with the reason."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.errors import InputError, LimitError
from ehmo.structure import perceive, read_frames

CIF = """data_chromate
_chemical_formula_sum 'Cr O4 K2'
_cell_length_a 9
_cell_length_b 9
_cell_length_c 9
_cell_angle_alpha 90
_cell_angle_beta 90
_cell_angle_gamma 90
_space_group_name_H-M_alt 'P 1'
loop_
_atom_site_label
_atom_site_type_symbol
_atom_site_fract_x
_atom_site_fract_y
_atom_site_fract_z
_atom_site_occupancy
Cr1 Cr6+ 0.1 0.1 0.1 1
O1 O2- 0.2053 0.2053 0.2053 1.0
O2 O2- 0.9947 0.9947 0.2053(3) 1
O3 O2- 0.9947 0.2053 -0.0053 .
O4 O2- 0.2053 -0.0053 -0.0053 ?
K1 K 0.55 0.2 0.1 1
K2 K 0.75 0.1 0.4 1
"""
"""Tetrahedral CrO4, Cr-O 1.64, over the cell edge (idealised)."""

OPERATIONS = "loop_\n_symmetry_equiv_pos_as_xyz\nx,y,z\n-x,-y,-z\nloop_\n_atom_site_label"


@pytest.fixture
def read(tmp_path):
    def from_text(text: str, name: str = "a.cif", **limits):
        path = tmp_path / name
        path.write_text(text, encoding="utf-8")
        return read_frames(path, **limits)

    return from_text


def _with_group(name: str) -> str:
    return CIF.replace("'P 1'", name)


def test_molecule_over_a_cell_face_is_put_together(read):
    (fragment,) = read(CIF)
    assert fragment.symbols == ("Cr", "O", "O", "O", "O")
    lengths = np.linalg.norm(fragment.positions_A[1:] - fragment.positions_A[0], axis=1)
    np.testing.assert_allclose(lengths, 0.1053 * 9 * np.sqrt(3), atol=2e-3)
    assert fragment.charge == -2
    assert any("lattice translations" in note for note in fragment.notes)
    assert "Left out of the fragment, for each molecule: 2 K+." in fragment.notes
    assert [bond.kind.value for bond in perceive(fragment).bonds] == ["oxo"] * 4


def test_molecule_whole_in_the_asymmetric_unit(read):
    (fragment,) = read(CIF.replace("loop_\n_atom_site_label", OPERATIONS))
    assert fragment.formula == "CrO4"


@pytest.mark.parametrize(
    "name", ["P1", "'P -1'", "'P2(1)/n'", "'P 21/n'", "14", "'P 21'"], ids=lambda name: name.strip("'")
)
def test_space_group_names(read, name):
    assert read(_with_group(name))[0].formula == "CrO4"


def test_hall_symbol_and_number_alone(read):
    hall = CIF.replace("_space_group_name_H-M_alt 'P 1'", "_space_group_name_Hall '-P 2yn'")
    assert read(hall)[0].formula == "CrO4"
    number = CIF.replace("_space_group_name_H-M_alt 'P 1'", "_space_group_IT_number 2")
    assert read(number)[0].formula == "CrO4"


def test_triclinic_cell_agrees_with_ase():
    from ase.geometry import cellpar_to_cell

    from ehmo.structure.cif import _lattice

    class Block:
        def find_value(self, tag):
            return dict(
                zip(("a", "b", "c", "alpha", "beta", "gamma"), ("7", "8", "9", "80", "95", "110"), strict=True)
            )[tag.rsplit("_", 1)[1]]

    ours, theirs = _lattice(Block(), ""), np.asarray(cellpar_to_cell([7, 8, 9, 80, 95, 110]))
    np.testing.assert_allclose(ours @ ours.T, theirs @ theirs.T, atol=1e-9)


def test_symmetry_generated_molecule_is_completed(read):
    half = CIF.replace("0.1 0.1 0.1 1", "0 0 0 1").replace("0.2053 0.2053 0.2053", "0.1053 0.1053 0.1053")
    half = "\n".join(line for line in half.splitlines() if line[:2] not in ("O2", "O3", "O4")) + "\n"
    (fragment,) = read(half.replace("loop_\n_atom_site_label", OPERATIONS))
    assert fragment.symbols == ("Cr", "O", "O")
    np.testing.assert_allclose(fragment.positions_A[1] + fragment.positions_A[2], 2 * fragment.positions_A[0])
    assert any("Symmetry makes 1 of the 3 atoms" in note for note in fragment.notes)


def test_polymer_is_refused_as_a_molecule(read):
    chain = CIF.replace("_cell_length_c 9", "_cell_length_c 3.6").replace(
        "O1 O2- 0.2053 0.2053 0.2053", "O1 O 0.1 0.1 0.6"
    )
    chain = "\n".join(line for line in chain.splitlines() if line[:2] not in ("O2", "O3", "O4", "K1", "K2")) + "\n"
    with pytest.raises(InputError, match="extended structure without molecules: chain CrO") as caught:
        read(chain)
    assert "--list" in caught.value.mend


def test_operations_from_a_name_or_against_it_are_told(read):
    assert "Symmetry operations from the space-group symbol P 21/n." in read(_with_group("'P 21/n'"))[0].notes
    by_number = CIF.replace("_space_group_name_H-M_alt 'P 1'", "_space_group_IT_number 14")
    said = "Symmetry operations from the space-group number 14, in its standard setting."
    assert said in read(by_number)[0].notes
    both = _with_group("'P 21/n'").replace("loop_\n_atom_site_label", OPERATIONS)
    assert any(note.startswith("The file lists 2 symmetry operations, P 21/n has 4") for note in read(both)[0].notes)


def test_sites_are_held_against_the_formula(read):
    (fragment,) = read(CIF.replace("'Cr O4 K2'", "'Cr O4 K3'"))
    said = "The sites do not add up to the formula of the file, per formula unit: K 2 of 3."
    assert said in fragment.notes


def test_element_that_the_formula_forgets_goes_by_its_type_symbol(read):
    assert read(CIF.replace("'Cr O4 K2'", "'O4 K2'"))[0].formula == "CrO4"


def test_atoms_listed_and_made_by_symmetry_count_once(read):
    text = CIF.replace("loop_\n_atom_site_label", OPERATIONS) + "K3 K -0.75 -0.1 -0.4 1\n"
    (fragment,) = read(text)
    assert fragment.formula == "CrO4"
    assert "Sites that repeat symmetry images of others count once: K3." in fragment.notes
    assert "Left out of the fragment, for each molecule: 2 K+." in fragment.notes


def test_labels_without_type_symbols(read):
    text = CIF.replace("_atom_site_type_symbol\n", "").replace("'Cr O4 K2'", "'Cr O4 C2'")
    for old, new in ((" Cr6+", ""), (" O2-", ""), ("K1 K ", "CA1 "), ("K2 K ", "CA2 "), ("O4 ", "OW ")):
        text = text.replace(old, new)
    (fragment,) = read(text)
    assert fragment.symbols.count("O") == 4


def test_water_oxygen_called_wat(read):
    (fragment,) = read(CIF.replace("O4 O2-", "Wat(4) Wat(4)"))
    assert fragment.formula == "CrO4"


def test_several_blocks(read):
    frames = read(CIF + CIF.replace("data_chromate", "data_two") + "data_empty\n_cell_length_a 5\n")
    assert len(frames) == 2
    assert "block two" in frames[1].source


def test_names_with_a_dot_as_in_newer_dictionaries(read):
    text = CIF
    for category in ("_atom_site", "_cell", "_chemical_formula", "_space_group"):
        text = text.replace(f"{category}_", f"{category}.")
    assert "_atom_site.fract_x" in text
    assert read(text)[0].charge == -2


def test_byte_order_mark_and_content_without_suffix(read):
    assert read("\ufeff" + CIF)[0].formula == "CrO4"
    assert read(CIF, name="entry.txt")[0].formula == "CrO4"


FAULTS = {
    "impossible occupancy": (CIF.replace("0.2053 1.0", "0.2053 1.5"), "no usable occupancy: O1"),
    "metal mostly absent": (
        CIF.replace("0.1 0.1 0.1 1", "0.1 0.1 0.1 0.3"),
        "the only metals are less than half occupied: Cr1",
    ),
    "overlapping images": (
        CIF.replace("0.1 0.1 0.1 1", "0.02 0.02 0.02 1").replace("loop_\n_atom_site_label", OPERATIONS),
        "symmetry images of Cr1 overlap at 0.624 A",
    ),
    "crowd on one point": (
        CIF + "".join(f"K{k} K 0.5 0.{500 + k} 0.5 1\n" for k in range(3, 60)),
        "atoms fall into one cube of 2 A",
    ),
    "truncated in the loop": (CIF[: CIF.index("O4 O2-") + 12], "no valid CIF"),
    "undefined coordinates": (CIF.replace("0.2053(3)", "?"), "no usable coordinates: O2"),
    "unknown element": (CIF.replace("O1 O2-", "Qx1 Qx"), "unknown element: Qx1"),
    "all faults at once": (
        CIF.replace("O1 O2-", "Qx1 Qx").replace("0.2053(3)", "?"),
        "unknown element: Qx1; no usable coordinates: O2",
    ),
    "no symmetry": (CIF.replace("'P 1'", "?"), "no symmetry operations"),
    "unknown group": (CIF.replace("'P 1'", "'Z 9/q'"), "no symmetry operations and no known space group"),
    "faulty operation": (
        CIF.replace("loop_\n_atom_site_label", OPERATIONS.replace("-x,-y,-z", "x,q,z")),
        "faulty symmetry operation",
    ),
    "no cell": (CIF.replace("_cell_length_b 9\n", ""), "no usable unit cell"),
    "flat cell": (CIF.replace("_cell_length_b 9", "_cell_length_b 0.01"), "impossible cell"),
    "cell of nan": (CIF.replace("_cell_length_b 9", "_cell_length_b ?"), "no usable unit cell"),
    "overlap": (
        CIF.replace("O1 O2- 0.2053 0.2053 0.2053", "N1 N 0.11 0.11 0.11").replace("O4 K2", "O4 K2 N"),
        "overlap",
    ),
    "no metal": (
        CIF.replace("Cr1 Cr6+", "S1 S6+")
        .replace("K2 K ", "F1 F ")
        .replace("K1 K ", "F2 F ")
        .replace("'Cr O4 K2'", "?"),
        "no metal",
    ),
    "no atoms": ("data_x\n_cell_length_a 5\n", "no atom sites with fractional coordinates"),
    "not a CIF": ("data_x\nloop_\n_a\n_b\n1\n", "no valid CIF"),
    "zero occupancy everywhere": (
        "\n".join(line.rsplit(" ", 1)[0] + " 0" if line[:1] in "COK" else line for line in CIF.splitlines()) + "\n",
        "no atoms among the sites",
    ),
}


@pytest.mark.parametrize(("text", "said"), FAULTS.values(), ids=FAULTS)
def test_faults(read, text, said):
    with pytest.raises(InputError) as caught:
        read(text)
    message = str(caught.value)
    assert said in message
    assert "a.cif" in message
    assert caught.value.mend
    assert message.isprintable()


def test_limit_on_cell_contents(read):
    with pytest.raises(LimitError, match="7 atom sites, the limit is 5; raise max_atoms"):
        read(CIF, max_atoms=5)
    with pytest.raises(LimitError, match="more than 10 atoms; raise max_atoms"):
        read(CIF.replace("loop_\n_atom_site_label", OPERATIONS), max_atoms=10)


def test_hundreds_of_thousands_of_sites_are_refused_by_their_number(read):
    many = "".join(f"O{k} O2- 0.{k % 997:03d} 0.{k % 991:03d} 0.{k % 983:03d} 1\n" for k in range(200_000))
    with pytest.raises(LimitError, match="200007 atom sites, the limit is 10000"):
        read(CIF + many)
