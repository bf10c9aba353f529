"""Exports hold what the store holds; pandas, pyarrow, csv and ASE read them as the outside check."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import ase.io
import numpy as np
import pandas
import pytest
from ase.db import connect
from hypothesis import given
from hypothesis import strategies as st
from pyarrow import parquet

import ehmo as program
from ehmo.calculate.crystal_report import crystal_report
from ehmo.report.bands_document import crystal_document
from ehmo.report.export.tables import csv_cell
from ehmo.store import StoredRow, open_store
from ehmo.store.columns import TABLES
from ehmo.structure import ase_database_rows, crystal_contents, read_frames
from tests.crystal.test_report import QUICK, RUTILE
from tests.geometries import SPECIES
from tests.store.rows import done, key, provenance

SPECIES_OF = {1: "[VO(OH2)5]2+", 2: "MnO4 -", 3: "VOCl3", 5: "UO2 2+"}


@pytest.fixture
def exported(ehmo, filled):
    """Run ``ehmo export`` on the filled store."""

    def run(target: str, *words: str) -> Path:
        ran = ehmo("export", filled, "--to", target, *words)
        assert (ran.status, ran.err) == (0, "")
        return Path(target)

    return run


def expected(location: str, table: str) -> pandas.DataFrame:
    with open_store(location, read_only=True) as store:
        return pandas.DataFrame(store.table(table))


@pytest.mark.parametrize("table", ["bonds", "structures"])
def test_csv(exported, filled, table):
    texts = {column.name: str for column in TABLES[table] if column.kind == "text"}
    found = pandas.read_csv(exported("a.csv", "--rows", table), dtype=texts)
    wanted = expected(filled, table)
    assert list(found.columns) == [column.name for column in TABLES[table]]
    assert len(found) == len(wanted) == {"bonds": 6 + 4 + 4 + 2, "structures": 5}[table]
    for column in TABLES[table]:
        if column.kind == "text":
            kept = [text.removeprefix("'") for text in found[column.name].fillna("")]
            assert kept == list(wanted[column.name].fillna(""))
        else:
            np.testing.assert_array_equal(found[column.name].to_numpy(float), wanted[column.name].to_numpy(float))


@pytest.mark.parametrize("table", ["bonds", "structures"])
def test_parquet(exported, filled, table):
    path = exported("a.parquet", "--rows", table)
    found = pandas.read_parquet(path)
    for column in TABLES[table]:
        wanted = expected(filled, table)[column.name]
        if column.kind == "text":
            assert list(found[column.name].fillna("")) == list(wanted.fillna(""))
        else:
            np.testing.assert_array_equal(found[column.name].to_numpy(float), wanted.to_numpy(float))
    schema = parquet.read_schema(path)
    for column in TABLES[table]:
        kept = schema.field(column.name)
        assert kept.metadata == {b"unit": column.unit.encode(), b"meaning": column.meaning.encode()}
        assert str(kept.type) == {"text": "string", "integer": "int64", "real": "double"}[column.kind]
    assert json.loads(schema.metadata[b"ehmo"])["program_version"] == program.__version__


@pytest.mark.parametrize("table", ["bonds", "structures"])
def test_json_table(exported, filled, table):
    document = json.loads(exported("a.json", "--rows", table).read_text())
    assert document["schema"] == "ehmo export 1"
    assert [column["name"] for column in document["columns"]] == [column.name for column in TABLES[table]]
    with open_store(filled, read_only=True) as store:
        names = [column.name for column in TABLES[table]]
        assert document["rows"] == [dict(zip(names, cells, strict=True)) for cells in store.cells(table)]


def test_json_records_are_the_full_rows(exported, filled):
    document = json.loads(
        exported("a.json", "--rows", "records", "--where", "metals = 'Mn' or charge is null").read_text()
    )
    with open_store(filled, read_only=True) as store:
        rows = [row for row in store.rows() if row.key in (key(2), key(4))]
    assert document["where"] == "metals = 'Mn' or charge is null"
    assert [row["document"] for row in document["rows"]] == [row.document for row in rows]
    assert [row["message"] for row in document["rows"]] == ["", "a.xyz: no metal; give a complex"]


def test_chosen_columns_and_a_condition(exported):
    path = exported("a.csv", "--columns", "mayer, bond ,source", "--where", "kind = 'oxo' and metal = 'V'")
    rows = list(csv.reader(path.read_text().splitlines()))
    assert rows[0] == ["mayer", "bond", "source"]
    assert [row[1:] for row in rows[1:]] == [["V1-O2", "folder/aqua vanadyl.xyz"], ["V1-O2", "'=cmd|' /C calc'!A0"]]


def test_text_cannot_start_a_formula(exported):
    lines = exported("a.csv", "--rows", "structures", "--columns", "source,charge").read_text().splitlines()
    assert lines[3] == "\"'=cmd|' /C calc'!A0\",0"
    assert lines[2].endswith(",-1")  # a number stays a number


@given(st.text())
def test_csv_cells_are_inert_and_keep_their_text(text):
    written = csv_cell(text)
    (found,) = next(csv.reader([written]), [""])
    assert written.isprintable()
    assert not found.lstrip().startswith(("=", "+", "-", "@", "\uff1d", "\uff0b", "\uff0d", "\uff20"))
    shown = text if text.isprintable() else None
    if shown is not None:
        assert found in (shown, f"'{shown}")


def test_xyz_goes_back_in(exported):
    path = exported("a.xyz")
    fragments = read_frames(path)
    frames = ase.io.read(path, index=":", format="extxyz")
    assert len(fragments) == len(frames) == 4
    for fragment, frame, name in zip(fragments, frames, SPECIES_OF.values(), strict=True):
        species = SPECIES[name]
        assert fragment.symbols == species.symbols == tuple(frame.get_chemical_symbols())
        np.testing.assert_allclose(fragment.positions_A, species.positions_A, atol=1e-8)
        assert (fragment.charge, fragment.unpaired_electrons) == (species.charge, species.unpaired_electrons)
        assert frame.arrays["mulliken_charge"].sum() == pytest.approx(species.charge, abs=1e-4)
        assert frame.arrays["spin_population"].sum() == pytest.approx(species.unpaired_electrons, abs=1e-4)
    assert frames[0].info["key"] == key(1)
    assert frames[0].info["entry"] == "frame 1"


@pytest.mark.parametrize("text", ['a" charge=5 b="', "a\nO 0 0 0", "a\\", 'a\\" charge=5', "Lattice=x", "\u2028"])
def test_names_change_nothing_in_an_xyz_file(ehmo, location, text):
    with open_store(location, create=True) as store:
        store.write([done(1, "MnO4 -", source=text, entry=text)])
    assert ehmo("export", location, "--to", "a.xyz").status == 0
    (fragment,) = read_frames("a.xyz")
    assert (len(fragment), fragment.charge) == (5, -1)
    assert len(ase.io.read("a.xyz", index=":", format="extxyz")) == 1


def test_ase_database(exported, filled):
    path = exported("a.db")
    rows = list(connect(path).select())
    assert len(rows) == 4
    with open_store(filled, read_only=True) as store:
        wanted = list(store.rows(status="done"))
    for row, full, name in zip(rows, wanted, SPECIES_OF.values(), strict=True):
        atoms = row.toatoms()
        assert tuple(atoms.get_chemical_symbols()) == SPECIES[name].symbols
        np.testing.assert_allclose(atoms.positions, SPECIES[name].positions_A)
        assert row.total_charge == SPECIES[name].charge
        assert row.charge == pytest.approx(SPECIES[name].charge, abs=1e-6)  # ASE's own: sum of the charges
        assert row.data["ehmo"]["document"] == full.document
        assert (row.key, row.parameter_set) == (full.key, "standard")
    assert rows[0].source == "folder/aqua vanadyl.xyz"
    assert "source" not in rows[3].key_value_pairs  # "7" would come back as a number
    assert connect(path).count("unpaired_electrons=1,metals=V") == 1


def test_ase_database_goes_back_in(exported):
    for fragment, name in zip(read_frames(exported("a.db")), SPECIES_OF.values(), strict=True):
        species = SPECIES[name]
        assert (fragment.charge, fragment.unpaired_electrons) == (species.charge, species.unpaired_electrons)
        np.testing.assert_array_equal(fragment.positions_A, species.positions_A)


@pytest.mark.parametrize("target", ["a.csv", "a.parquet", "a.json", "a.xyz", "a.db"])
def test_nothing_that_meets_the_condition_gives_an_empty_file_of_the_format(exported, target):
    path = exported(target, "--where", "charge = 77")
    if target == "a.csv":
        assert path.read_text().count("\n") == 1
    elif target == "a.parquet":
        assert len(pandas.read_parquet(path)) == 0
    elif target == "a.json":
        assert json.loads(path.read_text())["rows"] == []
    elif target == "a.xyz":
        assert path.read_text() == ""
    else:
        assert connect(path).count() == 0


def test_what_is_said(ehmo, filled):
    shown = "results.sqlite" if "results" in filled else "postgresql://tester:***@"
    assert ehmo("export", filled, "--to", "a.csv").out.startswith("a.csv: 16 bonds of ")
    said = ehmo("export", filled, "--to", "a.xyz", "--where", "charge is null or metals = 'U'").out
    assert said.startswith("a.xyz: 1 structure (1 failed structure left out) of ")
    assert shown in said


def test_an_export_replaces_an_older_one(exported, put):
    put("the old export", "a.csv")
    assert exported("a.csv").read_text().startswith("key,")


def test_more_rows_than_a_page_and_a_window(ehmo, tmp_path, monkeypatch):
    monkeypatch.setattr("ehmo.store.reading.WINDOW", 7)
    monkeypatch.setattr("ehmo.store.reading.PAGE", 7)
    monkeypatch.setattr("ehmo.report.export.parquet.ROW_GROUP", 7)
    with open_store(tmp_path / "a.sqlite", create=True) as store:
        store.write([done(number, "MnO4 -", source=f"{number}.xyz") for number in range(30)])
    for target in ("a.csv", "a.parquet", "a.xyz"):
        assert ehmo("export", "a.sqlite", "--to", target).status == 0
    wanted = [f"{number}.xyz" for number in range(30) for _ in range(4)]
    assert list(pandas.read_csv("a.csv")["source"]) == wanted
    assert list(pandas.read_parquet("a.parquet")["source"]) == wanted
    assert [frame.info["source"] for frame in ase.io.read("a.xyz", index=":")] == wanted[::4]


@pytest.fixture(scope="module")
def rutile(tmp_path_factory) -> StoredRow:
    """Row of an extended structure."""
    path = tmp_path_factory.mktemp("rutile") / "rutile.cif"
    path.write_text(RUTILE)
    report = crystal_report(crystal_contents(path), crystal=QUICK)
    return StoredRow(key(9), "done", "", crystal_document(report), provenance(source="rutile.cif"))


def test_crystals_keep_their_cell(ehmo, tmp_path, rutile):
    with open_store(tmp_path / "a.sqlite", create=True) as store:
        store.write([rutile, done(1, "VOCl3")])
    for target in ("a.xyz", "a.db"):
        assert ehmo("export", "a.sqlite", "--to", target).status == 0
    cell = np.array(rutile.document["crystal"]["cell_A"])
    for frames in (ase.io.read("a.xyz", index=":"), [row.toatoms() for row in connect("a.db").select()]):
        crystal, molecule = frames
        assert crystal.pbc.all()
        assert not molecule.pbc.any()
        np.testing.assert_allclose(crystal.cell[:], cell, atol=1e-8)
        assert crystal.get_chemical_formula(mode="metal") == "Ti2O4"
    (first, *_) = ase_database_rows(tmp_path / "a.db")
    assert [network.reduced_formula for network in first.contents.networks] == ["O2Ti"]


def test_a_crystal_in_the_tables(ehmo, tmp_path, rutile):
    with open_store(tmp_path / "a.sqlite", create=True) as store:
        store.write([rutile])
    ehmo("export", "a.sqlite", "--to", "a.parquet")
    found = pandas.read_parquet("a.parquet")
    assert found["metal"].tolist() == ["Ti"] * len(rutile.document["bonds"])
    np.testing.assert_array_equal(found["mayer"], [bond["mayer"] for bond in rutile.document["bonds"]])
    assert found["charge"].isna().all()


def test_rows_that_come_while_an_export_runs_do_no_harm(tmp_path, monkeypatch):
    monkeypatch.setattr("ehmo.store.reading.PAGE", 3)
    path = tmp_path / "a.sqlite"
    first, later = [done(k, "MnO4 -") for k in range(10)], [done(k, "MnO4 -") for k in range(10, 14)]
    with open_store(path, create=True) as writer, open_store(path, read_only=True) as reader:
        writer.write(first)
        rows = reader.rows()
        found = [next(rows) for _ in range(4)]
        writer.write(later)
        found += rows
    assert found == first + later
