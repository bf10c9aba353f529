"""Which files the sources name, and which they may not lead to."""

from __future__ import annotations

import os

import pytest

from ehmo.batch.items import BatchSettings
from ehmo.batch.sources import source_files, work_items
from ehmo.batch.work import read_structures
from ehmo.errors import EhmoError, InputError
from tests.batch.files import chromate_cif, many_frames, put, xyz_text


@pytest.fixture
def tree(tmp_path):
    """Folder with files, sub-folders, and links within it and out of it."""
    root = tmp_path / "set"
    put(root, "b.xyz", many_frames(2))
    put(root, "a.cif", chromate_cif())
    put(root, "sub/c.XYZ", many_frames(1))
    put(root, "notes.txt", "not a structure")
    secret = put(tmp_path, "elsewhere/secret.xyz", xyz_text("OsO4"))
    (root / "link.xyz").symlink_to("b.xyz")
    (root / "out.xyz").symlink_to(secret)
    (root / "outfolder").symlink_to(secret.parent)
    (root / "sub" / "loop").symlink_to(root)
    (root / "dangling.xyz").symlink_to("nowhere.xyz")
    return root


def named(files, root):
    return {os.path.relpath(file.path, root): file.fault.split("\n")[0] for file in files}


def test_a_folder_gives_its_structure_files_and_refuses_links_out(tree):
    assert named(source_files([str(tree)]), tree) == {
        "a.cif": "",
        "b.xyz": "",
        "dangling.xyz": "",
        "link.xyz": "",
        "out.xyz": "the link or path leads out of the folder",
        "sub/c.XYZ": "",
    }


def test_links_out_are_followed_when_asked(tree):
    found = named(source_files([str(tree)], allow_outside=True), tree)
    assert found["out.xyz"] == ""
    assert found["outfolder/secret.xyz"] == ""
    assert "sub/loop/a.cif" not in found, "each folder is entered once"


def test_a_link_that_leads_nowhere_becomes_a_failure(tree):
    (item,) = (
        work_items([str(tree / "dangling.xyz")])
        if False
        else (item for item in work_items([str(tree)]) if item.source.endswith("dangling.xyz"))
    )
    with pytest.raises(EhmoError, match="no such file"):
        read_structures(item, BatchSettings())


def test_patterns(tree):
    assert named(source_files([f"{tree}/**/*.[xX][yY][zZ]"]), tree).keys() >= {"b.xyz", "sub/c.XYZ", "link.xyz"}
    assert named(source_files([f"{tree}/*.xyz"]), tree)["out.xyz"] != ""
    with pytest.raises(InputError, match="no file fits"):
        list(source_files([f"{tree}/*.nothing"]))


def test_a_missing_source_is_refused_at_once(tmp_path):
    for name in ("absent", "nul\0character"):
        with pytest.raises(InputError, match="no such file"):
            list(source_files([str(tmp_path / name)]))


MANIFEST = """path,tags,unpaired,charge
b.xyz, first ; second ,,
sub/c.XYZ,,0,-2

../elsewhere/secret.xyz,,,
{absolute},,,
out.xyz,,,
b.xyz,,x,
b.xyz,,,1.5
b.xyz,,-1,
,tag,,
b.xyz,,
absent.xyz,,,
"""


def test_a_manifest(tree):
    path = put(tree, "list.csv", MANIFEST.format(absolute=tree.parent / "elsewhere/secret.xyz"))
    good, charged, *bad = source_files([str(path)])
    assert (good.path, good.tags, good.charge, good.unpaired_electrons) == (
        str(tree / "b.xyz"),
        ("first", "second"),
        None,
        None,
    )
    assert (charged.charge, charged.unpaired_electrons) == (-2, 0)
    words = [file.fault.split("\n")[0] for file in bad]
    assert words == [
        *["the link or path leads out of the folder"] * 3,
        "unpaired 'x' is no whole number",
        "charge '1.5' is no whole number",
        "unpaired electrons cannot be negative",
        "no path",
        "3 cells, the manifest has 4 columns",
        "",
    ]
    assert bad[-2].path.endswith("list.csv, line 12")
    allowed = list(source_files([str(path)], allow_outside=True))
    assert sum("leads out" in file.fault for file in allowed) == 0


@pytest.mark.parametrize("text", ["", "file,charge\na.xyz,1\n", "path,spin\na.xyz,1\n", "path,path\na,b\n"])
def test_a_manifest_with_other_columns_is_refused(tmp_path, text):
    path = put(tmp_path, "list.csv", text)
    with pytest.raises(InputError, match=r"list.csv, line 1: .*path,charge,unpaired,tags"):
        list(source_files([str(path)]))


def test_shards_are_disjoint_and_complete(tree):
    whole = list(work_items([str(tree)]))
    parts = [list(work_items([str(tree)], shard=(k, 3))) for k in (1, 2, 3)]
    assert sorted(repr(item) for part in parts for item in part) == sorted(map(repr, whole))
    assert max(map(len, parts)) - min(map(len, parts)) <= 1
