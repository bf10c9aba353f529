"""From a CIF of an extended structure to its report, by the library and by the command."""

from __future__ import annotations

import json
import math
import re
from dataclasses import replace
from pathlib import Path

import ase.io
import numpy as np
import pytest

from ehmo.calculate.crystal import CrystalOptions
from ehmo.calculate.crystal_report import crystal_report
from ehmo.cli import main
from ehmo.errors import InputError
from ehmo.records.options import Options
from ehmo.report.bands_document import crystal_document
from ehmo.report.bands_text import band_blocks, crystal_text
from ehmo.structure import crystal_contents
from ehmo.structure.primitive import primitive_cell
from tests.crystal.structures import REO3, V2O5

RUTILE = """data_rutile
_cell_length_a 4.594
_cell_length_b 4.594
_cell_length_c 2.959
_cell_angle_alpha 90
_cell_angle_beta 90
_cell_angle_gamma 90
_symmetry_space_group_name_H-M 'P 42/m n m'
loop_
_atom_site_label
_atom_site_type_symbol
_atom_site_fract_x
_atom_site_fract_y
_atom_site_fract_z
Ti1 Ti 0 0 0
O1 O 0.3053 0.3053 0
"""
# Rutile: S. C. Abrahams, J. L. Bernstein, J. Chem. Phys. 55, 3206 (1971): a 4.594, c 2.959, x 0.305 (memory).

FLUORITE = """data_fluorite
_cell_length_a 5.4682
_cell_length_b 5.4682
_cell_length_c 5.4682
_cell_angle_alpha 90
_cell_angle_beta 90
_cell_angle_gamma 90
_symmetry_space_group_name_H-M 'F m -3 m'
loop_
_atom_site_label
_atom_site_type_symbol
_atom_site_fract_x
_atom_site_fract_y
_atom_site_fract_z
U1 U 0 0 0
O1 O 0.25 0.25 0.25
"""
# Uraninite: R. W. G. Wyckoff, Crystal Structures 1, 239 (1963): a 5.4682 (memory).

QUICK = CrystalOptions(mesh=(2, 2, 3), path="auto", path_points=12)


def written(tmp_path, text):
    path = tmp_path / "crystal.cif"
    path.write_text(text, encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def report(tmp_path_factory):
    return crystal_report(crystal_contents(written(tmp_path_factory.mktemp("rutile"), RUTILE)), crystal=QUICK)


def test_report_has_both_bonds_of_rutile_with_their_numbers(report):
    lengths = sorted(round(unit.length_A, 2) for unit in report.units)
    assert lengths == [1.95, 1.98]  # 1.949 and 1.980 in the paper (memory)
    assert [report.bonds_per_cell(unit) for unit in report.units] == [8, 4]
    assert sum(report.bonds_per_cell(unit) for unit in report.units) == 12  # two metals, six donors each
    assert report.bonding.gap is not None


def test_bond_lengths_are_those_of_the_bonding(report):
    assert report.bonding.lengths_A == pytest.approx([unit.length_A for unit in report.units], abs=1e-9)


def test_blocks_of_bands_hold_every_band_and_electron(report):
    blocks = band_blocks(report)
    assert sum(block.bands.stop - block.bands.start for block in blocks) == len(report.bonding.basis)
    assert sum(block.electrons for block in blocks) == pytest.approx(report.bonding.electrons.total, abs=1e-6)
    for block in blocks:
        assert sum(block.shares.values()) == pytest.approx(1, abs=1e-9)
    assert next(iter(blocks[0].shares)) == "O 2s"
    assert max(blocks, key=lambda block: block.shares["Ti 3d"]).shares["Ti 3d"] > 0.5


def test_text_says_what_matters(report):
    text = crystal_text(report)
    for part in (
        "Insulator on this mesh",
        "Ti1-O1",
        "Mayer",
        "Mesh 2 x 2 x 3",
        "Convergence with the mesh",
        "O 2p",
        "Along ",
    ):
        assert part in text
    assert text.isprintable() or "\n" in text
    assert max(map(len, text.splitlines())) <= 125


def test_document_is_plain_and_complete(report):
    document = crystal_document(report)
    text = json.dumps(document, allow_nan=False)
    assert json.loads(text)["schema"] == "ehmo crystal report 1"
    assert document["filling"]["kind"] == "insulator"
    assert [bond["multiplicity"] for bond in document["bonds"]] == [8, 4]
    assert len(document["mesh"]["energies_eV"]) == len(document["mesh"]["points"])
    assert math.isclose(sum(document["mesh"]["weights"]), 1)
    density = document["density_of_states"]
    total = np.array(density["total_per_eV"])
    assert total == pytest.approx(sum(np.array(p["per_eV"]) for p in density["projections"]), abs=1e-4)
    assert len(document["crystal_orbital_overlap_population"]["bonds"]) == len(document["bonds"])
    assert document["path"]["path"] == report.bonding.path.path
    assert document["mesh_convergence"]["other_counts"] == [1, 1, 2]


def test_centred_cell_is_calculated_in_its_primitive_cell(tmp_path):
    contents = crystal_contents(written(tmp_path, FLUORITE))
    report = crystal_report(contents, options=Options(charge_model="fixed"), crystal=CrystalOptions(mesh=(3, 3, 3)))
    assert report.cell_ratio == 4
    assert len(report.symbols) == 3
    assert np.linalg.det(report.cell_A) == pytest.approx(5.4682**3 / 4, rel=1e-9)
    (unit,) = report.units
    assert (unit.per_metal, report.bonds_per_cell(unit)) == (8, 8)
    assert report.bonding.lengths_A == pytest.approx([5.4682 * math.sqrt(3) / 4], abs=1e-9)


@pytest.mark.parametrize(
    "vectors", [[(0, 0.5, 0.5), (0.5, 0, 0.5)], [(0.5, 0.5, 0.5)], [(1 / 3, 2 / 3, 2 / 3), (2 / 3, 1 / 3, 1 / 3)]]
)
def test_primitive_cell_of_every_centring_by_spglib_rules(vectors):
    cell = np.array([[5.0, 0, 0], [-2.5, 5.0 * math.sqrt(0.75), 0], [0, 0, 7.0]])
    centrings = [np.zeros(3), *map(np.array, vectors)]
    if len(vectors) == 2 and vectors[0][0] == 0:
        centrings.append(np.array([0.5, 0.5, 0]))
    motif = np.array([[0.1, 0.2, 0.3], [0.25, 0.15, 0.45]])
    fractions = np.concatenate([(motif[k] + np.array(centrings)) % 1 for k in range(2)])
    symbols = ["V"] * len(centrings) + ["O"] * len(centrings)
    sites = np.repeat([0, 1], len(centrings))
    primitive = primitive_cell(symbols, fractions @ cell, cell, sites)
    assert primitive.ratio == len(centrings)
    assert np.linalg.det(primitive.cell_A) == pytest.approx(np.linalg.det(cell) / len(centrings))
    # Every atom of the given cell is a kept one moved by whole primitive vectors.
    positions = fractions @ cell
    again = positions[primitive.kept][primitive.place] + primitive.shift @ primitive.cell_A
    assert again == pytest.approx(positions, abs=1e-9)


@pytest.mark.parametrize("crystal", [V2O5, REO3], ids=["V2O5", "ReO3"])
def test_primitive_cell_stays_as_it_is(crystal):
    sites = np.zeros(len(crystal.symbols), dtype=int)
    primitive = primitive_cell(crystal.symbols, crystal.positions_A, crystal.cell_A, sites)
    assert primitive.ratio == 1
    assert np.array_equal(primitive.cell_A, crystal.cell_A)


def test_command_prints_the_periodic_report(tmp_path, capsys):
    path = written(tmp_path, RUTILE)
    assert main(["bond", str(path), "--mesh", "2,2,2", "--path", "GX", "--json", str(tmp_path / "out.json")]) == 0
    said = capsys.readouterr().out
    assert "Mesh 2 x 2 x 2" in said
    assert "Along GX" in said
    assert json.loads((tmp_path / "out.json").read_text(encoding="utf-8"))["mesh"]["counts"] == [2, 2, 2]
    assert main(["bond", str(path), "--mesh", "1,1,2", "--json", "-", "--charges", "fixed"]) == 0
    assert json.loads(capsys.readouterr().out)["method"]["charge_model"] == "fixed"


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["--mesh", "2,2"], "4,4,4"),
        (["--mesh", "2,2,x"], "4,4,4"),
        (["--mesh", "0,1,1"], "4,4,4"),
        (["--path", "GQQ"], "special points"),
        (["--charge", "1"], "neutral cell"),
        (["--max-functions", "10"], "--max-functions"),
    ],
)
def test_command_explains_what_it_refuses(tmp_path, capsys, words, said):
    path = written(tmp_path, RUTILE)
    assert main(["bond", str(path), "--mesh", "1,1,1", *words]) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert said in captured.err
    assert captured.err.count("\n") == 1


def test_hostile_labels_are_shown_harmless(tmp_path):
    text = RUTILE.replace("Ti1 Ti", "'Ti1\x1b[31m' Ti").replace(
        "data_rutile", "data_rutile\n_chemical_name_common '<b>\x1b[2J'"
    )
    try:
        contents = crystal_contents(written(tmp_path, text))
    except InputError:
        pytest.skip("the reader refuses control characters")
    said = crystal_text(crystal_report(contents, crystal=CrystalOptions(mesh=(1, 1, 1))))
    assert "\x1b" not in said


def test_cell_without_its_hydrogens_is_refused(tmp_path):
    contents = crystal_contents(written(tmp_path, RUTILE))
    lacking = replace(contents, missing_hydrogens=("Hydrogens of water are missing: O9.",))
    with pytest.raises(InputError, match="--hydrogens place"):
        crystal_report(lacking, crystal=CrystalOptions(mesh=(1, 1, 1)))


def test_path_equals_the_one_that_ase_draws_for_the_file(tmp_path, report):
    atoms = ase.io.read(written(tmp_path, RUTILE))
    assert report.bonding.path.path == atoms.cell.bandpath(npoints=12).path
    assert report.bonding.path.points == pytest.approx(atoms.cell.bandpath(npoints=12).kpts, abs=1e-9)


README = (Path(__file__).parents[2] / "README.md").read_text(encoding="utf-8")


def keys_within(value) -> set[str]:
    if isinstance(value, list):
        return keys_within(value[0]) if value else set()
    if not isinstance(value, dict):
        return set()
    free = {"metal_hybrid", "donor_hybrid", "shell_shares"}
    return set(value).union(*(keys_within(inner) for key, inner in value.items() if key not in free))


def test_json_fields_are_those_that_readme_lists(report):
    document = crystal_document(report)
    table = README.split("### JSON of an extended structure")[1].split("\n## ")[0]
    rows = [row.split("|") for row in table.splitlines() if row.startswith("| `")]
    described = {name: set(re.findall(r"`(\w+)`", row[2])) for row in rows for name in re.findall(r"`(\w+)`", row[1])}
    assert set(described) == set(document)
    for key in ("crystal", "mesh", "filling", "gap", "atoms", "bonds", "band_blocks", "density_of_states", "path"):
        assert described[key] == keys_within(document[key])
    for key in ("crystal_orbital_overlap_population", "mesh_convergence"):
        assert described[key] == keys_within(document[key])
