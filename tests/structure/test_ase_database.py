"""Rows of ASE databases: what ASE itself writes and reads is the outside check."""

from __future__ import annotations

import sqlite3
from contextlib import closing

import numpy as np
import pytest
from ase import Atoms
from ase.build import bulk
from ase.constraints import FixAtoms
from ase.db import connect

import ehmo
from ehmo.errors import EhmoError, InputError
from ehmo.structure import ase_database_rows, read_frames
from tests.geometries import SPECIES


def atoms_of(name: str) -> Atoms:
    species = SPECIES[name]
    return Atoms(species.symbols, species.positions_A)


@pytest.fixture
def path(tmp_path):
    return tmp_path / "structures.db"


def test_atoms_are_those_that_ase_reads(path):
    names = ["[VO(OH2)5]2+", "MnO4 -", "VOCl3"]
    with connect(path) as database:
        for name in names:
            species = SPECIES[name]
            database.write(atoms_of(name), total_charge=species.charge, unpaired=species.unpaired_electrons)
    rows = list(ase_database_rows(path))
    assert [row.entry for row in rows] == ["row 1", "row 2", "row 3"]
    for name, row, expected in zip(names, rows, connect(path).select(), strict=True):
        (fragment,) = row.fragments
        assert row.fault == ""
        assert fragment.symbols == tuple(expected.symbols)
        np.testing.assert_array_equal(fragment.positions_A, expected.positions)
        assert (fragment.charge, fragment.unpaired_electrons) == (
            SPECIES[name].charge,
            SPECIES[name].unpaired_electrons,
        )


def test_charge_and_spin_from_initial_charges_and_moments(path):
    atoms = atoms_of("[VO(OH2)5]2+")
    atoms.set_initial_charges([2.0, *[0.0] * (len(atoms) - 1)])
    atoms.set_initial_magnetic_moments([1.0, *[0.0] * (len(atoms) - 1)])
    connect(path).write(atoms)
    (fragment,) = next(ase_database_rows(path)).fragments
    assert connect(path).get(id=1).charge == 2.0
    assert (fragment.charge, fragment.unpaired_electrons) == (2, 1)
    report = ehmo.bond_report(fragment)
    assert "charge +2: sum of the initial charges in the ASE database" in report.assumptions
    assert any("initial magnetic moments" in note for note in report.assumptions)


@pytest.mark.parametrize(
    "charges",
    [None, [0.0] * 5, [0.4, 0.0, 0.0, 0.0, 0.0], [float("nan"), 0.0, 0.0, 0.0, 0.0], [1e9, 0.0, 0.0, 0.0, 0.0]],
)
def test_charges_that_state_nothing(path, charges):
    atoms = atoms_of("VOCl3")
    if charges is not None:
        atoms.set_initial_charges(charges)
    connect(path).write(atoms)
    (fragment,) = next(ase_database_rows(path)).fragments
    assert (fragment.charge, fragment.unpaired_electrons) == (None, None)


def test_stated_charge_goes_before_initial_charges(path):
    atoms = atoms_of("MnO4 -")
    atoms.set_initial_charges([2.0, 0.0, 0.0, 0.0, 0.0])
    connect(path).write(atoms, total_charge=-1)
    (fragment,) = next(ase_database_rows(path)).fragments
    assert fragment.charge == -1


def test_other_pairs_are_tags_and_the_name_is_the_title(path):
    connect(path).write(atoms_of("VOCl3"), total_charge=0, name="oxychloride", batch=7, good=True)
    row = next(ase_database_rows(path))
    assert row.tags == ("name=oxychloride", "batch=7", "good=True")
    assert row.fragments[0].title == "oxychloride"
    assert row.fragments[0].source == f"{path}, row 1"


def test_constraints_calculators_and_data_are_left_alone(path):
    atoms = atoms_of("VOCl3")
    atoms.set_constraint(FixAtoms([0]))
    connect(path).write(atoms, data={"array": np.arange(3)})
    with closing(sqlite3.connect(path)) as raw:
        # What cannot even be decoded does not matter.
        raw.execute("UPDATE systems SET constraints = 'no', calculator_parameters = '{', data = x'ff00'")
        raw.commit()
    row = next(ase_database_rows(path))
    assert (row.fault, len(row.fragments[0])) == ("", 5)


def test_molecules_in_a_cell_and_extended_structures(path):
    molecule = atoms_of("VOCl3")
    molecule.center(vacuum=4.0)
    molecule.pbc = True
    with connect(path) as database:
        database.write(molecule, total_charge=0)
        database.write(bulk("TiO", "rocksalt", a=4.18), total_charge=0)  # NaCl-type TiO, a 4.18 (memory)
    whole, extended = ase_database_rows(path)
    assert len(whole.fragments[0]) == 5
    assert whole.fragments[0].charge == 0
    assert extended.fragments == ()
    assert [network.dimension for network in extended.contents.networks] == [3]


def test_more_rows_than_a_page(path):
    with connect(path) as database:
        for number in range(250):
            database.write(atoms_of("VOCl3"), number=number)
        del database[120]
    assert [row.number for row in ase_database_rows(path)] == [n for n in range(1, 251) if n != 120]


FAULTS = {
    "pairs": ("key_value_pairs = 'nothing'", "key-value pairs cannot be read"),
    "pairs that are no object": ("key_value_pairs = '[1]'", "key-value pairs cannot be read"),
    "charge": ("""key_value_pairs = '{"total_charge": "much"}'""", "no whole number"),
    "bare spin": ("""key_value_pairs = '{"spin": 1}'""", "may be S, 2S or 2S+1"),
    "few numbers": ("numbers = x'c8'", "do not fit together"),
    "element": ("numbers = x'c800000008000000110000001100000011000000'", "atomic number 200 at atom 1"),
    "no positions": ("positions = NULL", "do not fit together"),
    "few positions": ("positions = x'0000000000000000'", "do not fit together"),
    "text": ("positions = 'abc', numbers = 'def'", "do not fit together"),
    "not finite": ("positions = x'" + "000000000000f07f" * 15 + "'", "non-finite coordinates at atom 1"),
}


@pytest.mark.parametrize("name", FAULTS)
def test_a_bad_row_is_told_and_the_others_come(path, name):
    change, words = FAULTS[name]
    with connect(path) as database:
        for _ in range(3):
            database.write(atoms_of("VOCl3"))
    with closing(sqlite3.connect(path)) as raw:
        raw.execute(f"UPDATE systems SET {change} WHERE id = 2")
        raw.commit()
    rows = list(ase_database_rows(path))
    assert [bool(row.fault) for row in rows] == [False, True, False]
    assert words in rows[1].fault
    assert f"{path}, row 2" in rows[1].fault
    with pytest.raises(EhmoError, match="row 2"):
        read_frames(path)


def test_a_row_over_the_limit_of_atoms_is_not_loaded(path):
    with connect(path) as database:
        database.write(atoms_of("VOCl3"))
        database.write(atoms_of("[VO(OH2)5]2+"))
    small, large = ase_database_rows(path, max_atoms=5)
    assert small.fault == ""
    assert "17 atoms, the limit is 5" in large.fault


def test_a_sqlite_file_of_another_kind_is_refused_and_left_as_it_was(path):
    with closing(sqlite3.connect(path)) as raw:
        raw.execute("CREATE TABLE notes (text)")
        raw.execute("CREATE VIEW systems AS SELECT text AS id FROM notes")
        raw.commit()
    before = path.read_bytes()
    with pytest.raises(InputError, match="without ASE structures"):
        list(ase_database_rows(path))
    assert path.read_bytes() == before


def test_a_damaged_database_is_refused(path):
    with connect(path) as database:
        for _ in range(200):
            database.write(atoms_of("[VO(OH2)5]2+"))
    path.write_bytes(path.read_bytes()[:20_000])
    with pytest.raises(InputError, match="cannot be read as an ASE database"):
        list(ase_database_rows(path))


def test_all_rows_as_frames(path):
    with connect(path) as database:
        database.write(atoms_of("VOCl3"), total_charge=0)
        database.write(atoms_of("MnO4 -"), total_charge=-1)
    assert [fragment.charge for fragment in read_frames(path)] == [0, -1]
    with pytest.raises(EhmoError, match="max-bytes"):
        read_frames(path, max_bytes=100)
