"""Missing hydrogens: recognised, placed, lengthened."""

from __future__ import annotations

from collections import Counter

import numpy as np
import pytest
from ase.build import molecule as ase_molecule

from ehmo.records.fragment import Fragment
from ehmo.structure import crystal_contents, perceive, read
from ehmo.structure.cell_hydrogens import with_hydrogens, with_longer_bonds
from ehmo.structure.hydrogens import NEUTRON_LENGTHS_A, Surroundings, missing_hydrogens
from tests.geometries import SPECIES
from tests.structure.cif_text import INVERSION, cif, tetraoxo


@pytest.fixture
def contents(tmp_path):
    def from_text(text: str, **options):
        path = tmp_path / "a.cif"
        path.write_text(text)
        return crystal_contents(path, **options)

    return from_text


def _bare(fragment: Fragment) -> Fragment:
    """Fragment without its hydrogens."""
    keep = [k for k, symbol in enumerate(fragment.symbols) if symbol != "H"]
    return Fragment(tuple(fragment.symbols[k] for k in keep), fragment.positions_A[keep])


def _oxygen(valence: float | None, label: str = "O1", n_metals: int = 1, **more) -> Surroundings:
    vectors = np.array([[2.0, 0, 0], [0, 2.0, 0], [0, 0, 2.0]])[:n_metals]
    return Surroundings("O", label, ("V",) * n_metals, vectors, (True,) * n_metals, valence, **more)


@pytest.mark.parametrize(
    ("atom", "count"),
    [
        (_oxygen(None, n_metals=0), 2),
        (_oxygen(0.35), 2),
        (_oxygen(0.80), 1),
        (_oxygen(1.70), 0),
        (_oxygen(0.80, "OW3"), 2),
        (_oxygen(0.80, "Wat(4)"), 2),
        (_oxygen(0.80, "O12W"), 2),
        (_oxygen(1.20, "OH2", n_metals=2), 1),
        (_oxygen(1.20, "O-H2", n_metals=2), 1),
        (_oxygen(1.70, "OW3"), 0),
        (_oxygen(1.10, n_metals=2), 1),
        (_oxygen(1.90, n_metals=2), 0),
        (_oxygen(0.40, n_metals=2), 2),
        (_oxygen(1.10, formula_has_hydrogen=False), 0),
        (_oxygen(0.40, formula_has_hydrogen=False), 2),
        (_oxygen(1.70, attached=1), 1),
        (_oxygen(None), 0),
    ],
)
def test_oxygen_by_bond_valence_label_and_the_word_of_the_file(atom, count):
    lack = missing_hydrogens(atom)
    assert (0 if lack is None else lack.count) == count


AQUA = ("[VO(OH2)5]2+", "[Cr(OH2)6]3+", "[Fe(OH2)6]2+")


@pytest.mark.parametrize("name", [name for name in AQUA if name in SPECIES])
def test_water_gets_its_hydrogens_back(name):
    species = SPECIES[name].fragment()
    placed = with_hydrogens(_bare(species))
    assert Counter(placed.symbols) == Counter(species.symbols)
    kinds = Counter(bond.kind.value for bond in perceive(placed).bonds)
    assert kinds == Counter(bond.kind.value for bond in perceive(species).bonds)
    hydrogens = [k for k, symbol in enumerate(placed.symbols) if symbol == "H"]
    where = placed.positions_A
    gaps = np.linalg.norm(where[hydrogens][:, None] - where[None], axis=2)
    oxygen = [k for k, symbol in enumerate(placed.symbols) if symbol == "O"]
    np.testing.assert_allclose(gaps[:, oxygen].min(axis=1), 0.98, atol=1e-9)
    metal = next(k for k, symbol in enumerate(placed.symbols) if symbol not in ("O", "H"))
    assert (gaps[:, metal] > 2.4).all()
    others = gaps[:, hydrogens] + 9 * np.eye(len(hydrogens))
    assert others.min() > 1.4
    assert any("directions are a guess" in note for note in placed.notes)


@pytest.mark.parametrize("name", ["C6H6", "CH3CN", "C2H6", "C2H4", "C2H2", "C3H8", "isobutane", "CH3OCH3"])
def test_carbon_gets_as_many_hydrogens_as_it_had(name):
    """Counts and lengths on molecules of the G2 set (Curtiss 1997, in ASE); a methyl group may be turned."""
    atoms = ase_molecule(name)
    keep = atoms.numbers != 1
    bare = Fragment(tuple(np.array(atoms.get_chemical_symbols())[keep]), atoms.positions[keep])
    placed = with_hydrogens(bare)
    assert Counter(placed.symbols) == Counter(atoms.get_chemical_symbols())
    new = placed.positions_A[len(bare) :]
    distance = np.linalg.norm(new[:, None] - bare.positions_A[None], axis=2)
    np.testing.assert_allclose(distance.min(axis=1), NEUTRON_LENGTHS_A["C"], atol=1e-9)
    theirs = Counter(np.linalg.norm(atoms.positions[~keep][:, None] - bare.positions_A[None], axis=2).argmin(axis=1))
    assert Counter(distance.argmin(axis=1)) == theirs


@pytest.mark.parametrize("name", ["C6H6", "C3H8"])
def test_hydrogens_without_freedom_come_back_to_their_places(name):
    """Aromatic CH and CH2 within 0.06 A of the geometry of the G2 set."""
    atoms = ase_molecule(name)
    keep = atoms.numbers != 1
    bare = Fragment(tuple(np.array(atoms.get_chemical_symbols())[keep]), atoms.positions[keep])
    new = with_hydrogens(bare).positions_A[len(bare) :]
    gap = np.linalg.norm(new[:, None] - atoms.positions[~keep][None], axis=2).min(axis=1)
    fixed = {"C6H6": 6, "C3H8": 2}[name]
    assert (np.sort(gap)[:fixed] < 0.06).all()


def test_complete_molecules_get_none():
    for name in ("[VO(OH2)5]2+", "VOCl3"):
        fragment = SPECIES[name].fragment()
        assert with_hydrogens(fragment) is fragment


def test_lengthening_keeps_directions_and_all_other_atoms():
    species = SPECIES["[VO(OH2)5]2+"].fragment()
    short = np.array(species.positions_A)
    owners = {}
    for k, symbol in enumerate(species.symbols):
        if symbol == "H":
            distance = np.linalg.norm(short - short[k], axis=1) + 9.0 * (np.array(species.symbols) != "O")
            owner = int(distance.argmin())
            owners[k] = owner
            short[k] = short[owner] + 0.85 * (short[k] - short[owner]) / np.linalg.norm(short[k] - short[owner])
    longer = with_longer_bonds(Fragment(species.symbols, short))
    for k, owner in owners.items():
        before, after = short[k] - short[owner], longer.positions_A[k] - longer.positions_A[owner]
        assert np.linalg.norm(after) == pytest.approx(0.98)
        assert before @ after == pytest.approx(np.linalg.norm(before) * np.linalg.norm(after))
    rest = [k for k in range(len(species)) if k not in owners]
    np.testing.assert_array_equal(longer.positions_A[rest], short[rest])
    assert longer.notes == ("Bonds to hydrogen were set to neutron lengths: O-H 0.85 to 0.98 A (10).",)


def test_hydrogens_of_a_metal_hydride_are_left_alone():
    hydride = Fragment(("Re", "H", "O"), [[0, 0, 0], [0, 0, 1.6], [0, 1.7, 0]])
    assert with_longer_bonds(hydride) is hydride


AQUO = [
    "V1 V 0.1 0.1 0.1",
    "O1 O 0.1 0.1 0.2744",
    "OW2 O 0.3278 0.1 0.1",
    "Cl1 Cl 0.1 0.36 0.1",
    "Cl2 Cl -0.155 0.1 0.1",
]
"""Vanadyl dichloride with one aqua ligand (idealised)."""


def test_missing_hydrogens_of_a_crystal_are_told(contents):
    crystal = contents(cif([*AQUO, "O9 O 0.6 0.6 0.6"]))
    (said,) = crystal.missing_hydrogens
    assert said.startswith("Hydrogens of water are missing: OW2 (label OW2, bond valence 0.")
    assert said.endswith("), O9 (bonded to nothing).")
    (molecule,) = crystal.molecules
    assert any("OW2" in doubt and "O9" not in doubt for doubt in molecule.fragment.doubts)
    assert molecule.fragment.charge is None
    (water,) = crystal.species
    assert (water.formula, water.missing_hydrogens) == ("H2O", 2)


def test_placed_hydrogens_make_the_balance_possible(contents):
    crystal = contents(cif([*AQUO, "O9 O 0.6 0.6 0.6"]), hydrogens="place")
    (molecule,) = crystal.molecules
    assert molecule.fragment.formula == "Cl2H2O2V"
    assert not crystal.missing_hydrogens
    assert molecule.fragment.doubts == ()
    assert crystal.species[0].missing_hydrogens == 0
    assert any("4 hydrogens of the cell were placed" in note for note in crystal.notes)


def test_images_of_placed_hydrogens_obey_the_symmetry(contents):
    crystal = contents(cif(AQUO, operations=INVERSION), hydrogens="place")
    inverse = np.linalg.inv(crystal.cell_A)
    for site in np.unique(crystal.sites):
        first, second = crystal.positions_A[crystal.sites == site] @ inverse
        off = first + second
        np.testing.assert_allclose(off, np.round(off), atol=1e-9)
    assert crystal.labels.count("H on OW2") == 4
    fragment = crystal.molecules[0].fragment
    assert fragment.crystal.permutations.shape == (2, len(fragment))


def test_placed_hydrogens_point_at_acceptors(contents):
    """A chloride 3.1 A from the water oxygen, off the V-O axis, draws one hydrogen."""
    near = [*AQUO, "Cl3 Cl 0.45 0.42 0.1"]
    crystal = contents(cif(near), hydrogens="place")
    where = {label: crystal.positions_A[k] for k, label in enumerate(crystal.labels)}
    hydrogens = [crystal.positions_A[k] for k, label in enumerate(crystal.labels) if label == "H on OW2"]
    cosines = [
        (h - where["OW2"]) @ (where["Cl3"] - where["OW2"])
        / (np.linalg.norm(h - where["OW2"]) * np.linalg.norm(where["Cl3"] - where["OW2"]))
        for h in hydrogens
    ]  # fmt: skip
    assert max(cosines) > np.cos(np.radians(35))


def test_no_hydroxide_where_the_formula_has_no_hydrogen(contents):
    weak = [line.replace("Cr", "Ru") for line in tetraoxo("Ru", step=0.1148)]
    formula = "_chemical_formula_sum 'Ru O4 K'"
    assert not contents(cif([*weak, "K1 K 0.6 0.6 0.6"], extra=formula)).missing_hydrogens


def test_attached_hydrogens_and_dummies_of_the_file(contents):
    sites = [f"{line} 0 ." for line in tetraoxo()[:-1]] + ["O4 O 0.2053 -0.0053 -0.0053 1 .", "H1 H . . . . dum"]
    crystal = contents(cif(sites, columns="attached_hydrogens calc_flag"))
    assert crystal.missing_hydrogens == ("Hydrogens of hydroxide are missing: O4 (the file says so).",)
    assert "Hydrogens listed without a position: H1." in crystal.notes


def test_deuterium_riding_and_x_ray_lengths_are_told(contents):
    water = ["O9 O 0.6 0.6 0.6 .", "D1 D 0.69 0.6 0.6 calc", "H2 H 0.577 0.687 0.6 calc"]
    crystal = contents(cif([*(f"{line} ." for line in tetraoxo()), *water], columns="calc_flag"))
    assert "Deuterium taken as hydrogen: 1 site." in crystal.notes
    assert "Calculated (riding) hydrogen positions: 2." in crystal.notes
    assert any(note.startswith("X-ray lengths to hydrogen, on the average O-H 0.81") for note in crystal.notes)
    longer = contents(cif([*(f"{line} ." for line in tetraoxo()), *water], columns="calc_flag"), hydrogens="lengthen")
    k, o = longer.labels.index("D1"), longer.labels.index("O9")
    assert np.linalg.norm(longer.positions_A[k] - longer.positions_A[o]) == pytest.approx(0.98)


def test_options_work_on_plain_xyz(tmp_path):
    path = tmp_path / "a.xyz"
    bare = _bare(SPECIES["[VO(OH2)5]2+"].fragment())
    rows = [f"{s} {x} {y} {z}" for s, (x, y, z) in zip(bare.symbols, bare.positions_A, strict=True)]
    path.write_text("\n".join([str(len(bare)), "charge=2 unpaired=1", *rows]) + "\n")
    assert read(path, hydrogens="place").formula == "H10O6V"
    assert read(path).formula == "O6V"


def test_hydrogens_that_have_no_room_are_not_placed(contents):
    """A lone oxygen in a cage of fluorine 1.9 A away takes no hydrogens."""
    cage = [
        f"F{k} F {0.6 + x} {0.6 + y} {0.6 + z}"
        for k, (x, y, z) in enumerate(np.vstack([np.eye(3), -np.eye(3)]) * 0.211)
    ]
    corner = 0.211 / np.sqrt(3)
    signs = [(a, b, c) for a in (1, -1) for b in (1, -1) for c in (1, -1)]
    cage += [
        f"F{k + 10} F {0.6 + a * corner} {0.6 + b * corner} {0.6 + c * corner}" for k, (a, b, c) in enumerate(signs)
    ]
    crystal = contents(cif([*tetraoxo(), "O9 O 0.6 0.6 0.6", *cage]), hydrogens="place")
    assert "H" not in crystal.symbols
    assert "Hydrogens were not placed for want of room: O9." in crystal.notes
