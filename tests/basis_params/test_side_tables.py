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
from basis_params.ligand_field import pairing_energy, racah, spin_orbit
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


def test_every_row_has_a_known_source_locator_and_provenance():
    bad = [row for row in rows_with_sources() if row[1] not in REFERENCES or not row[2] or row[3] not in PROVENANCE]
    assert not bad


def test_no_reference_is_an_orphan():
    used = {key for _, key, _, _ in rows_with_sources()}
    code = "".join(path.read_text("utf-8") for path in PACKAGE.glob("*.py"))
    code += "".join(locator for _, _, locator, _ in rows_with_sources())
    assert not [key for key in REFERENCES if key not in used and key not in code]


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


@pytest.mark.parametrize("symbol", ["H", "O", "V", "Mn", "Mo", "Re", "U", "Cm"])
def test_atoms_equal_mendeleev(symbol):
    """Cross-check: mendeleev, the library the values were read in."""
    ours, theirs = basis_params.atom(symbol), mendeleev.element(symbol)
    assert ours.number == theirs.atomic_number
    assert ours.ionisation_energy_eV == pytest.approx(theirs.ionenergies[1], abs=1e-6)
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


def test_free_ion_constants():
    """Published (memory): Cr3+ B 918 (Griffith 1961), V4+ zeta 250 (Dunn 1961), Fe2+ pairing 17600 (Griffith 1961)."""
    assert racah("Cr", 3).B_per_cm == 918
    assert spin_orbit("V", 4).zeta_per_cm == 250
    assert pairing_energy("Fe", 2).pairing_energy_per_cm == 17600


@pytest.mark.parametrize("table", ["racah", "spin_orbit", "pairing"])
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
        assert rows[light, 4 if light != "Cr" else 3] < rows[heavy, 4 if light != "Cr" else 3]


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


@pytest.mark.parametrize(("cation", "anion", "R0"), [("C", "O", 1.39), ("Mo", "Cl", 2.28), ("W", "O", 1.917)])
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
