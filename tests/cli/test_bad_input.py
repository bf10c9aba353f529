"""What bad input gets: one line that names place and mend, exit status 2, nothing half-written."""

from __future__ import annotations

import errno
import re
from pathlib import Path

import numpy as np
import pytest

from basis_params.reader import COLUMNS
from tests.cli.conftest import VOCL3
from tests.cli.test_commands import own_table
from tests.geometries import SPECIES
from tests.structure.test_cif import CIF

BINARY = np.random.default_rng(1).integers(0, 256, 3000, dtype=np.uint8).tobytes()
WATER = "3\nwater\nO 0 0 0\nH 0.76 0 0.59\nH -0.76 0 0.59\n"

XYZ_FAULTS = {
    "empty": ("", ["a.xyz", "empty"]),
    "blank": ("\n \n", ["a.xyz", "empty"]),
    "truncated": (VOCL3[:-30], ["a.xyz, line", "stops after 4 of 5 atoms", "complete the file"]),
    "binary": (BINARY, ["a.xyz", "binary", "text file"]),
    "unknown element": (VOCL3.replace("O 0", "Zz 0"), ["a.xyz, line 4", "Zz", "symbol"]),
    "not finite": (VOCL3.replace("1.57", "nan"), ["a.xyz, line 4", "not finite"]),
    "overflow": (VOCL3.replace("1.57", "1e999"), ["a.xyz, line 4", "not finite"]),
    "overlapping atoms": (VOCL3.replace("1.57", "0.01"), ["a.xyz", "V1 and O2", "0.010 A", "correct"]),
    "atoms on one point": (VOCL3.replace("1.57", "0"), ["a.xyz", "V1 and O2", "correct"]),
    "wrong parity": (VOCL3.replace("unpaired=0", "unpaired=1"), ["a.xyz", "1 unpaired", "0, 2, 4"]),
    "wrong parity of the charge": (VOCL3.replace("charge=0", "charge=-1"), ["a.xyz", "0 unpaired", "1, 3, 5"]),
    "impossible spin": (VOCL3.replace("unpaired=0", "unpaired=40"), ["a.xyz", "40 unpaired", "from 0 to 32"]),
    "impossible charge": (VOCL3.replace("charge=0", "charge=99"), ["a.xyz", "99", "impossible"]),
    "no metal": (WATER, ["a.xyz", "no metal", "metal"]),
    "metal alone": ("1\ncharge=3\nV 0 0 0\n", ["a.xyz", "no donor", "V1"]),
    "donor out of reach": ("2\ncharge=3\nV 0 0 0\nO 0 0 9\n", ["a.xyz", "O2", "9.00 A", "angstrom"]),
    "element the set lacks": (
        VOCL3.replace("V 0", "Ce 0").replace("VOCl3 charge=0", "charge=-1"),
        ["a.xyz", "Ce", "standard"],
    ),
    "light element the set lacks": (VOCL3.replace("5\n", "6\n", 1) + "He 9 9 9\n", ["a.xyz", "He", "standard"]),
    "charge in words": (VOCL3.replace("charge=0", "charge=none"), ["a.xyz, line 2", "whole number"]),
}


@pytest.mark.parametrize(("text", "said"), XYZ_FAULTS.values(), ids=XYZ_FAULTS)
def test_faulty_xyz(refused, put, text, said):
    put(text)
    line = refused("bond", "a.xyz", "--json", "report.json")
    for words in said:
        assert words in line


CIF_FAULTS = {
    "empty": ("", ["empty"]),
    "binary": (BINARY, ["binary"]),
    "truncated": (CIF[: CIF.index("Cr1 Cr6+") + 20], ["a.cif"]),
    "impossible occupancy": (CIF.replace("0.2053 1.0", "0.2053 1.5"), ["no usable occupancy", "O1"]),
    "metal disordered about a centre": (
        CIF.replace("Cr1 Cr6+ 0.1 0.1 0.1 1", "Cr1 Cr6+ 0.02 0.02 0.02 0.5").replace("'P 1'", "'P -1'"),
        ["Cr1 disordered about a symmetry element", "subgroup"],
    ),
    "unknown element": (CIF.replace("O1 O2-", "Qx1 Qx"), ["unknown element", "Qx1"]),
    "undefined coordinates": (CIF.replace("0.2053(3)", "?"), ["coordinates", "O2"]),
    "no metal": (
        CIF.replace("Cr1 Cr6+", "S1 S6+")
        .replace("K1 K ", "F1 F ")
        .replace("K2 K ", "F2 F ")
        .replace("'Cr O4 K2'", "?"),
        ["no metal"],
    ),
}


@pytest.mark.parametrize(("text", "said"), CIF_FAULTS.values(), ids=CIF_FAULTS)
def test_faulty_cif(refused, put, text, said):
    put(text, "a.cif")
    line = refused("bond", "a.cif", "--json", "report.json")
    assert "a.cif" in line
    for words in said:
        assert words in line


def test_no_such_file(refused):
    line = refused("bond", "missing.xyz", "--json", "report.json")
    assert "missing.xyz" in line
    assert "check the path" in line


def test_folder_in_place_of_a_file(refused, tmp_path):
    assert "folder" in refused("bond", tmp_path)


OPTION_FAULTS = {
    "wrong parity": (["--charge", "-1"], ["0 unpaired", "1, 3, 5"]),
    "impossible spin": (["--unpaired", "98"], ["98 unpaired", "impossible"]),
    "negative spin": (["--unpaired", "-2"], ["negative"]),
    "impossible charge": (["--charge", "500"], ["500", "impossible"]),
    "huge charge": (["--charge", "9" * 30], ["impossible"]),
    "charge of half an electron": (["--charge", "0.5"], ["--charge", "0.5"]),
    "too many atoms": (["--max-atoms", "4"], ["a.xyz", "5 atoms", "--max-atoms"]),
    "too many bytes": (["--max-bytes", "10"], ["a.xyz", "bytes", "--max-bytes"]),
    "too many functions": (["--max-functions", "20"], ["a.xyz", "25 basis functions", "--max-functions"]),
    "charges that do not settle": (["--max-iterations", "2"], ["a.xyz", "2 iterations", "--charges fixed"]),
    "no iterations": (["--max-iterations", "0"], ["at least 1"]),
    "no such set": (["--params", "nothing"], ["nothing", "standard"]),
    "structure as a set": (["--params", "a.xyz"], ["a.xyz", "header"]),
    "no charge model": (["--charges", "guessed"], ["--charges", "fixed"]),
    "unknown option": (["--nonsense"], ["--nonsense", "--help"]),
    "empty json path": (["--json", ""], ["--json", "file name"]),
}


@pytest.mark.parametrize(("words", "said"), OPTION_FAULTS.values(), ids=OPTION_FAULTS)
def test_faulty_options(refused, put, words, said):
    put()
    line = refused("bond", "a.xyz", "--json", "report.json", *words)
    for part in said:
        assert part in line


@pytest.mark.parametrize("option", ["--K", "--K-sigma", "--K-pi", "--K-delta", "--K-decay", "--lambda"])
@pytest.mark.parametrize("value", ["nan", "inf", "-1", "1e300", "1e999"])
def test_constants_that_are_no_constants(refused, put, option, value):
    put()
    line = refused("bond", "a.xyz", "--json", "report.json", option, value)
    assert option.strip("-").replace("-", "_").removesuffix("_decay") in line
    assert "0 to 10" in line


@pytest.mark.parametrize(
    "words",
    [
        (),
        ("bond",),
        ("nonsense",),
        ("params",),
        ("params", "show"),
        ("params", "show", "none"),
        ("params", "show", "standard", "Xx"),
    ],
)
def test_faulty_command_lines(refused, words):
    refused(*words)


def test_second_frame_at_fault_writes_nothing_and_is_named(refused, put):
    put(VOCL3 + VOCL3.replace("unpaired=0", "unpaired=1"))
    assert "frame 2" in refused("bond", "a.xyz", "--json", "report.json")


# Parameter tables of the user.

HEADER = ",".join(COLUMNS)
TABLE_FAULTS = {
    "empty": ("", ["mine.csv"]),
    "binary": (BINARY, ["mine.csv"]),
    "no header": ("V,5,3,d,-11,4.75,0.4755,1.7,0.7052,own,p 1,read\n", ["mine.csv", "header"]),
    "norm": (
        own_table()
        .replace(",own,notebook", ",own,page")
        .replace("O,6,2,s,", "O,6,2,s,-32.3,2.275,0.9,,,own,x,read\nO,6,3,s,", 1),
        ["mine.csv", "line", "norm", "O"],
    ),
    "words for a number": (own_table().replace("O,6,2,s,", "O,6,2,s,deep", 1), ["mine.csv", "line", "number"]),
    "constant of nan": (own_table("# K = nan"), ["mine.csv", "line 1", "K"]),
    "element left out": (own_table(elements="V O"), ["Cl", "mine"]),
    "unknown key of the header": (own_table("# K = 1.75", "# lambda = -4"), ["lambda"]),
    "control characters": (own_table().replace("notebook", "\x1b[2J"), ["mine.csv", "line"]),
}


@pytest.mark.parametrize(("text", "said"), TABLE_FAULTS.values(), ids=TABLE_FAULTS)
def test_faulty_table(refused, put, text, said):
    put()
    put(text, "mine.csv")
    line = refused("bond", "a.xyz", "--params", "mine.csv", "--json", "report.json")
    for words in said:
        assert words in line


def xyz_of(name: str, comment: str, scale: float = 1.0) -> str:
    """XYZ text of a shared species."""
    species = SPECIES[name]
    rows = [
        f"{symbol} {x:.6f} {y:.6f} {z:.6f}"
        for symbol, (x, y, z) in zip(species.symbols, (species.positions_A * scale).tolist(), strict=True)
    ]
    return "\n".join([str(len(rows)), comment, *rows]) + "\n"


def test_linearly_dependent_functions_are_named(refused, put):
    # Shells of C and O so diffuse that the twelve atoms of the carbonyls cannot be told apart by them.
    put(xyz_of("Cr(CO)6", "charge=0 unpaired=0"))
    rows = own_table(elements="Cr").splitlines()
    for symbol, electrons in (("C", 4), ("O", 6)):
        rows += [f"{symbol},{electrons},4,s,-26,0.12,,,,own,x,read", f"{symbol},{electrons},4,p,-14,0.12,,,,own,x,read"]
        rows += [f"{symbol},{electrons},5,s,-10,0.15,,,,own,x,read"]
    put("\n".join(rows) + "\n", "mine.csv")
    line = refused("bond", "a.xyz", "--params", "mine.csv", "--json", "report.json")
    for words in ("a.xyz", "linearly dependent", "tighter exponents"):
        assert words in line
    assert re.search(r"4p[xyz] of [CO]\d+", line)


# Writing.


@pytest.mark.parametrize("target", ["nowhere/report.json", "a.xyz/report.json", ".", "no\0name", "x" * 5000])
def test_places_that_cannot_be_written(refused, put, target):
    put()
    line = refused("bond", "a.xyz", "--json", target)
    assert "cannot write the file" in line
    assert "writable" in line


def _no_temporary_file(*_, **__):
    raise PermissionError(errno.EACCES, "Permission denied")


def _no_room_after_100_bytes(path: Path, content: bytes) -> int:
    with path.open("wb") as file:
        file.write(content[:100])
    raise OSError(errno.ENOSPC, "No space left on device")


@pytest.mark.parametrize(
    ("name", "instead"),
    [("pathlib.Path.write_bytes", _no_room_after_100_bytes), ("tempfile.NamedTemporaryFile", _no_temporary_file)],
    ids=["disk full", "folder not writable"],
)
def test_disk_full_or_folder_locked_leaves_the_old_file_whole(refused, put, monkeypatch, name, instead):
    # `refused` compares every file of the folder before and after, hidden ones too.
    put()
    put("the old report", "report.json")
    monkeypatch.setattr(name, instead)
    line = refused("bond", "a.xyz", "--json", "report.json")
    assert "report.json" in line
    assert "has room" in line


# Hostile text.

ESCAPE = "\x1b[2J\x1b]0;owned\x07\x08\x08"
LINE_BREAKS = ["\r", "\x0b", "\x0c", "\x1c", "\x85", "\u2028", "\u2029"]


def test_control_characters_of_the_comment_are_shown_and_not_obeyed(ehmo, put):
    put(VOCL3.replace("VOCl3", f"VOCl3 {ESCAPE} \u202egnp.exe"))
    ran = ehmo("bond", "a.xyz")
    assert ran.status == 0
    assert all(char.isprintable() or char == "\n" for char in ran.out)
    assert r"\x1b[2J" in ran.out


@pytest.mark.parametrize("breaker", LINE_BREAKS, ids=[f"U+{ord(char):04X}" for char in LINE_BREAKS])
def test_line_breaks_inside_the_comment_forge_no_lines(ehmo, put, breaker):
    put(VOCL3.replace("VOCl3", f"x{breaker}Bonds of V1{breaker}  V1-O2 oxo"))
    ran = ehmo("bond", "a.xyz")
    if ran.status == 0:
        assert ran.out.splitlines().count("Bonds of V1") == 1
        assert all(char.isprintable() or char == "\n" for char in ran.out)
    else:  # a lone carriage return is an old end of line: the frame then has the wrong lines
        assert ran.status == 2
        assert re.fullmatch(r"ehmo: a\.xyz, line \d+: [^\n]+\n", ran.err)


@pytest.mark.parametrize("name", [f"a{ESCAPE.replace('/', '')}.xyz", "a\nb.xyz", "-.xyz", "=cmd().xyz"])
def test_hostile_file_names_are_shown_and_not_obeyed(ehmo, put, tmp_path, name):
    put(name=name)
    ran = ehmo("bond", tmp_path / name)
    assert ran.status == 0
    assert all(char.isprintable() or char == "\n" for char in ran.out)
    missing = ehmo("bond", tmp_path / f"not{name}")
    assert missing.status == 2
    assert missing.err[:-1].isprintable()


def test_hostile_element_label_and_set_name(refused, put):
    put(VOCL3.replace("O 0 0", f"{ESCAPE} 0 0"))
    refused("bond", "a.xyz")
    put()
    refused("bond", "a.xyz", "--params", f"no{ESCAPE}")
    refused("bond", "a.xyz", f"--no{ESCAPE}")
    refused("params", "show", "standard", ESCAPE)


def test_spin_of_several_open_metals_is_refused(refused, put):
    # Two vanadium(III) far apart: nothing tells which spin each has.
    species = SPECIES["[VOCl4]2-"]
    rows = [f"{s} {x:.4f} {y:.4f} {z:.4f}" for s, (x, y, z) in zip(species.symbols, species.positions_A, strict=True)]
    rows += [
        f"{s} {x + 20:.4f} {y:.4f} {z:.4f}" for s, (x, y, z) in zip(species.symbols, species.positions_A, strict=True)
    ]
    put("\n".join((str(len(rows)), "charge=-6", *rows)) + "\n")
    line = refused("bond", "a.xyz")
    assert "a.xyz" in line
    assert "unpaired" in line
    assert "2 metals hold 4 d or f electrons" in line
    assert "0, 2, 4" in line


def test_doubtful_terminal_oxygen_asks_for_the_charge(refused, ehmo, put):
    # Mn-O 1.90 in place of 1.63: hydrogens may be missing, so no charge is guessed.
    put(xyz_of("MnO4 -", "", 1.90 / 1.629))
    assert "charge" in refused("bond", "a.xyz")
    ran = ehmo("bond", "a.xyz", "--charge", "-1", "--unpaired", "0")
    assert ran.status == 0
    assert "hydrogens may be missing" in " ".join(ran.out.split())


def test_json_never_overwrites_the_structure_file(refused, put, tmp_path):
    put("2\ncharge=1 unpaired=2\nV 0 0 0\nO 0 0 1.59\n")
    assert "overwrite" in refused("bond", "a.xyz", "--json", "a.xyz")


def test_json_on_a_terminal_shows_c1_controls(ehmo, put):
    put("2\nt \x9b31m charge=1 unpaired=2\nV 0 0 0\nO 0 0 1.59\n")
    out = ehmo("bond", "a.xyz", "--json", "-").out
    assert "\x9b" not in out
    assert "\\u009b" in out
