"""Side tables against other libraries, published values and laws."""

import ast
import csv
import json
import sys
from importlib import resources
from pathlib import Path

import mendeleev
import pytest

import basis_params
from basis_params.bond_valence import bond_valence_R0
from basis_params.ligand_field import pairing_energy, racah, slater_integrals, spin_orbit
from basis_params.rows import side_table

PACKAGE = Path(str(resources.files("basis_params")))
TABLES = sorted(path.stem for path in (PACKAGE / "tables").glob("*.csv"))
REFERENCES = json.loads((PACKAGE / "references.json").read_text("utf-8"))
PROVENANCE = {"read", "memory", "derived"}


def rows_with_sources():
    for name in TABLES:
        for row in side_table(name):
            yield name, row["source_key"], row["locator"], row["provenance"]
    for name in basis_params.available_sets():
        for element in basis_params.load_set(name).elements.values():
            for shell in element.shells:
                yield name, shell.source_key, shell.locator, shell.provenance
        for pair in basis_params.load_set(name).repulsion.values():
            yield name, pair.source_key, pair.locator, pair.provenance


def test_every_row_has_a_known_source_locator_and_provenance():
    bad = [row for row in rows_with_sources() if row[1] not in REFERENCES or not row[2] or row[3] not in PROVENANCE]
    assert not bad


def test_references_are_complete():
    keys = {"authors", "year", "journal", "volume", "page", "note"}
    assert all(keys <= set(entry) <= keys | {"title"} for entry in REFERENCES.values())
    assert list(REFERENCES) == sorted(REFERENCES)


def test_the_package_imports_only_the_standard_library():
    imported = set()
    for path in PACKAGE.rglob("*.py"):
        for node in ast.walk(ast.parse(path.read_text("utf-8"))):
            if isinstance(node, ast.Import):
                imported |= {alias.name.split(".")[0] for alias in node.names}
            elif isinstance(node, ast.ImportFrom):
                imported.add((node.module or "").split(".")[0])
    assert imported <= sys.stdlib_module_names | {"basis_params"}


@pytest.mark.parametrize("symbol", basis_params.atom_symbols())
def test_atoms_equal_mendeleev(symbol):
    """Cross-check: mendeleev, the library the values were read in."""
    ours, theirs = basis_params.atom(symbol), mendeleev.element(symbol)
    assert ours.number == theirs.atomic_number
    assert ours.ionisation_energy_eV == pytest.approx(theirs.ionenergies[1], abs=1e-6)
    if theirs.electron_affinity is None:
        assert ours.electron_affinity_eV is None
    else:
        assert ours.electron_affinity_eV == pytest.approx(theirs.electron_affinity, abs=1e-6)
    assert ours.covalent_radius_A == pytest.approx(theirs.covalent_radius_cordero / 100)
    for charge in range(1, 9):
        if charge in theirs.ionenergies:
            expected = pytest.approx(theirs.ionenergies[charge], abs=1e-5)
            assert basis_params.ionisation_energy(symbol, charge) == expected


def test_atoms_run_from_hydrogen_to_curium_without_gaps():
    symbols = basis_params.atom_symbols()
    assert [basis_params.atom(symbol).number for symbol in symbols] == list(range(1, 97))


def test_hardness_of_atoms_with_and_without_a_bound_anion():
    """Published: Parr, Pearson 1983 (memory), I - A of O 12.16 and of N, whose anion is unbound, I alone."""
    assert basis_params.atom("O").hardness_U_eV == pytest.approx(12.16, abs=0.01)
    nitrogen = basis_params.atom("N")
    assert nitrogen.hardness_U_eV == nitrogen.ionisation_energy_eV
    assert basis_params.atom("U").electron_affinity_eV is None
    assert basis_params.atom("U").hardness_U_eV == basis_params.atom("U").ionisation_energy_eV


def test_unknown_atoms_ions_and_pairs_are_key_errors():
    for call in (
        lambda: basis_params.atom("Xx"),
        lambda: basis_params.ionisation_energy("H", 2),
        lambda: basis_params.atomic_orbital("He", 1, 0),
        lambda: basis_params.load_set("Standard"),
        lambda: bond_valence_R0("Xx", "O", 2),
    ):
        with pytest.raises(KeyError):
            call()
    with pytest.raises(KeyError, match=r"no Racah parameters for 'V' 9\+: charges held for it are 2\+, 3\+, 4\+"):
        racah("V", 9)


def test_successive_ionisation_energies_rise():
    """Law: each further electron is bound more strongly."""
    for symbol in basis_params.atom_symbols():
        known = [
            float(x)
            for k, x in next(r for r in side_table("ionisation") if r["symbol"] == symbol).items()
            if k.startswith("I") and x
        ]
        assert known == sorted(known)


@pytest.mark.parametrize(
    ("symbol", "charge", "B", "C"),
    [
        *(("Ti", 2, 695, 2910), ("V", 2, 755, 3257), ("V", 3, 862, 3815), ("Cr", 2, 810, 3565)),
        *(("Cr", 3, 918, 4133), ("Mn", 2, 860, 3850), ("Mn", 3, 965, 4450), ("Mn", 4, 1065, 4919)),
        *(("Fe", 2, 917, 4040), ("Fe", 3, 1015, 4800), ("Co", 2, 971, 4497), ("Co", 3, 1065, 5120)),
        ("Ni", 2, 1030, 4850),
    ],
)
def test_racah_parameters_agree_with_a_second_compilation(symbol, charge, B, C):
    """Published: Tanabe, Sugano, J. Phys. Soc. Jpn. 9, 766 (1954) (memory); fits to other terms differ by a fifth."""
    ours = racah(symbol, charge)
    assert pytest.approx(B, rel=0.2) == ours.B_per_cm
    assert pytest.approx(C, rel=0.2) == ours.C_per_cm


@pytest.mark.parametrize(
    ("symbol", "charge", "term", "in_B", "in_C", "level"),
    [
        *(("Cr", 3, "2G", 4, 3, 14800), ("Cr", 3, "4P", 15, 0, 13800), ("Mn", 2, "4G", 10, 5, 26850)),
        *(("Fe", 3, "4G", 10, 5, 32300), ("Co", 2, "4P", 15, 0, 14600), ("Co", 2, "2G", 4, 3, 16500)),
        *(("Ni", 2, "3P", 15, 0, 15900), ("Ni", 2, "1G", 12, 2, 22200), ("V", 3, "3P", 15, 0, 12800)),
    ],
)
def test_racah_parameters_give_free_ion_terms(symbol, charge, term, in_B, in_C, level):
    """Published: NIST levels, averaged over J, above the ground term (memory, to 300 cm-1)."""
    ion = racah(symbol, charge)
    assert in_B * ion.B_per_cm + in_C * ion.C_per_cm == pytest.approx(level, rel=0.08), term


def test_pairing_energies_follow_from_racah_parameters():
    """Published: pairing energies against the strong-field expressions in B and C (Griffith 1961, memory)."""
    in_B_and_C = {4: (6.0, 5.0), 5: (7.5, 5.0), 6: (2.5, 4.0), 7: (4.0, 4.0)}
    for row in (r for r in side_table("pairing") if r["provenance"] == "memory"):
        symbol, charge = row["symbol"], int(row["charge"])
        in_B, in_C = in_B_and_C[basis_params.atom(symbol).number - 18 - charge]
        ion = racah(symbol, charge)
        expected = in_B * ion.B_per_cm + in_C * ion.C_per_cm
        assert pairing_energy(symbol, charge).pairing_energy_per_cm == pytest.approx(expected, rel=0.12), row


OXO_METALS = ["Ti", "V", "Cr", "Mn", "Fe", "Co", "Ni", "Cu", "Nb", "Mo", "Tc", "Ru", "Rh"]
OXO_METALS += ["Ta", "W", "Re", "Os", "Ir", "Pt"]
GROUPS = {"Ti": 4, "V": 5, "Cr": 6, "Mn": 7, "Fe": 8, "Co": 9, "Ni": 10, "Cu": 11, "Nb": 5, "Mo": 6, "Tc": 7, "Ru": 8}
GROUPS |= {"Rh": 9, "Ta": 5, "W": 6, "Re": 7, "Os": 8, "Ir": 9, "Pt": 10}


@pytest.mark.parametrize("symbol", OXO_METALS)
def test_every_ion_of_an_oxo_metal_has_its_constants(symbol):
    """Law: d1 to d9 ions of charge 2 to 7 have zeta, B and C; d2 to d8 ones a pairing energy."""
    for charge in range(2, 8):
        d = GROUPS[symbol] - charge
        if 1 <= d <= 9:
            assert spin_orbit(symbol, charge).zeta_per_cm > 0
            assert racah(symbol, charge).C_per_cm > 0
        if 2 <= d <= 8:
            assert pairing_energy(symbol, charge).pairing_energy_per_cm > 0


@pytest.mark.parametrize(("symbol", "charges"), [("U", (3, 4)), ("Np", (3, 4, 5)), ("Pu", (3, 4, 5, 6))])
def test_actinide_ions_have_slater_integrals_and_spin_orbit_constants(symbol, charges):
    for charge in charges:
        ion = slater_integrals(symbol, charge)
        assert ion.F2_per_cm > ion.F4_per_cm > ion.F6_per_cm > 0
        assert spin_orbit(symbol, charge).zeta_per_cm > 0
    assert spin_orbit("U", 5).zeta_per_cm < spin_orbit("Np", 6).zeta_per_cm


@pytest.mark.parametrize("table", ["racah", "spin_orbit", "pairing", "slater"])
def test_ions_are_listed_once_and_positive(table):
    rows = side_table(table)
    ions = [(row["symbol"], row["charge"]) for row in rows]
    assert len(set(ions)) == len(ions)
    assert all(float(v) > 0 for row in rows for k, v in row.items() if k.endswith("_per_cm"))


def test_spin_orbit_constants_rise_with_charge_and_down_a_group():
    """Law: zeta follows <r^-3>, which grows with the charge of the ion and down a group."""
    rows = {(r["symbol"], int(r["charge"])): float(r["zeta_per_cm"]) for r in side_table("spin_orbit")}
    for (symbol, charge), zeta in rows.items():
        assert rows.get((symbol, charge + 1), float("inf")) > zeta
    for light, heavy in (("V", "Nb"), ("Nb", "Ta"), ("Cr", "Mo"), ("Mo", "W"), ("Fe", "Ru"), ("Ru", "Os")):
        assert rows[light, 4] < rows[heavy, 4]


def test_bond_valence_reproduces_a_valence():
    """Published: Brown, Altermatt 1985 (read in a tabulation): R0(V5+-O) 1.803, B 0.37."""
    row = bond_valence_R0("V", "O", 5)
    assert (row.R0_A, row.B_A, row.exact, row.source_key) == (1.803, 0.37, True, "brown-1985")
    assert row.valence(1.803) == 1.0


def test_bond_valence_falls_back_in_steps_and_says_so():
    any_state = bond_valence_R0("Cr", "N", 3)
    assert (any_state.oxidation_state, any_state.exact) == (9, False)
    nearest = bond_valence_R0("Os", "O", 7)
    assert (nearest.oxidation_state, nearest.exact) == (8, False)
    highest = bond_valence_R0("Os", "O")
    assert (highest.oxidation_state, highest.exact) == (8, False)
    estimate = bond_valence_R0("Fe", "C", 2)
    assert (estimate.oxidation_state, estimate.provenance, estimate.exact) == (None, "derived", False)


@pytest.mark.parametrize(
    ("cation", "anion", "R0"), [("C", "O", 1.39), ("Mo", "Cl", 2.28), ("W", "O", 1.917), ("Np", "F", 1.97)]
)
def test_bond_valence_estimate_comes_near_the_fitted_values(cation, anion, R0):
    """Published: fitted R0 of Brown, Altermatt 1985 and Brese, O'Keeffe 1991 within the 0.03 A of the estimate."""
    assert pytest.approx(R0, abs=0.03) == basis_params.bond_valence._estimate(cation, anion).R0_A


def test_bond_valence_rows_are_unique():
    rows = [(r["cation"], r["oxidation_state"], r["anion"]) for r in side_table("bond_valence")]
    assert len(set(rows)) == len(rows)


def test_tables_are_rectangular():
    for path in PACKAGE.rglob("*.csv"):
        lines = [line for line in path.read_text("utf-8").splitlines() if not line.startswith("#")]
        assert len({len(row) for row in csv.reader(lines, strict=True)}) == 1, path


PUBLISHED_SPHERES = [
    ("V", 5, {"O": [1.57], "Cl": [2.142] * 3}, "VOCl3, electron diffraction: Karakida, Kuchitsu 1975 (memory)"),
    ("Cr", 6, {"O": [1.65] * 4}, "CrO4 2-, X-ray, common practice"),
    ("Mn", 7, {"O": [1.61] * 4}, "MnO4 -, X-ray, common practice"),
    ("Mo", 6, {"O": [1.76] * 4}, "MoO4 2-, X-ray, common practice"),
    ("Tc", 7, {"O": [1.71] * 4}, "TcO4 -, X-ray, common practice"),
    ("Tc", 5, {"O": [1.61], "Cl": [2.31] * 4}, "TcOCl4 -: Cotton, Davison, Day 1979 (memory)"),
    ("W", 6, {"O": [1.78] * 4}, "WO4 2-, X-ray, common practice"),
    ("Re", 7, {"O": [1.73] * 4}, "ReO4 -, X-ray, common practice"),
    ("Os", 6, {"O": [1.75] * 2 + [2.03] * 4}, "trans-OsO2(OH)4 2-, X-ray, common practice"),
    ("Os", 8, {"O": [1.711] * 4}, "OsO4, electron diffraction: Seip, Stolevik 1966 (memory)"),
    ("U", 6, {"O": [1.77] * 2 + [2.42] * 5}, "UO2(H2O)5 2+, X-ray absorption, common practice"),
]


@pytest.mark.parametrize(("cation", "state", "lengths_A"), [row[:3] for row in PUBLISHED_SPHERES])
def test_bond_valence_sum_of_a_known_sphere_is_near_the_oxidation_state(cation, state, lengths_A):
    """Law: the sum is the oxidation state (Brown, Altermatt 1985), here within 15 %."""
    bonds = [(anion, R) for anion, many in lengths_A.items() for R in many]
    total = sum(bond_valence_R0(cation, anion, state).valence(R) for anion, R in bonds)
    assert total == pytest.approx(state, rel=0.15)


def test_every_metal_of_the_oxo_chemistry_has_bond_valences_with_the_common_donors():
    for symbol in [*OXO_METALS, "Th", "U", "Np", "Pu"]:
        for donor in ("O", "N", "C", "F", "S", "P", "Cl", "Br", "I"):
            assert 1.4 < bond_valence_R0(symbol, donor).R0_A < 3.0


@pytest.mark.parametrize(("symbol", "number"), [("H", 2), ("C", 13), ("O", 18), ("Mo", 98), ("U", 238)])
def test_masses_of_nuclides(symbol, number):
    """Cross-check: mendeleev (installed version; the table was read in 1.3.0)."""
    isotope = next(i for i in mendeleev.element(symbol).isotopes if i.mass_number == number)
    assert basis_params.atomic_mass(symbol, number) == pytest.approx(isotope.mass, abs=1e-6)


def test_standard_weights_lie_among_the_nuclides():
    # Law: a mean of masses.
    for symbol in basis_params.atom_symbols():
        weight = basis_params.atomic_mass(symbol)
        near = [n for n in range(int(weight) - 6, int(weight) + 8) if (symbol, n) in known_nuclides()]
        if near:
            assert min(near) - 1 < weight < max(near) + 1
    with pytest.raises(KeyError, match="no nuclide 'O' 99: the table has 16, 17, 18"):
        basis_params.atomic_mass("O", 99)


def known_nuclides():
    return {(row["symbol"], int(row["mass_number"])) for row in side_table("masses") if row["mass_number"]}
