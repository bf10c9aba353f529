"""The JSON document: its keys, units, indices, strictness and agreement with the report."""

from __future__ import annotations

import json
import re
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from ehmo import __version__, bond_report
from ehmo.records.fragment import Fragment
from ehmo.records.report import BondReport
from ehmo.report.document import SCHEMA, bond_document, json_text
from tests.geometries import SPECIES

README = Path(__file__).parents[2] / "README.md"

FIELDS = {
    "": {
        "schema",
        "program_version",
        "fragment",
        "method",
        "symmetry",
        "oxidation_state",
        "d_count",
        "orbitals",
        "atoms",
        "populations_by_irrep",
        "ligands",
        "bonds",
        "ladder",
        "ground_term",
        "shell_constants",
        "terms",
        "bands",
        "g_tensor",
        "magnetism",
        "band_fit",
        "spectroscopy_withheld",
        "local_frames",
        "health",
        "spread",
        "assumptions",
        "warnings",
        "cautions",
    },
    "fragment": {
        "source",
        "title",
        "formula",
        "charge",
        "charge_reason",
        "unpaired_electrons",
        "unpaired_reason",
        "metal_oxidation_total",
        "d_electrons",
        "multiplicity",
        "atoms",
    },
    "fragment.atoms": {"label", "symbol", "position_A", "site_label"},
    "method": {
        "parameter_set",
        "parameter_edition",
        "parameter_sha256",
        "parameter_origin",
        "charge_model",
        "converged",
        "iterations",
        "charge_residual_e",
        "smearing_eV",
        "K",
        "K_sigma",
        "K_pi",
        "K_delta",
        "K_decay_per_A",
        "weighting",
        "lambda",
        "smallest_overlap_eigenvalue",
        "energy_eV",
    },
    "orbitals": {
        "energy_eV",
        "irrep",
        "irrep_share",
        "occupation",
        "metal_share",
        "donor_share",
        "other_share",
        "metal_donor_overlap_population_per_two_electrons",
        "shell_shares",
        "spread",
    },
    "atoms": {"label", "mulliken_charge", "gross_population", "net_population", "spin_population", "shells", "spread"},
    "atoms.shells": {"shell", "gross_population", "net_population", "functions"},
    "populations_by_irrep": {"irrep", "electrons", "shell_populations"},
    "ligands": {"formula", "atoms", "donors", "metals", "charge", "charge_reason"},
    "bonds": {
        "metal",
        "donor",
        "label",
        "kind",
        "length_A",
        "per_metal",
        "multiplicity",
        "bond_valence",
        "overlap_population",
        "overlap_by_shells",
        "overlap_by_irrep",
        "overlap_by_orbital",
        "mayer",
        "wiberg",
        "formal_order",
        "formal_order_fraction",
        "formal_order_words",
        "formal_order_rule",
        "reactivity",
        "channels",
        "spread",
    },
    "bonds.reactivity": {"leaning", "homo_share", "lumo_share", "pi_star_eV", "pi_star_gap_eV"},
    "symmetry": {"molecule", "spheres"},
    "symmetry.spheres.shapes": {"shape", "measure"},
    "g_tensor": {"values", "axes", "effective_spin"},
    "bands": {
        "wavenumber_per_cm",
        "kind",
        "transition",
        "direction",
        "to_metal",
        "upper_term",
        "degeneracy",
        "spin_allowed",
        "dipole_allowed",
        "polarisation",
        "oscillator_strength",
        "spread",
    },
    "health": {
        "smallest_overlap_eigenvalue",
        "iterations",
        "charge_residual_e",
        "impossible_populations",
        "negative_bonds",
        "antibonding_shells",
        "smallest_metal_share",
        "frontier_gap_eV",
        "nearly_degenerate",
        "smeared",
    },
    "bonds.channels": {"type", "weight", "type_share", "metal_hybrid", "donor_hybrid"},
    "local_frames": {"metal", "axes", "z_reason", "x_reason"},
}


@pytest.fixture(scope="module")
def report() -> BondReport:
    return bond_report(SPECIES["[VO(OH2)5]2+"].fragment())


@pytest.fixture(scope="module")
def document(report) -> dict:
    return bond_document(report)


def at(document: dict, place: str) -> dict:
    for name in filter(None, place.split(".")):
        document = document[name]
        if isinstance(document, list):
            document = document[0]
    return document


@pytest.mark.parametrize("place", FIELDS)
def test_keys_are_those_of_the_schema(document, place):
    assert set(at(document, place)) == FIELDS[place]


def test_readme_names_every_key():
    if not README.exists():
        pytest.skip("the tests run without a checkout: no README.md")
    rows = [line for line in README.read_text(encoding="utf-8").splitlines() if line.startswith("| `")]
    named = {word for row in rows for word in re.findall(r"`(\w+)`", row)}
    assert set().union(*FIELDS.values()) <= named


def test_schema_and_program_version(document):
    assert document["schema"] == SCHEMA
    assert document["program_version"] == __version__
    assert re.fullmatch(r"ehmo bond report \d+", SCHEMA)


def test_document_agrees_with_the_report(report, document):
    assert document["fragment"]["charge"] == 2
    assert document["fragment"]["unpaired_electrons"] == 1
    assert [atom["label"] for atom in document["atoms"]] == list(report.fragment.labels)
    np.testing.assert_array_equal(
        [atom["position_A"] for atom in document["fragment"]["atoms"]], report.fragment.positions_A
    )
    np.testing.assert_array_equal([o["energy_eV"] for o in document["orbitals"]], report.state.energies_eV)
    assert sum(o["occupation"] for o in document["orbitals"]) == pytest.approx(report.populations.gross.sum())
    assert sum(atom["mulliken_charge"] for atom in document["atoms"]) == pytest.approx(2)
    assert sum(atom["spin_population"] for atom in document["atoms"]) == pytest.approx(1)
    assert document["method"]["converged"] is True
    assert document["method"]["iterations"] == report.method.iterations > 1
    assert len(document["bonds"]) == 6


def test_indices_count_from_0_and_labels_from_1(document):
    labels = [atom["label"] for atom in document["atoms"]]
    for bond in document["bonds"]:
        assert bond["metal"] == 0
        assert bond["label"] == f"{labels[bond['metal']]}-{labels[bond['donor']]}"
        assert labels[bond["donor"]].endswith(str(bond["donor"] + 1))
    assert document["ligands"][0]["metals"] == [0]


def test_length_is_that_of_the_coordinates(document):
    positions = np.array([atom["position_A"] for atom in document["fragment"]["atoms"]])
    for bond in document["bonds"]:
        distance = np.linalg.norm(positions[bond["metal"]] - positions[bond["donor"]])
        assert bond["length_A"] == pytest.approx(distance, abs=1e-12)


def test_channels_fall_add_up_to_the_wiberg_order_and_their_hybrids_to_1(document):
    for bond in document["bonds"]:
        weights = [channel["weight"] for channel in bond["channels"]]
        assert weights == sorted(weights, reverse=True)
        assert sum(weights) == pytest.approx(bond["wiberg"], abs=0.01)  # traces are not listed
        for channel in bond["channels"]:
            assert channel["type"] in {"sigma", "pi", "delta", "phi"}
            assert sum(channel["metal_hybrid"].values()) == pytest.approx(1)
            assert sum(channel["donor_hybrid"].values()) == pytest.approx(1)


def test_text_is_strict_json_and_reads_back_the_same(report, document):
    def refuse(word: str):
        raise AssertionError(f"{word} is not JSON")

    assert json.loads(json_text([report]), parse_constant=refuse) == json.loads(json.dumps(document))
    assert json_text([report]).endswith("}\n")


def test_nan_and_missing_values_are_null(report):
    odd = replace(
        report,
        populations=replace(report.populations, spin=np.full(len(report.fragment), np.nan)),
        method=replace(report.method, charge_residual=float("inf")),
        electrons=replace(report.electrons, d_electrons=None),
    )
    document = json.loads(json_text([odd]))
    assert document["atoms"][0]["spin_population"] is None
    assert document["method"]["charge_residual_e"] is None
    assert document["fragment"]["d_electrons"] is None


def test_bond_valence_without_parameters_is_null(report):
    first, *rest = report.coordination.bonds
    coordination = replace(report.coordination, bonds=(replace(first, bond_valence=None), *rest))
    assert bond_document(replace(report, coordination=coordination))["bonds"][0]["bond_valence"] is None


@pytest.mark.parametrize("count", [2, 3])
def test_several_frames_are_one_document_with_a_list(report, count):
    whole = json.loads(json_text([report] * count))
    assert set(whole) == {"schema", "reports"}
    assert whole["schema"] == SCHEMA
    assert len(whole["reports"]) == count
    assert whole["reports"][0] == json.loads(json_text([report]))


def test_every_metal_of_a_fragment_with_two_is_reported():
    species = SPECIES["VOCl3"]
    positions = np.concatenate([species.positions_A, species.positions_A + np.array([20.0, 0, 0])])
    document = bond_document(bond_report(Fragment(species.symbols * 2, positions, 0, 0)))
    assert {bond["metal"] for bond in document["bonds"]} == {0, 5}
    assert [frame["metal"] for frame in document["local_frames"]] == [0, 5]


HOSTILE = '\x1b[31m</script>"\\\n\u2028=cmd()'


def test_hostile_title_survives_as_data(report):
    odd = replace(report, fragment=replace(report.fragment, title=HOSTILE, source=HOSTILE))
    text = json_text([odd])
    assert json.loads(text)["fragment"]["title"] == HOSTILE
    assert "\x1b" not in text
