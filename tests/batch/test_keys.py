"""Keys: equal where the numbers must be equal, different where anything can change them."""

from __future__ import annotations

import hashlib
import json
from dataclasses import fields, replace

import pytest

import ehmo
from ehmo.batch import RESULTS_EDITION, BatchSettings
from ehmo.batch.items import WorkItem, with_parameters
from ehmo.batch.keys import crystal_key, molecule_key, unread_key
from ehmo.batch.known import KnownKeys, packed_keys
from ehmo.records.options import Options
from ehmo.structure import read_crystals
from tests.batch.files import chromate_cif, put
from tests.geometries import SPECIES

SETTINGS = with_parameters(BatchSettings(), "standard")
CHROMATE = SPECIES["CrO4 2-"].fragment()


def key(fragment=CHROMATE, settings=SETTINGS, **options):
    return molecule_key(fragment, settings, replace(settings.options, **options))


def test_the_key_is_the_hash_of_canonical_json(standard):
    # Written out here by hand, so that a change of the form is noticed: it would make every stored row unknown.
    content = {
        "molecule": ["Cr", "O", "O", "O", "O"],
        "positions_1e-6_A": [[round(float(x) * 1e6) for x in row] for row in CHROMATE.positions_A],
        "crystal": None,
        "charge": -2,
        "unpaired": 0,
        "parameters": standard.content_sha256,
        "options": {
            "charge_model": "self-consistent",
            "K": None,
            "weighting": None,
            "K_sigma": None,
            "K_pi": None,
            "K_delta": None,
            "K_decay_per_A": None,
            "lambda_": None,
            "oxidation_state": None,
            "racah_B_per_cm": None,
            "observed_bands_per_cm": [],
            "observed_terms": [],
            "max_iterations": 100,
        },
        "edition": RESULTS_EDITION,
        "draws": 0,
    }
    text = json.dumps(content, sort_keys=True, separators=(",", ":"))
    assert key() == hashlib.sha256(text.encode()).hexdigest()


def test_what_cannot_change_a_number_leaves_the_key():
    moved = replace(CHROMATE, positions_A=CHROMATE.positions_A + 4e-7)
    assert key(replace(moved, title="another", source="elsewhere.xyz", notes=("a",))) in {
        key(replace(CHROMATE, positions_A=moved.positions_A.round(6))),
    }
    assert key(max_functions=10_000) == key()
    assert key(replace(CHROMATE, positions_A=CHROMATE.positions_A * 1.0 - 0.0)) == key()


def test_charge_and_spin_count_as_they_are_used():
    bare = SPECIES["CrO4 2-"].bare()
    assert key(bare) == key(), "a guess that comes to the same"
    assert key(bare, charge=-2, unpaired_electrons=0) == key()
    assert key(charge=0) != key()
    assert key(charge=-1, unpaired_electrons=1) != key()
    # Counting leaves two spin states of iron(II) open and the ladder chooses: no single number stands for that.
    iron = SPECIES["[Fe(OH2)6]2+"]
    open_spin = key(replace(iron.bare(), charge=2))
    assert open_spin not in {key(iron.fragment(), unpaired_electrons=n) for n in (0, 2, 4)}


CHANGES = {
    "charge_model": "fixed",
    "K": 1.8,
    "weighting": False,
    "K_sigma": 1.7,
    "K_pi": 2.0,
    "K_delta": 1.9,
    "K_decay_per_A": 0.1,
    "lambda_": 0.5,
    "oxidation_state": 5,
    "racah_B_per_cm": 700.0,
    "observed_bands_per_cm": (13000.0,),
    "observed_terms": ("2E",),
    "max_iterations": 50,
}


def test_every_option_is_in_the_key_or_excused():
    assert {one.name for one in fields(Options)} == {*CHANGES, "charge", "unpaired_electrons", "max_functions"}


@pytest.mark.parametrize(("name", "value"), CHANGES.items())
def test_an_option_changes_the_key(name, value):
    assert key(**{name: value}) != key()


def test_geometry_elements_parameters_draws_and_edition_change_the_key(monkeypatch):
    keys = {
        key(),
        key(replace(CHROMATE, positions_A=CHROMATE.positions_A + 1e-6)),
        key(replace(CHROMATE, symbols=("Mo", "O", "O", "O", "O"))),
        key(settings=replace(SETTINGS, parameter_sha256="0" * 64)),
        key(settings=replace(SETTINGS, draws=8)),
    }
    monkeypatch.setattr("ehmo.batch.keys.RESULTS_EDITION", RESULTS_EDITION + 1)
    assert len(keys | {key()}) == 6


def test_copies_in_a_crystal_change_the_key_since_they_are_in_the_report(tmp_path):
    (contents,) = read_crystals(put(tmp_path, "a.cif", chromate_cif()))
    cut = contents.fragments[0]
    assert key(cut) != key(replace(cut, crystal=None))


def test_keys_of_crystals(tmp_path):
    (contents,) = read_crystals(put(tmp_path, "a.cif", chromate_cif()))

    def of(changed=contents, **settings):
        return crystal_key(changed, replace(SETTINGS, **settings), SETTINGS.options)

    keys = {
        of(),
        of(mesh=(2, 2, 2)),
        of(cations="basis"),
        of(replace(contents, cell_A=contents.cell_A + 1e-6)),
        of(replace(contents, positions_A=contents.positions_A + 1e-6)),
    }
    assert len(keys) == 5
    assert of(replace(contents, title="other", notes=())) == of()


def test_keys_of_what_cannot_be_read():
    def of(**changes):
        return unread_key(WorkItem(**{"source": "a.xyz", "kind": "xyz", "text": "x", **changes}), SETTINGS)

    assert of() == of(source="b.xyz", tags=("t",))
    assert len({of(), of(text="y"), of(charge=1), of(kind="fault"), of(kind="fault", source="b.xyz")}) == 5


def test_known_keys_are_those_that_were_packed():
    keys = [hashlib.sha256(str(k).encode()).hexdigest() for k in range(2000)]
    known = KnownKeys(packed_keys(keys[:1000]))
    assert len(known) == 1000
    assert all(one in known for one in keys[:1000])
    assert not any(one in known for one in keys[1000:])
    # Two keys that share 64 bits are still told apart.
    near = keys[0][:16] + keys[1][16:]
    assert near not in known
    assert near in KnownKeys(packed_keys([*keys, near]))
    assert keys[0] not in KnownKeys()


# Frozen on 2026-12-01: Mayer order of the first bond, energy [eV] and charge of the metal in this edition. If a change
# moves them, raise RESULTS_EDITION with them: else stores of before give out old numbers as done.
FROZEN_EDITION = 1
FROZEN = {
    "[VO(OH2)5]2+": (2.3496745, -976.9785917, 1.1261213),
    "[FeO(OH2)5]2+": (1.8714339, -1011.5332563, 0.8139376),
    "MnO4 -": (1.6284713, -617.6340640, 1.8319960),
    "[UO2(OH2)5]2+": (2.3415706, -1297.4995457, 1.1526093),
}


@pytest.mark.parametrize("name", FROZEN)
def test_numbers_of_this_edition(name):
    assert RESULTS_EDITION == FROZEN_EDITION
    report = ehmo.bond_report(SPECIES[name].fragment())
    found = (report.orders[0].mayer, report.state.energy_eV, report.populations.charges[0])
    assert found == pytest.approx(FROZEN[name], rel=1e-7, abs=1e-6)
