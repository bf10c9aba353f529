"""XYZ and extended XYZ: what is read, and the line and mend of every fault."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.errors import InputError, LimitError
from ehmo.structure import read_frames

VOCL3 = """5
VOCl3 charge=0 unpaired=0
V 0 0 0
O 0 0 1.57
Cl 2.04 0 -0.65
Cl -1.02 1.767 -0.65
Cl -1.02 -1.767 -0.65
"""


@pytest.fixture
def read(tmp_path):
    def from_text(text: str | bytes, name: str = "a.xyz", **limits):
        path = tmp_path / name
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
        return read_frames(path, **limits)

    return from_text


def test_plain_frame(read):
    (fragment,) = read(VOCL3)
    assert fragment.symbols == ("V", "O", "Cl", "Cl", "Cl")
    assert fragment.charge == 0
    assert fragment.unpaired_electrons == 0
    assert fragment.title == "VOCl3"
    assert fragment.positions_A[1, 2] == 1.57


def test_extended_frame_with_the_usual_columns_equals_ases_reading(tmp_path, read):
    """Cross-check: ASE 3.29 wrote and reads the same frame, with a further column."""
    from ase import Atoms
    from ase.io import read as read_with_ase
    from ase.io import write

    (plain,) = read(VOCL3)
    atoms = Atoms(plain.symbols, plain.positions_A, info={"charge": 0, "unpaired": 0, "note": "an oxo"})
    atoms.set_initial_charges([0.5, -0.5, 0, 0, 0])
    path = tmp_path / "a.extxyz"
    write(path, atoms)
    (fragment,) = read(path.read_text())
    again = read_with_ase(path)
    assert fragment.symbols == tuple(again.get_chemical_symbols())
    assert (fragment.positions_A == again.positions).all()
    assert (fragment.charge, fragment.unpaired_electrons) == (0, 0)
    assert fragment.title == 'note="an oxo"'


@pytest.mark.parametrize(
    "text",
    [
        VOCL3.replace("\n", "\r\n"),
        "\ufeff" + VOCL3,
        VOCL3 + "\n\n   \n",
        VOCL3.replace(" ", "\t"),
        VOCL3.replace("V 0 0 0", "  V   0.0  0D0 0".replace("D", "e")),
        VOCL3.rstrip("\n"),
        VOCL3.replace("Cl", "CL").replace("V 0", "v 0"),
        VOCL3.replace("Cl 2.04", "Cl3 2.04").replace("V 0", "23 0"),
        VOCL3.replace("O 0 0 1.57", "O 0 0 1.57 -0.3 extra columns"),
    ],
    ids=["crlf", "bom", "blank tail", "tabs", "spacing", "no final newline", "case", "labels and Z", "columns"],
)
def test_harmless_variants(read, text):
    (fragment,) = read(text)
    assert fragment.symbols == ("V", "O", "Cl", "Cl", "Cl")


def test_latin_1_comment(read):
    (fragment,) = read(VOCL3.replace("VOCl3 ", "Hückel ").encode("latin-1"))
    assert fragment.title.startswith("Hückel")


def test_several_frames(read):
    frames = read(VOCL3 + VOCL3.replace("1.57", "1.60") + "\n" + VOCL3)
    assert [frame.positions_A[1, 2] for frame in frames] == [1.57, 1.60, 1.57]
    assert frames[1].source.endswith("frame 2")


@pytest.mark.parametrize(
    ("comment", "charge", "unpaired"),
    [
        ("", None, None),
        ("charge=+2 unpaired=1", 2, 1),
        ("charge=2+ multiplicity=2", 2, 1),
        ('charge="-1" mult=1', -1, 0),
        ("charge = -1.0, spin2S=2", -1, 2),
        ("TOTAL_CHARGE=-2; 2S=0", -2, 0),
        ("Charge=1 unpaired_electrons=3 note=d3", 1, 3),
        ("recharge=7 discharge=3", None, None),
        ("charge=1 total_charge=1", 1, None),
    ],
)
def test_charge_and_spin_of_the_comment(read, comment, charge, unpaired):
    for extended in ("", " Properties=species:S:1:pos:R:3"):
        (fragment,) = read(VOCL3.replace("VOCl3 charge=0 unpaired=0", comment + extended))
        assert (fragment.charge, fragment.unpaired_electrons) == (charge, unpaired)


def test_extended_columns_in_another_order(read):
    comment = 'Properties=forces:R:3:species:S:1:pos:R:3 charge=-1 pbc="F F F" config="a b"'
    (fragment,) = read(f"2\n{comment}\n1 2 3 V 0 0 0\n4 5 6 O 0 0 1.6\n")
    assert fragment.symbols == ("V", "O")
    np.testing.assert_allclose(fragment.positions_A, [[0, 0, 0], [0, 0, 1.6]])
    assert fragment.charge == -1


def test_periodic_extended_frame_is_made_whole(read):
    comment = 'Lattice="10 0 0 0 10 0 0 0 10" Properties=species:S:1:pos:R:3 charge=1'
    (fragment,) = read(f"2\n{comment}\nV 0 0 9.5\nO 0 0 1.1\n")
    np.testing.assert_allclose(fragment.positions_A, [[0, 0, 9.5], [0, 0, 11.1]])
    assert fragment.charge == 1
    assert "lattice translations" in fragment.notes[0]


def test_periodic_extended_frame_of_a_polymer_is_refused(read):
    comment = 'Lattice="3.6 0 0 0 10 0 0 0 10" Properties=species:S:1:pos:R:3'
    with pytest.raises(InputError, match="extended structure without molecules: chain OV"):
        read(f"2\n{comment}\nV 0 0 0\nO 1.8 0 0\n")


PERIODIC = VOCL3.replace("VOCl3", 'Lattice="9 0 0 0 9 0 0 0 9" Properties=species:S:1:pos:R:3')
FAULTS = {
    "periodic and far out": (PERIODIC.replace("1.57", "1e22"), "O2 has a coordinate beyond 1e+06 A"),
    "huge lattice": (PERIODIC.replace('"9 ', '"9e200 '), "impossible cell"),
    "flat lattice": (PERIODIC.replace('"9 ', '"0 '), "impossible cell"),
    "not a count": (VOCL3.replace("5\n", "five\n", 1), "line 1: 'five' is no count of atoms"),
    "zero count": ("0\n\n", "line 1: '0' is no count"),
    "negative count": ("-3\n\n", "no count of atoms"),
    "truncated": (VOCL3[:-30], "stops after 4 of 5 atoms"),
    "second frame truncated": (VOCL3 + "5\n\nV 0 0 0\n", "line 10: frame 2 stops after 1 of 5"),
    "comment missing": ("3", "stops after 0 of 3"),
    "non-number": (VOCL3.replace("1.57", "1,57"), "line 4: '1,57' is no number"),
    "nan": (VOCL3.replace("1.57", "nan"), "line 4: the coordinate nan is not finite"),
    "inf": (VOCL3.replace("1.57", "-inf"), "line 4"),
    "too few columns": (VOCL3.replace("O 0 0 1.57", "O 0 1.57"), "line 4: 'O 0 1.57' is no atom"),
    "unknown element": (VOCL3.replace("O 0", "Qq 0"), "line 4: unknown element 'Qq'"),
    "dummy": (VOCL3.replace("O 0", "X 0"), "unknown element 'X'"),
    "atomic number 0": (VOCL3.replace("O 0 0 1.57", "0 0 0 1.57"), "unknown element '0'"),
    "blank line inside": (VOCL3.replace("O 0 0 1.57", ""), "line 4: blank line inside frame 1"),
    "extra atoms": (VOCL3 + "O 3 3 3\n", "line 8: 'O 3 3 3' is no count"),
    "bare spin": (VOCL3.replace("unpaired", "spin"), "line 2: spin=0 may be S, 2S or 2S+1; write unpaired"),
    "fractional charge": (VOCL3.replace("charge=0", "charge=0.5"), "charge=0.5 is no whole number"),
    "charge in words": (VOCL3.replace("charge=0", "charge=two"), "charge=two is no whole number"),
    "multiplicity 0": (VOCL3.replace("unpaired", "multiplicity"), "-1 unpaired electrons"),
    "contradiction": (VOCL3.replace("VOCl3", "mult=3"), "disagree on the unpaired electrons"),
    "empty": ("", "the file is empty"),
    "blank": (" \n\t\n", "the file is empty"),
    "binary": ("5\n\0\1\2", "binary"),
    "bad properties": (VOCL3.replace("VOCl3", "Properties=species:S:1:pos:R:9"), "line 2: extended XYZ"),
    "extended nan": (VOCL3.replace("VOCl3", "Properties=species:S:1:pos:R:3").replace("1.57", "nan"), "line 4"),
    "other columns nan": (VOCL3.replace("VOCl3", "Properties=pos:R:3:species:S:1").replace("1.57", "nan"), "line 2"),
    "extended non-number": (VOCL3.replace("VOCl3", "Properties=species:S:1:pos:R:3").replace("1.57", "x"), "line 4"),
}


@pytest.mark.parametrize(("text", "said"), FAULTS.values(), ids=FAULTS)
def test_faults_name_place_and_mend(read, text, said):
    with pytest.raises(InputError) as caught:
        read(text)
    message = str(caught.value)
    assert said in message
    assert "a.xyz" in message
    assert caught.value.mend
    assert message.isprintable()


def test_control_characters_stay_in_the_title_and_out_of_messages(read):
    hostile = "\x1b[31mred\x07 <b>"
    (fragment,) = read(VOCL3.replace("VOCl3", hostile))
    assert fragment.title.startswith(hostile)
    with pytest.raises(InputError) as caught:
        read(VOCL3.replace("1.57", "\x1b[31m\x07"))
    assert str(caught.value).isprintable()


def test_no_such_file_and_folder(tmp_path):
    with pytest.raises(InputError, match="no such file; check the path"):
        read_frames(tmp_path / "none.xyz")
    with pytest.raises(InputError, match="folder"):
        read_frames(tmp_path)
    with pytest.raises(InputError, match="cannot be read"):
        read_frames("a\0b.xyz")
    with pytest.raises(InputError, match="cannot be read"):
        read_frames("a" * 5000 + ".xyz")


def test_limits_can_be_raised(read):
    with pytest.raises(LimitError, match="line 1: 5 atoms, the limit is 4; raise max_atoms"):
        read(VOCL3, max_atoms=4)
    with pytest.raises(LimitError, match="999999999 atoms"):
        read("999999999\n\nV 0 0 0\n")
    with pytest.raises(LimitError, match="raise max_bytes"):
        read(VOCL3, max_bytes=10)
    assert len(read(VOCL3, max_atoms=5)) == 1


def test_format_by_content_and_unknown_format(read):
    assert len(read(VOCL3, name="molecule.dat")) == 1
    with pytest.raises(InputError, match="unknown file format"):
        read("import os\n", name="script.py")
    with pytest.raises(InputError, match="unknown file format"):
        read("just text\n", name="notes.txt")


def test_format_left_to_ase(read):
    molfile = (
        "vanadyl\n  x\n\n  2  1  0  0  0  0            999 V2000\n"
        "    0.0000    0.0000    0.0000 V   0  0\n    0.0000    0.0000    1.6000 O   0  0\n"
        "  1  2  2  0\nM  END\n"
    )
    (fragment,) = read(molfile, name="vanadyl.mol")
    assert fragment.symbols == ("V", "O")
    assert fragment.charge is None
    with pytest.raises(InputError, match="cannot be read as mol"):
        read(molfile[:60], name="broken.mol")
