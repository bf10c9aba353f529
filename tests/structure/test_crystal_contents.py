"""What a crystal holds: molecules across symmetry, multiplicities, names, charges, networks."""

from __future__ import annotations

from collections import Counter

import gemmi
import numpy as np
import pytest
from ase import Atoms
from ase.build import molecule as ase_molecule
from ase.neighborlist import neighbor_list

from ehmo.errors import InputError
from ehmo.structure import assign_electrons, crystal_contents, from_ase, perceive, read_crystals, read_frames
from ehmo.structure.contents import contents_of_cell
from ehmo.structure.crystal import molecules_of
from ehmo.structure.periodic import PeriodicCell
from tests.structure.cif_text import CUBE, INVERSION, cif, tetraoxo

FOURFOLD = ("x,y,z", "-x,-y,z", "-y,x,-z", "y,-x,-z")
"""Site symmetry -4 at the origin."""

MONOCLINIC = (10.0, 8.0, 9.0, 90.0, 105.0, 90.0)
P21_C = ("x,y,z", "-x,y+1/2,-z+1/2", "-x,-y,-z", "x,-y+1/2,z+1/2")
C2 = ("x,y,z", "-x,y,-z", "x+1/2,y+1/2,z", "-x+1/2,y+1/2,-z")

DICHROMATE = [
    "Cr1 Cr 0.16 0.1 0.02", "O1 O 0.0 0.205 0.0", "O2 O 0.17 -0.05 0.12",
    "O3 O 0.22 0.05 -0.13", "O4 O 0.26 0.23 0.12",
]  # fmt: skip
"""Half a dichromate ion on a twofold axis (idealised)."""


@pytest.fixture
def read(tmp_path):
    def from_text(text: str, **options):
        path = tmp_path / "a.cif"
        path.write_text(text)
        return crystal_contents(path, **options)

    return from_text


def test_molecule_on_a_symmetry_element_is_completed_once(read):
    text = cif(["Cr1 Cr 0 0 0", "O1 O 0.1053 0.1053 0.1053", "K1 K 0.5 0.5 0.5"], operations=FOURFOLD)
    (molecule,) = read(text).molecules
    assert molecule.fragment.formula == "CrO4"
    assert molecule.multiplicity == 1
    assert len(molecule.fragment.crystal.permutations) == 4
    (unit,) = molecule.units
    assert (unit.per_metal, unit.multiplicity, unit.kind.value) == (4, 4, "oxo")
    assert molecule.fragment.crystal.bond_multiplicity(0, 1) == 4
    assert any("Symmetry makes 3 of the 5 atoms" in note for note in molecule.fragment.notes)


def test_molecule_across_a_twofold_axis(read):
    (molecule,) = read(cif(DICHROMATE, cell=MONOCLINIC, operations=C2)).molecules
    assert molecule.fragment.formula == "Cr2O7"
    assert molecule.multiplicity == 2
    by_donor = {unit.donor: unit for unit in molecule.units}
    assert {label: unit.multiplicity for label, unit in by_donor.items()} == {"O1": 4, "O2": 4, "O3": 4, "O4": 4}
    assert by_donor["O1"].n_metals == 2
    assert by_donor["O1"].kind.value == "bridging oxo"


def test_every_equivalent_copy_counts_as_one(read):
    contents = read(cif(tetraoxo(), cell=MONOCLINIC, operations=P21_C))
    (molecule,) = contents.molecules
    assert molecule.multiplicity == 4
    assert Counter(contents.symbols) == {"Cr": 4, "O": 16}


@pytest.mark.parametrize(
    ("sites", "cell", "operations"),
    [
        (tetraoxo(), MONOCLINIC, P21_C),
        (DICHROMATE, MONOCLINIC, C2),
        (["Cr1 Cr 0 0 0", "O1 O 0.1053 0.1053 0.1053"], CUBE, FOURFOLD),
        (tetraoxo(), (9.0, 8.5, 8.0, 85.0, 97.0, 103.0), INVERSION),
    ],
    ids=["general position", "twofold axis", "fourfold inversion", "triclinic"],
)
def test_distances_equal_those_of_gemmi_and_ase(read, sites, cell, operations):
    """Shortest distances of every listed pair by gemmi's nearest images and ASE's minimum image convention."""
    text = cif(sites, cell=cell, operations=operations)
    contents = read(text)
    structure = gemmi.make_small_structure_from_block(gemmi.cif.read_string(text).sole_block())
    unit_cell, atoms = structure.cell, structure.sites
    ase_atoms = Atoms(contents.symbols, contents.positions_A, cell=contents.cell_A, pbc=True)
    group = gemmi.GroupOps([gemmi.Op(op) for op in operations])
    first = {label: k for k, label in reversed(list(enumerate(contents.labels)))}
    for molecule in contents.molecules:
        fragment = molecule.fragment
        labels = fragment.crystal.labels
        for unit in molecule.units:
            theirs = {site.label: site for site in atoms}
            metal, donor = theirs[unit.metal], theirs[unit.donor]
            images = [op.apply_to_xyz(donor.fract.tolist()) for op in group]
            nearest = sorted(
                {
                    round(unit_cell.find_nearest_image(unit_cell.orthogonalize(metal.fract),
                          unit_cell.orthogonalize(gemmi.Fractional(*image)), gemmi.Asu.Any).dist(), 6)
                    for image in images
                }
            )  # fmt: skip
            assert min(abs(d - unit.length_A) for d in nearest) < 1e-5
            others = [k for k, label in enumerate(contents.labels) if label == unit.donor]
            by_ase = ase_atoms.get_distances(first[unit.metal], others, mic=True)
            assert np.abs(np.asarray(by_ase) - unit.length_A).min() < 1e-6
        for bond in perceive(fragment).bonds:
            lengths = [
                u.length_A for u in molecule.units if (u.metal, u.donor) == (labels[bond.metal], labels[bond.donor])
            ]
            assert min(abs(bond.length_A - length) for length in lengths) < 1e-6


@pytest.mark.parametrize(
    ("sites", "operations"),
    [(DICHROMATE, C2), (["Re1 Re 0 0 0", "O1 O 0.5 0 0"], ("x,y,z", "z,x,y", "y,z,x"))],
    ids=["molecule", "framework"],
)
def test_multiplicities_add_up_to_the_bonds_of_the_cell(read, sites, operations):
    """Counted apart by ASE's neighbour list with a cutoff between bonds and contacts."""
    cell = MONOCLINIC if operations is C2 else (3.7, 3.7, 3.7, 90.0, 90.0, 90.0)
    contents = read(cif(sites, cell=cell, operations=operations))
    atoms = Atoms(contents.symbols, contents.positions_A, cell=contents.cell_A, pbc=True)
    i, j = neighbor_list("ij", atoms, 2.2)
    metal = np.array([symbol in ("Cr", "Re") for symbol in contents.symbols])
    units = [unit for piece in (*contents.molecules, *contents.networks) for unit in piece.units]
    assert sum(unit.multiplicity for unit in units) == int((metal[i] & ~metal[j]).sum())


def test_same_contents_from_the_cell_written_out_without_symmetry(read):
    contents = read(cif(DICHROMATE, cell=MONOCLINIC, operations=C2))
    inverse = np.linalg.inv(contents.cell_A)
    sites = [
        f"{symbol}{k} {symbol} " + " ".join(f"{x:.9f}" for x in position @ inverse)
        for k, (symbol, position) in enumerate(zip(contents.symbols, contents.positions_A, strict=True))
    ]
    (plain,) = read(cif(sites, cell=MONOCLINIC)).molecules
    (molecule,) = contents.molecules
    assert plain.multiplicity == molecule.multiplicity
    assert plain.fragment.formula == molecule.fragment.formula
    assert sum(unit.multiplicity for unit in plain.units) == sum(unit.multiplicity for unit in molecule.units)


def test_doubled_cell_doubles_the_multiplicities(read):
    contents = read(cif([*tetraoxo(), "K1 K 0.6 0.6 0.6", "K2 K 0.6 0.1 0.6"]))
    atoms = Atoms(contents.symbols, contents.positions_A, cell=contents.cell_A, pbc=True).repeat((1, 1, 2))
    labels = tuple(f"{symbol}{k}" for k, symbol in enumerate(atoms.get_chemical_symbols()))
    doubled = contents_of_cell(PeriodicCell(atoms, np.ones(len(atoms), bool), labels, "doubled", ""))
    (one,), (two,) = contents.molecules, doubled.molecules
    assert (one.multiplicity, two.multiplicity) == (1, 2)
    assert [u.multiplicity for u in two.units] == [2 * u.multiplicity for u in one.units]
    assert two.fragment.charge == one.fragment.charge == -2
    assert doubled.species[0].count == 2 * contents.species[0].count


def test_crystal_of_ase_gives_its_one_molecule():
    fragment = from_ase(Atoms("CrO", [[0, 0, 1.1], [0, 0, 9.5]], cell=[9, 9, 10], pbc=True))
    assert fragment.formula == "CrO"
    assert np.linalg.norm(fragment.positions_A[1] - fragment.positions_A[0]) == pytest.approx(1.6)


def test_box_around_molecules_need_not_be_neutral():
    """Two kinds of ions in a computed box: no counter-ions, so no balance; a deposited crystal would be neutral."""
    corners = np.array([[1, 1, 1], [-1, -1, 1], [-1, 1, -1], [1, -1, -1]]) / np.sqrt(3)
    places = [[0, 0, 0], *(1.62 * corners), [9, 9, 9], *(9 + 0.96 * corners[:2])]
    atoms = Atoms("FeO4OH2", places, cell=[18, 18, 18], pbc=True)
    assert from_ase(atoms).charge is None


NETWORKS = {
    "chain": (["V1 V 0 0 0", "O1 O 0.5 0 0"], (3.6, 9, 9, 90, 90, 90), 1, "OV"),
    "layer": (["V1 V 0 0 0", "O1 O 0.5 0 0", "O2 O 0 0.5 0"], (3.6, 3.6, 9, 90, 90, 90), 2, "O2V"),
    "framework": (
        ["Re1 Re 0 0 0", "O1 O 0.5 0 0", "O2 O 0 0.5 0", "O3 O 0 0 0.5"], (3.7, 3.7, 3.7, 90, 90, 90), 3, "O3Re"
    ),
    "chain along a diagonal": (["V1 V 0 0 0", "O1 O 0.5 0.5 0"], (4.6, 4.6, 9, 90, 90, 133.9), 1, "OV"),
}  # fmt: skip


@pytest.mark.parametrize(("sites", "cell", "dimension", "formula"), NETWORKS.values(), ids=NETWORKS)
def test_networks_by_the_directions_their_bonds_run_on_in(read, sites, cell, dimension, formula):
    contents = read(cif(sites, cell=cell))
    (network,) = contents.networks
    assert not contents.molecules
    assert (network.dimension, network.reduced_formula) == (dimension, formula)
    assert network.word == {1: "chain", 2: "layer", 3: "framework"}[dimension]
    assert network.charge == 0
    assert all(unit.n_metals == 2 for unit in network.units)


def test_chain_and_molecule_in_one_crystal(read):
    chain = ["V1 V 0 0 0", "O9 O 0 0 0.5"]
    text = cif([*chain, "V2 V 0 0 0.333333", "O8 O 0 0 0.833333", "V3 V 0 0 0.666667", "O7 O 0 0 0.166667",
                *tetraoxo(centre=(0.5, 0.5, 0.5))], cell=(9, 9, 11.1, 90, 90, 90))  # fmt: skip
    contents = read(text)
    assert [network.word for network in contents.networks] == ["chain"]
    assert [molecule.fragment.formula for molecule in contents.molecules] == ["CrO4"]
    (fragment,) = molecules_of(contents)
    assert any("Not in the report: the chain OV" in note for note in fragment.notes)


def _with_molecule(name: str, centre: float = 0.55, edge: float = 14.0) -> str:
    atoms = ase_molecule(name)
    places = (atoms.positions - atoms.positions.mean(axis=0)) / edge + centre
    sites = [
        f"{symbol}{k + 20} {symbol} {x:.6f} {y:.6f} {z:.6f}"
        for k, (symbol, (x, y, z)) in enumerate(zip(atoms.get_chemical_symbols(), places, strict=True))
    ]
    return cif([*tetraoxo(edge=edge), *sites], cell=(edge, edge, edge, 90, 90, 90))


SOLVENTS = {
    "H2O": ("H2O", "water"), "NH3": ("NH3", "ammonia"), "CH3OH": ("CH3OH", "methanol"),
    "CH3CN": ("CH3CN", "acetonitrile"),
    "C6H6": ("C6H6", "benzene"), "C5H5N": ("C5H5N", "pyridine"), "CCl4": ("CCl4", ""),
    "H2CCl2": ("CH2Cl2", "dichloromethane"), "CH3CH2OCH3": ("C3H8O", ""), "CH3SCH3": ("C2H6S", ""),
}  # fmt: skip


@pytest.mark.parametrize(("name", "said"), SOLVENTS.items(), ids=SOLVENTS)
def test_solvents_are_named_and_neutral(read, name, said):
    (species,) = read(_with_molecule(name)).species
    assert (species.formula, species.name) == said
    assert species.charge == 0
    assert species.missing_hydrogens == 0


def _tetrahedron(label: str, centre: float, length: float, outer: str, inner: str, edge: float = 14.0) -> list[str]:
    d = length / np.sqrt(3) / edge
    corners = ((1, 1, 1), (-1, -1, 1), (-1, 1, -1), (1, -1, -1))
    return [
        f"{inner}{label} {inner} {centre} {centre} {centre}",
        *(f"{outer}{label}{k} {outer} {centre + a * d} {centre + b * d} {centre + c * d}"
          for k, (a, b, c) in enumerate(corners)),
    ]  # fmt: skip


@pytest.mark.parametrize(
    ("inner", "outer", "length", "formula", "name", "charge"),
    [
        ("Cl", "O", 1.44, "ClO4", "perchlorate", -1),
        ("S", "O", 1.47, "SO4", "sulfate", -2),
        ("P", "O", 1.53, "PO4", "phosphate", -3),
        ("B", "F", 1.38, "BF4", "tetrafluoroborate", -1),
        ("N", "H", 1.03, "NH4", "ammonium", 1),
        ("Al", "Cl", 2.13, "AlCl4", "", -1),
        ("Si", "O", 1.63, "O4Si", "", -4),
    ],
)
def test_tetrahedral_ions_are_named_with_their_charge(read, inner, outer, length, formula, name, charge):
    sites = [*tetraoxo(edge=14.0), *_tetrahedron("9", 0.55, length, outer, inner)]
    (species,) = read(cif(sites, cell=(14, 14, 14, 90, 90, 90))).species
    assert (species.name, species.charge) == (name, charge)
    assert species.formula in (formula, "Cl4Al", "AlCl4")


def test_bare_ions_and_halides(read):
    sites = [*tetraoxo(), "Ba1 Ba 0.6 0.6 0.6", "Cl1 Cl 0.1 0.6 0.6", "Na1 Na 0.6 0.1 0.6", "K1 K 0.6 0.6 0.1"]
    charges = {species.name: species.charge for species in read(cif(sites)).species}
    assert charges == {"barium": 2, "chloride": -1, "sodium": 1, "potassium": 1}


def test_charge_by_balance_reaches_the_report(read):
    text = cif([*tetraoxo(), "K1 K 0.6 0.6 0.6", "K2 K 0.6 0.1 0.6"])
    fragment = read(text).molecules[0].fragment
    assert fragment.charge == -2
    assigned = assign_electrons(fragment, perceive(fragment))
    assert assigned.charge_reason == "balance of the crystal: 2 K+ for each"


def test_last_of_two_kinds_of_ions_gets_the_rest(read):
    """Hexaaqua ions whose charge bond valences leave open, beside chromate, which they settle."""
    arms = [(x, y, z) for x, y, z in np.vstack([np.eye(3), -np.eye(3)])]
    edge, centre = 14.0, 0.55
    cobalt = [f"Co1 Co {centre} {centre} {centre}"]
    for k, arm in enumerate(arms, start=1):
        x, y, z = centre + 2.08 / edge * np.array(arm)
        cobalt.append(f"OW{k} O {x} {y} {z}")
        side = np.roll(arm, 1)
        for sign in (1, -1):
            h = np.array([x, y, z]) + (0.59 * np.array(arm) + sign * 0.76 * side) / edge
            cobalt.append(f"H{k}{'ab'[sign > 0]} H {h[0]} {h[1]} {h[2]}")
    contents = read(cif([*tetraoxo(edge=edge), *cobalt], cell=(edge, edge, edge, 90, 90, 90)))
    charges = {molecule.fragment.formula: molecule.fragment.charge for molecule in contents.molecules}
    assert charges["CoH12O6"] == 2
    assert charges["CrO4"] in (-2, None)


def test_balance_against_an_unknown_ion_is_not_tried(read):
    sites = [*tetraoxo(), "Te1 Te 0.6 0.6 0.6"]
    (molecule,) = read(cif(sites)).molecules
    assert molecule.fragment.charge is None
    assert any("No balance of charges: the charge of Te cannot be told" in note for note in molecule.fragment.notes)


def test_masked_solvent_forbids_the_balance(read):
    text = cif([*tetraoxo(), "K1 K 0.6 0.6 0.6"], extra="_platon_squeeze_details 'one void'")
    (molecule,) = read(text).molecules
    assert molecule.fragment.charge is None
    assert any("masked" in note for note in molecule.fragment.notes)


def test_balance_that_is_no_whole_number_is_not_taken(read):
    text = cif([f"{line} 1" for line in tetraoxo()] + ["K1 K 0.6 0.6 0.6 0.5"], columns="occupancy")
    assert read(text).molecules[0].fragment.charge is None


def test_moiety_formula_and_oxidation_numbers_of_the_file(read):
    moiety = "_chemical_formula_moiety 'Cr O4 2-, 2(K +)'"
    fragment = read(cif(tetraoxo(), extra=moiety)).molecules[0].fragment
    assert (fragment.charge, fragment.charge_reason) == (-2, "moiety formula of the file")
    assert any("the balance 0" in doubt for doubt in fragment.doubts)
    # Bond valences do not settle iron(VI); a bare Te, whose charge is unknown, forbids the balance.
    labelled = [line.replace(" Fe ", " Fe6+ ").replace(" O ", " O2- ") for line in tetraoxo("Fe")]
    fragment = read(cif([*labelled, "Te1 Te 0.6 0.6 0.6"])).molecules[0].fragment
    assert (fragment.charge, fragment.charge_reason) == (-2, "sum of the oxidation numbers in the file")
    numbers = "loop_\n_atom_type_symbol\n_atom_type_oxidation_number\nFe 6\nO -2"
    fragment = read(cif([*tetraoxo("Fe"), "Te1 Te 0.6 0.6 0.6"], extra=numbers)).molecules[0].fragment
    assert fragment.charge == -2


def test_disagreement_of_balance_and_bond_valence_is_a_doubt(read):
    fragment = read(cif([*tetraoxo(), "K1 K 0.6 0.6 0.6"])).molecules[0].fragment
    assert fragment.charge == -1
    assert any("bond valences alone give the charge -2" in doubt for doubt in fragment.doubts)
    fragment = read(cif(tetraoxo())).molecules[0].fragment
    assert fragment.charge is None
    assert any("Without counter-ions" in doubt for doubt in fragment.doubts)


def test_counter_ions_join_the_fragment_on_request(read):
    sites = [*tetraoxo(), "K1 K 0.45 0.1 0.1", "K2 K 0.6 0.6 0.1"]
    text = cif(sites)
    (plain,) = read(text).molecules
    (joined,) = read(text, cations="basis").molecules
    assert Counter(joined.fragment.symbols) == {"Cr": 1, "O": 4, "K": 2}
    assert joined.fragment.charge == 0
    assert [b.kind for b in perceive(joined.fragment).bonds] == [b.kind for b in perceive(plain.fragment).bonds]
    assert len(joined.fragment.crystal.labels) == 7
    gaps = np.linalg.norm(joined.fragment.positions_A[5:, None] - joined.fragment.positions_A[None, :5], axis=2)
    atoms = Atoms("CrO4K2", np.vstack([joined.fragment.positions_A]), cell=np.eye(3) * 9.0, pbc=True)
    nearest = [atoms.get_distances(k, range(5), mic=True).min() for k in (5, 6)]
    np.testing.assert_allclose(gaps.min(axis=1), nearest, atol=1e-6)


def test_labels_of_the_file_are_kept_and_told(read):
    sites = [line.replace("O1 ", "O(5) ", 1) for line in tetraoxo()]
    fragment = read(cif(sites)).molecules[0].fragment
    assert fragment.crystal.labels[1] == "O(5)"
    assert any("O2 is O(5)" in note for note in fragment.notes)


def test_several_blocks_and_a_faulty_one(tmp_path):
    path = tmp_path / "a.cif"
    good = cif(tetraoxo(), name="one")
    path.write_text(good.replace("data_one", "data_bad").replace("O1 O 0.2053", "O1 O ?") + good)
    (contents,) = read_crystals(path)
    assert "block one" in contents.source
    assert any("block bad" in note and "O1" in note for note in contents.notes)
    path.write_text(good + good.replace("data_one", "data_two"))
    with pytest.raises(InputError, match="2 crystal structures"):
        crystal_contents(path)
    assert len(read_frames(path)) == 2


@pytest.mark.parametrize("value", ["?", "\n;\n?\n;", "'.'"])
def test_title_that_says_nothing_is_none(read, value):
    contents = read(cif(tetraoxo(), extra=f"_chemical_name_systematic {value}", name="own"))
    assert contents.title == "own"
