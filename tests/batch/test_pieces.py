"""Files cut into items: the pieces read one by one give what the whole file gives."""

from __future__ import annotations

import tracemalloc

import numpy as np
import pytest

from ehmo.batch.items import BatchSettings, item_of, plain_item
from ehmo.batch.pieces import pieces
from ehmo.batch.sources import work_items
from ehmo.batch.tree import SourceFile
from ehmo.batch.work import read_structures
from ehmo.errors import EhmoError, LimitError
from ehmo.structure import read_crystals, read_frames
from tests.batch.files import chromate_cif, many_frames, put, rutile_cif, xyz_text
from tests.structure.cif_text import cif, tetraoxo

LIMITS = {"max_atoms": 10_000, "max_bytes": 100_000_000}


def structures(path, **settings):
    found = []
    for item in pieces(SourceFile(str(path)), **LIMITS):
        found += read_structures(item, BatchSettings(**settings)).structures
    return found


def assert_same(found, expected):
    assert len(found) == len(expected)
    for one, other in zip(found, expected, strict=True):
        assert (one.source, one.title, one.symbols, one.notes) == (
            other.source,
            other.title,
            other.symbols,
            other.notes,
        )
        assert (one.charge, one.unpaired_electrons) == (other.charge, other.unpaired_electrons)
        np.testing.assert_array_equal(one.positions_A, other.positions_A)


CELL = xyz_text("VOCl3").replace("VOCl3 ", 'Lattice="20 0 0 0 20 0 0 0 20" Properties=species:S:1:pos:R:3 ')


@pytest.mark.parametrize(
    "text",
    [
        many_frames(1),
        many_frames(5),
        "\n\n".join(many_frames(1) for _ in range(3)) + "\n\n",
        many_frames(3).replace("\n", "\r\n"),
        many_frames(3).replace("\n", "\r"),
        "\ufeff" + many_frames(2),
        many_frames(2) + CELL + many_frames(1),
        many_frames(2).encode() + "5\nPélardon é\n".encode("latin-1") + many_frames(1).split("\n", 2)[2].encode(),
    ],
    ids=["one", "five", "blank lines", "CRLF", "CR", "byte-order mark", "cell", "Latin-1"],
)
def test_frames(tmp_path, text):
    path = put(tmp_path, "many.xyz", text)
    assert_same(structures(path), read_frames(path))


@pytest.mark.parametrize(
    "text",
    [
        "",
        "   \n",
        "none\n",
        many_frames(2) + "0\n",
        many_frames(2) + "five\nx\n",
        many_frames(1) + "4\n\nV 0 0 0\nO 0 0 1.6\n",
        many_frames(1) + "3\n\nV 0 0 0\n\nO 0 0 1.6\n" + many_frames(1),
        many_frames(1) + "2\n\nV 0 0 0\nO 0 0 x\n" + many_frames(1),
        many_frames(1) + "2\n\nV 0 0 0\nOO 0 0 1\n",
        b"5\nx\n\0\0\0",
        "200000\nx\n" + "V 0 0 0\n" * 10,
    ],
)
def test_a_faulty_frame_is_refused_in_the_words_of_the_whole_file(tmp_path, text):
    path = put(tmp_path, "bad.xyz", text)
    with pytest.raises(EhmoError) as whole:
        read_frames(path)
    said = []
    for item in pieces(SourceFile(str(path)), **LIMITS):
        try:
            read_structures(item, BatchSettings())
        except EhmoError as fault:
            said.append(fault)
    assert len(said) == 1
    assert said[0].fault == whole.value.fault
    # The piece names its frame besides.
    assert said[0].place.split(", line")[-1] == whole.value.place.split(", line")[-1]


def test_frames_after_a_faulty_one_are_read(tmp_path):
    path = put(tmp_path, "mixed.xyz", many_frames(1) + "2\n\nV 0 0 0\nO 0 0 x\n" + many_frames(1))
    items = list(pieces(SourceFile(str(path)), **LIMITS))
    assert [item.entry for item in items] == ["frame 1", "frame 2", "frame 3"]
    assert len(read_structures(items[2], BatchSettings()).structures) == 1


def test_frames_over_the_limit_are_passed_over_and_the_rest_is_read(tmp_path):
    path = put(tmp_path, "mixed.xyz", xyz_text("[VO(OH2)5]2+") + xyz_text("OsO4"))
    items = list(pieces(SourceFile(str(path)), max_atoms=10, max_bytes=10**6))
    with pytest.raises(LimitError, match="17 atoms"):
        read_structures(items[0], BatchSettings(max_atoms=10))
    assert len(read_structures(items[1], BatchSettings(max_atoms=10)).structures) == 1
    assert sum(len(item.text) for item in items) < path.stat().st_size / 2


BLOCKS = {
    "one": chromate_cif(),
    "two": chromate_cif("first") + chromate_cif("second", "Mo"),
    "block without sites before": "data_global\n_publ_author 'X'\n" + chromate_cif("only"),
    "text that looks like a block": "data_a\n_note\n;\ndata_b\n;\n" + chromate_cif("real").split("\n", 1)[1],
    "comment first": "# made by hand\n\n" + chromate_cif("a") + chromate_cif("b", "W"),
}


@pytest.mark.parametrize("text", BLOCKS.values(), ids=BLOCKS)
def test_blocks(tmp_path, text):
    path = put(tmp_path, "many.cif", text)
    expected = [fragment for contents in read_crystals(path) for fragment in contents.fragments]
    found = structures(path)
    # A file with one usable block needs no name of it; the parts of one with several carry theirs.
    assert [one.source.split(", block")[0] for one in found] == [str(path)] * len(expected)
    for one, other in zip(found, expected, strict=True):
        assert (one.symbols, one.charge, one.charge_reason) == (other.symbols, other.charge, other.charge_reason)
        np.testing.assert_array_equal(one.positions_A, other.positions_A)
        np.testing.assert_array_equal(one.crystal.permutations, other.crystal.permutations)


@pytest.mark.parametrize("text", ["data_a\n_cell_length_a 5\n", "data_a\n", "no cif", "", "data_a\nloop_\n_x\n'open\n"])
def test_a_file_without_a_usable_block_gives_one_item_that_says_so(tmp_path, text):
    path = put(tmp_path, "bad.cif", text)
    with pytest.raises(EhmoError) as whole:
        read_crystals(path)
    (item,) = pieces(SourceFile(str(path)), **LIMITS)
    with pytest.raises(EhmoError) as piece:
        read_structures(item, BatchSettings())
    assert piece.value.fault == whole.value.fault


def test_a_fault_in_a_later_block_names_its_line_of_the_file(tmp_path):
    text = chromate_cif("good") + chromate_cif("bad").replace("K1 K 0.6 0.6 0.6", "K1 K 0.6 'open 0.6")
    path = put(tmp_path, "two.cif", text)
    line = next(k for k, row in enumerate(text.split("\n"), 1) if "'open" in row)
    good, bad = pieces(SourceFile(str(path)), **LIMITS)
    assert len(read_structures(good, BatchSettings()).structures) == 1
    with pytest.raises(EhmoError, match=rf"\b{line}\b"):
        read_structures(bad, BatchSettings())


def test_an_extended_structure_comes_as_a_crystal(tmp_path):
    (contents,) = structures(put(tmp_path, "rutile.cif", rutile_cif()))
    assert contents.networks
    assert not contents.molecules


def test_a_charge_for_several_molecules_is_refused(tmp_path):
    two = cif(
        [*tetraoxo("Cr"), "Mo1 Mo 0.6 0.6 0.6", *(f"P{k} O {x} {y} {z}" for k, (x, y, z) in enumerate(MOLYBDATE))]
    )
    path = put(tmp_path, "two.cif", two)
    assert len(structures(path)) == 2
    (item,) = pieces(SourceFile(str(path), charge=-2), **LIMITS)
    with pytest.raises(EhmoError, match="2 molecules"):
        read_structures(item, BatchSettings())


MOLYBDATE = ((0.713, 0.713, 0.713), (0.487, 0.487, 0.713), (0.487, 0.713, 0.487), (0.713, 0.487, 0.487))


def test_pieces_over_the_limit_are_refused(tmp_path):
    long_comment = put(tmp_path, "long.xyz", "5\n" + "x" * 5000 + "\n" + many_frames(1).split("\n", 2)[2])
    (item,) = pieces(SourceFile(str(long_comment)), max_atoms=100, max_bytes=1000)
    with pytest.raises(EhmoError, match="larger than 1000 bytes"):
        read_structures(item, BatchSettings())


def test_a_file_of_many_frames_is_never_held_as_a_whole(tmp_path):
    path = put(tmp_path, "many.xyz", many_frames(20_000))
    tracemalloc.start()
    count = sum(1 for _ in work_items([str(path)]))
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert count == 20_000
    assert peak < path.stat().st_size / 10


def test_items_travel_as_plain_data(tmp_path):
    path = put(tmp_path, "many.xyz", many_frames(2))
    for item in pieces(SourceFile(str(path), charge=-1, tags=("a", "b")), **LIMITS):
        assert item_of(plain_item(item)) == item
