"""Clusters cut from extended structures and saturated with hydrogen."""

from __future__ import annotations

import numpy as np
import pytest

from ehmo.cli import main
from ehmo.errors import InputError, LimitError
from ehmo.records.coordination import DonorKind
from ehmo.structure import crystal_contents, perceive
from ehmo.structure.cluster import metal_clusters
from tests.crystal.structures import MOO3, V2O5


def written(tmp_path, crystal):
    """The crystal as a CIF without symmetry."""
    lengths = np.diag(crystal.cell_A)
    rows = [
        f"{symbol}{k + 1} {symbol} {x:.6f} {y:.6f} {z:.6f}"
        for k, (symbol, (x, y, z)) in enumerate(zip(crystal.symbols, crystal.positions_A / lengths, strict=True))
    ]
    head = [f"_cell_length_{name} {length:.4f}" for name, length in zip("abc", lengths, strict=True)]
    head += [f"_cell_angle_{name} 90" for name in ("alpha", "beta", "gamma")]
    names = ["label", "type_symbol", "fract_x", "fract_y", "fract_z"]
    text = [
        "data_oxide",
        *head,
        "_symmetry_space_group_name_H-M 'P 1'",
        "loop_",
        *(f"_atom_site_{n}" for n in names),
        *rows,
    ]
    path = tmp_path / "oxide.cif"
    path.write_text("\n".join(text) + "\n", encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def contents(tmp_path_factory):
    return crystal_contents(written(tmp_path_factory.mktemp("v2o5"), V2O5))


def lengths_to(fragment, centre):
    return np.linalg.norm(fragment.positions_A - fragment.positions_A[centre], axis=1)


def test_cluster_of_one_metal_keeps_its_sphere(contents):
    cluster = metal_clusters(contents, 2.5)[0]
    assert cluster.symbols[0] == "V"
    assert cluster.symbols.count("V") == 1
    distances = lengths_to(cluster, 0)
    donors = sorted(d for d, s in zip(distances, cluster.symbols, strict=True) if s == "O" and d < 2.2)
    # Distances of the published structure, by its table (read).
    assert donors == pytest.approx([1.583, 1.781, 1.882, 1.882, 2.026], abs=2e-3)


def test_hydrogens_replace_cut_bonds_along_their_directions(contents):
    cluster = metal_clusters(contents, 2.5)[0]
    hydrogens = [k for k, s in enumerate(cluster.symbols) if s == "H"]
    assert hydrogens
    for hydrogen in hydrogens:
        distances = lengths_to(cluster, hydrogen)
        oxygen = min((k for k, s in enumerate(cluster.symbols) if s == "O"), key=lambda k: distances[k])
        assert distances[oxygen] == pytest.approx(0.98, abs=1e-9)  # O-H by neutrons (Allen, Bruno 2010; memory)


def test_the_short_oxo_bond_stays_an_oxo_bond(contents):
    # Its only other contact is the long one across the gap of the layers, of little valence.
    bonds = perceive(metal_clusters(contents, 2.5)[0]).bonds
    kinds = {round(bond.length_A, 2): bond.kind for bond in bonds}
    assert kinds[1.58] is DonorKind.OXO
    assert kinds[1.78] is DonorKind.HYDROXO


def test_larger_radius_takes_in_further_metals(contents):
    counts = [metal_clusters(contents, radius)[0].symbols.count("V") for radius in (2.5, 3.2, 3.6)]
    assert counts[0] == 1
    assert counts[0] < counts[1] < counts[2]


def test_every_metal_of_a_larger_cluster_keeps_its_donors(contents):
    cluster = metal_clusters(contents, 3.6)[0]
    for metal in [k for k, s in enumerate(cluster.symbols) if s == "V"]:
        distances = lengths_to(cluster, metal)
        near = [k for k, s in enumerate(cluster.symbols) if s == "O" and distances[k] < 2.2]
        assert len(near) == 5


@pytest.mark.parametrize("radius", [0.0, -2.0, float("nan"), 1e6])
def test_radius_out_of_range(contents, radius):
    with pytest.raises(InputError, match="radius"):
        metal_clusters(contents, radius)


def test_cluster_too_large(contents):
    with pytest.raises(LimitError, match="smaller radius"):
        metal_clusters(contents, 25.0)


def test_command_reports_on_the_cluster_and_refuses_it_for_molecules(tmp_path, capsys):
    path = written(tmp_path, MOO3)
    assert main(["bond", str(path), "--cluster", "2.6", "--charges", "fixed"]) == 0
    said = capsys.readouterr().out
    assert "Cluster of radius 2.6 Å round Mo1" in " ".join(said.split())
    molecule = tmp_path / "molecule.xyz"
    molecule.write_text("2\ncharge=1\nV 0 0 0\nO 0 0 1.6\n", encoding="utf-8")
    for words in (["--cluster", "3"], ["--mesh", "2,2,2"], ["--path", "auto"]):
        assert main(["bond", str(molecule), *words]) == 2
        assert f"{words[0]} is for extended structures" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("words", "said"), [(["--oxidation-state", "5"], "--oxidation-state"), (["--spread", "8"], "--spread")]
)
def test_options_of_molecules_are_refused_for_the_whole_crystal(tmp_path, capsys, words, said):
    assert main(["bond", str(written(tmp_path, V2O5)), "--mesh", "1,1,1", *words]) == 2
    assert f"{said} is for molecules" in capsys.readouterr().err
