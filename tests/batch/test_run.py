"""Batches in one process: rows, failures, going on, retrying."""

from __future__ import annotations

import ast
import json
import re
from pathlib import Path
from urllib.parse import quote, unquote

import pytest

import ehmo as package
from ehmo.batch import BatchSettings, InProcess, run_batch, work_items
from ehmo.batch.items import with_parameters
from ehmo.batch.progress import Progress, progress_line
from ehmo.batch.run import BatchResult
from ehmo.errors import StoreError
from ehmo.report.document import bond_document
from ehmo.store import open_store
from tests.batch.files import chromate_cif, many_frames, put, rutile_cif, xyz_text
from tests.geometries import SPECIES

SETTINGS = with_parameters(BatchSettings(), "standard")


def batch(sources, location, **changes):
    with open_store(location, create=True) as store:
        return run_batch(work_items([str(one) for one in sources]), store, InProcess(), SETTINGS, **changes)


def rows(location):
    with open_store(location, read_only=True) as store:
        return list(store.rows())


@pytest.fixture(params=["sqlite", "postgresql"])
def location(request, tmp_path) -> str:
    return str(tmp_path / "r.sqlite") if request.param == "sqlite" else request.getfixturevalue("database")


def test_rows_hold_the_reports_of_single_calculations(tmp_path, location):
    names = ["[VO(OH2)5]2+", "CrO4 2-", "[MoOCl4]-"]
    path = put(tmp_path, "three.xyz", "".join(map(xyz_text, names)))
    result = batch([path], location)
    assert (result.done, result.failed, result.skipped) == (3, 0, 0)
    for row, fragment in zip(rows(location), package.read_frames(path), strict=True):
        assert row.status == "done"
        assert row.document == json.loads(json.dumps(bond_document(package.bond_report(fragment))))
        assert row.provenance.source == str(path)
        assert row.provenance.results_edition == 1
        assert row.provenance.parameter_sha256 == SETTINGS.parameter_sha256
        assert 0 < row.provenance.duration_s < 60
        assert re.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d\.\d{3}Z", row.provenance.started_utc)
    assert [row.provenance.entry for row in rows(location)] == ["frame 1", "frame 2", "frame 3"]


FAILURES = {
    "no-metal.xyz": ("3\nwater charge=0\nO 0 0 0\nH 0 0 0.96\nH 0.93 0 -0.24\n", "metal"),
    "empty.xyz": ("", "the file is empty"),
    "cut.xyz": ("5\nx\nV 0 0 0\n", "stops after 1 of 5 atoms"),
    "binary.cif": (b"data_\0\0", "binary"),
    "odd.xyz": (xyz_text("CrO4 2-").replace("charge=-2", "charge=-1"), "Cr(VII)"),
    "overlap.xyz": ("3\ncharge=0 unpaired=0\nV 0 0 0\nO 0 0 1.6\nO 0 0 1.6001\n", "O2"),
    "unknown.xyz": ("2\n\nV 0 0 0\nQq 0 0 1.6\n", "unknown element"),
    "text.mol": ("nothing", "cannot be read"),
}


def test_failures_are_rows_with_their_cause_and_the_rest_is_right(tmp_path):
    folder = tmp_path / "set"
    for name, (text, _) in FAILURES.items():
        put(folder, name, text)
    put(folder, "good.xyz", many_frames(3))
    put(folder, "good.cif", chromate_cif())
    location = str(tmp_path / "r.sqlite")
    result = batch([folder], location)
    assert (result.done, result.failed) == (4, len(FAILURES))
    messages = {row.provenance.source: row.message for row in rows(location) if row.status == "failed"}
    for name, (_, words) in FAILURES.items():
        message = messages[str(folder / name)]
        assert words in message
        assert str(folder / name) in message
        assert message.isprintable()
    assert sum(result.reasons.values()) == len(FAILURES)


def test_a_rerun_goes_on_where_the_last_one_stopped(tmp_path):
    path = put(tmp_path, "many.xyz", many_frames(8))
    location = str(tmp_path / "r.sqlite")

    class Stopped(BaseException):
        pass

    def stop(result):
        if result.done == 5:
            raise Stopped

    with pytest.raises(Stopped):
        batch([path], location, on_progress=stop)
    before = rows(location)
    assert len(before) == 5, "what was finished is kept"
    result = batch([path], location)
    assert (result.done, result.skipped) == (3, 5)
    after = rows(location)
    assert [row.provenance.started_utc for row in after[:5]] == [row.provenance.started_utc for row in before]
    assert len({row.key for row in after}) == len(after) == 8
    assert batch([path], location).skipped == 8


def test_the_same_structure_in_other_files_is_not_calculated_twice(tmp_path):
    location = str(tmp_path / "r.sqlite")
    batch([put(tmp_path, "a.xyz", xyz_text("OsO4"))], location)
    stated = put(tmp_path, "b.xyz", xyz_text("OsO4").replace("unpaired=0", ""))
    assert batch([stated], location).skipped == 1


def test_failed_ones_are_tried_again_only_when_asked(tmp_path):
    location = str(tmp_path / "r.sqlite")
    path = put(tmp_path, "a.xyz", "2\ncharge=0\nV 0 0 0\nQq 0 0 1\n" + xyz_text("OsO4"))
    batch([path], location)
    assert batch([path], location).skipped == 2
    again = batch([path], location, retry_failed=True)
    assert (again.done, again.failed, again.skipped) == (0, 1, 1)
    assert len(rows(location)) == 2


def test_a_retry_that_succeeds_replaces_the_failure(tmp_path):
    location = str(tmp_path / "r.sqlite")
    path = put(tmp_path, "a.xyz", xyz_text("[VO(OH2)5]2+"))
    with open_store(location, create=True) as store:
        few = BatchSettings(options=package.Options(max_functions=10))
        run_batch(work_items([str(path)]), store, InProcess(), with_parameters(few, "standard"))
    assert [row.status for row in rows(location)] == ["failed"]
    batch([path], location, retry_failed=True)
    assert [(row.status, row.message) for row in rows(location)] == [("done", "")]


def test_a_store_that_cannot_be_written_ends_the_run_and_keeps_what_it_had(tmp_path):
    path = put(tmp_path, "many.xyz", many_frames(3))
    location = str(tmp_path / "r.sqlite")
    batch([path], location)
    before = rows(location)
    with open_store(location, read_only=True) as store, pytest.raises(StoreError, match="reading only"):
        run_batch(work_items([str(put(tmp_path, "b.xyz", xyz_text("CrO4 2-")))]), store, InProcess(), SETTINGS)
    assert rows(location) == before


def test_an_unexpected_error_becomes_a_row_that_names_it(tmp_path, monkeypatch):
    location = str(tmp_path / "r.sqlite")

    def broken(*_):
        raise ZeroDivisionError("\x1b[31mdivision")

    monkeypatch.setattr("ehmo.calculate.report._report", broken)
    batch([put(tmp_path, "a.xyz", xyz_text("OsO4"))], location)
    (row,) = rows(location)
    assert "unexpected ZeroDivisionError: \\x1b[31mdivision" in row.message


# The command.


def test_the_command_says_what_happened(ehmo, tmp_path):
    put(tmp_path, "set/good.xyz", many_frames(2))
    put(tmp_path, "set/bad.xyz", "2\n\nV 0 0 0\nQq 0 0 1.6\n")
    ran = ehmo("batch", "set", "--store", "r.sqlite")
    assert (ran.status, ran.err) == (0, "")
    assert "3 structures: 2 calculated, 1 failed, 0 were in the store." in ran.out
    assert "1  unknown element 'Qq'" in ran.out
    again = ehmo("batch", "set", "--store", "r.sqlite")
    assert "3 structures: 0 calculated, 0 failed, 3 were in the store." in again.out
    retried = ehmo("batch", "set", "--store", "r.sqlite", "--retry", "failed")
    assert "3 structures: 0 calculated, 1 failed, 2 were in the store." in retried.out


def test_manifest_charge_spin_and_tags_reach_the_row(ehmo, tmp_path):
    bare = xyz_text("[FeO(OH2)5]2+").replace("charge=2 unpaired=4", "")
    put(tmp_path, "set/a.xyz", bare)
    put(tmp_path, "set/list.csv", 'path,charge,unpaired,tags\na.xyz,2,4,"=1+1;\x1b[31mred"\n')
    assert ehmo("batch", "set/list.csv", "--store", "r.sqlite").status == 0
    (row,) = rows(tmp_path / "r.sqlite")
    assert row.provenance.tags == ("=1+1", "\x1b[31mred")
    assert (row.document["fragment"]["charge"], row.document["fragment"]["unpaired_electrons"]) == (2, 4)
    assert row.document["fragment"]["charge_reason"] == "given"


def test_options_change_rows(ehmo, tmp_path):
    put(tmp_path, "a.xyz", xyz_text("OsO4"))
    ehmo("batch", "a.xyz", "--store", "r.sqlite")
    ehmo("batch", "a.xyz", "--store", "r.sqlite", "--charges", "fixed", "--K", "1.9")
    ehmo("batch", "a.xyz", "--store", "r.sqlite", "--spread", "4")
    own = put(tmp_path, "mine.csv", ehmo("params", "show", "standard").out)
    ehmo("batch", "a.xyz", "--store", "r.sqlite", "--params", str(own))
    found = rows(tmp_path / "r.sqlite")
    assert [row.document["method"]["charge_model"] for row in found][:2] == ["self-consistent", "fixed"]
    assert found[1].document["method"]["K"] == 1.9
    assert found[2].document["spread"]["draws"] == 4


def test_an_oxide_is_stored_as_a_crystal(ehmo, tmp_path):
    put(tmp_path, "r.cif", rutile_cif())
    ran = ehmo("batch", "r.cif", "--store", "r.sqlite", "--mesh", "2,2,2", "--charges", "fixed")
    assert "1 calculated" in ran.out
    (row,) = rows(tmp_path / "r.sqlite")
    assert row.document["schema"] == row.provenance.document_schema == "ehmo crystal report 1"
    assert row.document["mesh"]["counts"] == [2, 2, 2]


def test_rows_of_an_ase_database_are_structures_with_tags(ehmo, tmp_path):
    from ase import Atoms
    from ase.db import connect

    with connect(tmp_path / "ase.db") as database:
        for name in ("OsO4", "CrO4 2-"):
            species = SPECIES[name]
            atoms = Atoms(species.symbols, species.positions_A)
            database.write(atoms, total_charge=species.charge, unpaired=species.unpaired_electrons, colour="yellow")
        database.write(Atoms("H2O", [[0, 0, 0], [0, 0, 0.96], [0.93, 0, -0.24]]), total_charge=0)
    assert "2 calculated, 1 failed" in ehmo("batch", "ase.db", "--store", "r.sqlite").out
    found = sorted(rows(tmp_path / "r.sqlite"), key=lambda row: row.provenance.entry)
    assert [row.provenance.entry for row in found] == ["row 1", "row 2", "row 3"]
    assert {row.provenance.tags for row in found} == {("colour=yellow",), ()}
    assert [row.document["fragment"]["charge"] for row in found[:2]] == [0, -2]
    assert "3 were in the store" in ehmo("batch", "ase.db", "--store", "r.sqlite").out


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("absent.xyz",), "no such file"),
        (("a.xyz", "--shard", "3/2"), "--shard '3/2' is no part"),
        (("a.xyz", "--shard", "one/2"), "is no part"),
        (("a.xyz", "--mesh", "2,2"), "is no mesh"),
        (("a.xyz", "--params", "none"), "none"),
    ],
)
def test_refusals_leave_no_store(refused, tmp_path, words, said):
    put(tmp_path, "a.xyz", xyz_text("OsO4"))
    assert said in refused("batch", *words, "--store", "r.sqlite")


def test_shards_fill_the_store_together(ehmo, tmp_path):
    put(tmp_path, "many.xyz", many_frames(5))
    for part in ("1/2", "2/2"):
        assert ehmo("batch", "many.xyz", "--store", f"{part[0]}.sqlite", "--shard", part).status == 0
    keys = [[row.key for row in rows(tmp_path / f"{k}.sqlite")] for k in (1, 2)]
    assert [len(part) for part in keys] == [3, 2]
    ehmo("batch", "many.xyz", "--store", "whole.sqlite")
    assert sorted([*keys[0], *keys[1]]) == sorted(row.key for row in rows(tmp_path / "whole.sqlite"))


class Terminal:
    def __init__(self, is_terminal: bool):
        self.is_terminal, self.text = is_terminal, ""

    def isatty(self):
        return self.is_terminal

    def write(self, text):
        self.text += text

    def flush(self):
        pass


def test_progress_is_one_line_on_a_terminal_and_silent_elsewhere():
    result = BatchResult(done=10, failed=1, size_done=500, elapsed_s=5.0)
    terminal, pipe = Terminal(True), Terminal(False)
    for stream in (terminal, pipe):
        progress = Progress(stream, 1000)
        progress.show(result)
        progress.show(result)
        progress.close()
    assert terminal.text == f"\r{progress_line(result, 1000)}\x1b[K\r\x1b[K"
    assert "2.2 per second; about 5 s left" in terminal.text
    assert pipe.text == ""


def test_a_password_in_the_address_is_neither_shown_nor_stored(ehmo, tmp_path, database):
    put(tmp_path, "a.xyz", xyz_text("OsO4"))
    ran = ehmo("batch", "a.xyz", "--store", database, "--workers", "0")
    assert ran.status == 0
    secret = unquote(database.split("@127")[0].rsplit(":", 1)[1])
    for words in (ran.out, ran.err, repr(rows(database))):
        assert secret not in words
        assert quote(secret, safe="") not in words


@pytest.mark.parametrize("folder", ["batch", "store"])
def test_nothing_is_unpickled(folder):
    # Whoever unpickles a file runs what its writer wanted.
    forbidden = {"pickle", "marshal", "shelve", "dill", "cloudpickle", "joblib"}
    for path in (Path(package.__file__).parent / folder).glob("*.py"):
        for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
            names = [alias.name for alias in node.names] if isinstance(node, ast.Import) else []
            names += [node.module or ""] if isinstance(node, ast.ImportFrom) else []
            assert not forbidden & {name.split(".")[0] for name in names}, path
