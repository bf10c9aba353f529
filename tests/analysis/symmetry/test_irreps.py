"""Irreps of the orbitals of whole calculations."""

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

from ehmo import bond_report
from ehmo.analysis.symmetry import (
    donor_irreps,
    find_symmetry,
    functions_of_atoms,
    lowdin_rows,
    orbital_irreps,
    point_group,
)
from ehmo.electronic.eigen import overlap_spectrum
from ehmo.harmonics import harmonic_rotations
from ehmo.records.basis import Basis
from tests.analysis.symmetry.spheres import SPHERES
from tests.analysis.symmetry.test_detect import numbers, random_rotation
from tests.geometries import SPECIES


def calculated(name, whole=True, rms_A=0.0, turn=None, **options):
    """Report, symmetry and irreps of a species, judged on all atoms or on the sphere of its metal."""
    fragment = SPECIES[name].fragment()
    rng = np.random.default_rng(5)
    moved = fragment.positions_A + rng.normal(0, rms_A / np.sqrt(3), fragment.positions_A.shape) * (rms_A > 0)
    fragment = replace(fragment, positions_A=moved if turn is None else moved @ turn.T)
    report = bond_report(fragment)
    coordination = report.coordination
    if whole:
        symmetry = find_symmetry(fragment.positions_A, numbers(fragment.symbols), tolerance_A=1e-3, **options)
    else:
        metal = coordination.metals[0]
        atoms = [metal] + [bond.donor for bond in coordination.bonds_of(metal)]
        kinds = np.array(numbers(fragment.symbols)) * 10
        for bond in coordination.bonds_of(metal):
            kinds[bond.donor] += bond.may_be_multiple
        symmetry = find_symmetry(
            fragment.positions_A, kinds, atoms=atoms, origin=metal, preferred_axes=coordination.frames[0].axes
        )
    spectrum = overlap_spectrum(report.overlap, report.basis)
    lowdin = lowdin_rows(spectrum, np.arange(len(report.basis)), report.state.coefficients)
    return report, symmetry, lowdin, orbital_irreps(symmetry, report.basis, lowdin, report.state.energies_eV)


def metal_share(report, l):
    """Löwdin-free measure of how much of each orbital lies in the metal's shell of that l."""
    basis = report.basis
    rows = (basis.atom_of == report.coordination.metals[0]) & (basis.shell_l[basis.shell_of] == l)
    coefficients = report.state.coefficients
    return (coefficients * (report.overlap @ coefficients))[rows].sum(axis=0)


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "MnO4 -", "UO2 2+", "[UO2(OH2)5]2+", "[Ti(OH2)6]3+", "Ta(CH2)Cl3"])
@pytest.mark.parametrize("whole", [True, False])
@pytest.mark.parametrize("rms_A", [0.0, 0.04])
def test_shares_are_positive_and_add_up_to_one(name, whole, rms_A):
    _, _, _, irreps = calculated(name, whole, rms_A)
    assert irreps.shares.min() >= 0
    np.testing.assert_allclose(irreps.shares.sum(axis=1), 1.0, atol=1e-12)
    assert ((irreps.parts > 0) & (irreps.parts < 1 + 1e-12)).all()


@pytest.mark.parametrize("name", [name for name in SPECIES if len(SPECIES[name].symbols) < 25])
def test_exact_molecules_have_pure_labels_in_whole_sets(name):
    species = SPECIES[name]
    if find_symmetry(species.positions_A, numbers(species.symbols), tolerance_A=1e-3).rms_A > 1e-6:
        pytest.skip("idealised on an angle of 179.9 degrees: not exact")
    report, symmetry, _, irreps = calculated(name)
    # Coordinates given to 1e-6 degrees leave the labels pure to their square.
    np.testing.assert_allclose(irreps.label_shares, 1.0, atol=1e-9)
    group = symmetry.group
    counts = {irrep: irreps.labels.count(irrep) for irrep in group.irreps}
    assert sum(counts.values()) == len(report.basis)
    for irrep, dimension in zip(group.irreps, group.dimensions, strict=True):
        assert counts[irrep] % dimension == 0


# Our labels in the subgroup that PySCF can use, with the axes kept. Correlation tables of Wilson, Decius, Cross,
# Molecular Vibrations, 1955, appendix X (memory).
DESCENT = {
    ("C4v", "C2v"): {"a1": "A1", "a2": "A2", "b1": "A1", "b2": "A2", "e": "B1 B2"},
    ("Td", "D2"): {"a1": "A", "a2": "A", "e": "A A", "t1": "B1 B2 B3", "t2": "B1 B2 B3"},
    ("D4h", "D2h"): {
        "a1g": "Ag", "a2g": "B1g", "b1g": "Ag", "b2g": "B1g", "eg": "B2g B3g",
        "a1u": "Au", "a2u": "B1u", "b1u": "Au", "b2u": "B1u", "eu": "B2u B3u",
    },
    ("Oh", "D2h"): {
        "a1g": "Ag", "a2g": "Ag", "eg": "Ag Ag", "t1g": "B1g B2g B3g", "t2g": "B1g B2g B3g",
        "a1u": "Au", "a2u": "Au", "eu": "Au Au", "t1u": "B1u B2u B3u", "t2u": "B1u B2u B3u",
    },
    ("D∞h", "D2h"): {
        "σg+": "Ag", "πg": "B2g B3g", "δg": "Ag B1g", "σu+": "B1u", "πu": "B2u B3u", "δu": "Au B1u", "φu": "B2u B3u",
    },
}  # fmt: skip


def pyscf_labels(species, symmetry, subgroup, report, lowdin):
    """Share of each irrep of an Abelian group in each orbital, from PySCF's symmetry-adapted functions."""
    gto = pytest.importorskip("pyscf.gto")
    symm = pytest.importorskip("pyscf.symm")
    basis = report.basis
    shells = {}
    for atom, symbol in enumerate(species.symbols):
        # Any radial function will do: PySCF only has to carry the same angular functions, in rising l.
        shells[f"{symbol}{atom}"] = [[l, [1.0 + 0.1 * k, 1.0]] for k, l in enumerate(sorted(basis.layouts[atom]))]
    positions = (symmetry.symmetrised_A - symmetry.origin_A) @ symmetry.axes.T
    atoms = [
        (f"{symbol}{k}", tuple(point)) for k, (symbol, point) in enumerate(zip(species.symbols, positions, strict=True))
    ]
    mol = gto.M(atom=atoms, basis=shells, unit="Bohr", charge=species.charge, spin=None, verbose=0)
    rows = []
    for atom, layout in enumerate(basis.layouts):
        starts = basis.atom_start[atom] + np.concatenate([[0], np.cumsum(2 * np.array(layout) + 1)[:-1]])
        for place in np.argsort(layout, kind="stable"):
            l = layout[place]
            # PySCF keeps p in the order x, y, z.
            rows += [starts[place] + m for m in ((2, 0, 1) if l == 1 else range(2 * l + 1))]
    adapted, numbers_of = symm.symm_adapted_basis(mol, subgroup)
    names = [symm.irrep_id2name(subgroup, k).replace('"', "''") for k in numbers_of]
    shares = np.array([((block.T @ lowdin[rows]) ** 2).sum(axis=0) for block in adapted])
    return names, shares


@pytest.mark.parametrize(
    ("name", "subgroup"),
    [
        ("CrO2Cl2", "C2v"),
        ("cis-[MoO2Cl4]2-", "C2v"),
        ("[VO(OH2)5]2+", "C2v"),
        ("[Cr(OH2)6]3+", "D2h"),
        ("[Fe(OH2)6]2+", "D2h"),
        ("Ta(CH2)Cl3", "Cs"),
        ("Ti(NMe2)Cl3", "Cs"),
        ("V(NC6H5)Cl3", "Cs"),
        ("[Co(NH3)5(NO)]2+", "C1"),
        ("[VOCl4]2-", "C2v"),
        ("[MoOCl5]2-", "C2v"),
        ("[Fe(CN)5(NO)]2-", "C2v"),
        ("MnO4 -", "D2"),
        ("TiCl4", "D2"),
        ("trans-[OsO2Cl4]2-", "D2h"),
        ("Cr(CO)6", "D2h"),
        ("UO2 2+", "D2h"),
    ],
)
def test_labels_of_every_orbital_agree_with_pyscf(name, subgroup):
    # In the axes of the group, where PySCF's operations are its own.
    _, first_seen, _, _ = calculated(name)
    report, symmetry, lowdin, irreps = calculated(name, turn=first_seen.axes)
    np.testing.assert_allclose(symmetry.axes, np.eye(3), atol=1e-9)
    names, shares = pyscf_labels(SPECIES[name], symmetry, subgroup, report, lowdin)
    group = symmetry.group.name
    descent = DESCENT.get((group, subgroup)) or dict(
        zip(symmetry.group.irreps, symmetry.group.term_irreps, strict=True)
    )
    energies = report.state.energies_eV
    starts = [*np.flatnonzero(np.diff(energies, prepend=-np.inf) > 1e-4), len(energies)]
    for first, stop in pairwise(starts):
        theirs = dict(zip(names, shares[:, first:stop].sum(axis=1), strict=True))
        ours = dict.fromkeys(theirs, 0.0)
        for label in irreps.labels[first:stop]:
            parts = descent[label].split()
            for part in parts:
                ours[part] += 1 / len(parts)
        assert ours == pytest.approx(theirs, abs=1e-6)


def test_permanganate_has_the_textbook_sets():
    # Oxygen 2p in Td: a1 + e + t1 + 2 t2; t1 is the highest filled, e then t2 (3d) above it. Wolfsberg & Helmholz 1952,
    # Ballhausen & Gray, Molecular Orbital Theory, 1964 (memory).
    report, symmetry, _, irreps = calculated("MnO4 -", whole=False)
    assert symmetry.group.name == "Td"
    homo = report.state.homo
    assert irreps.labels[homo - 2 : homo + 6] == ("t1",) * 3 + ("e",) * 2 + ("t2",) * 3
    assert irreps.labels.count("t1") == 3
    assert irreps.labels.count("e") == 4


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "[VOCl4]2-"])
@pytest.mark.parametrize("rms_A", [0.0, 0.05])
def test_d_ladder_of_vanadyl_has_its_c4v_labels(name, rms_A):
    # Ballhausen & Gray, Inorg. Chem. 1, 111 (1962): b2 lowest, then e, b1 and a1 (memory). In the tetrachlorido ion
    # b1 and e may change places.
    report, symmetry, _, irreps = calculated(name, whole=False, rms_A=rms_A)
    assert symmetry.group.name == "C4v"
    share = metal_share(report, 2)
    labels = [irreps.labels[k] for k in np.flatnonzero(share > 0.35)]
    assert sorted(labels) == ["a1", "b1", "b2", "e", "e"] if rms_A == 0 else set(labels) >= {"b2", "e", "b1"}
    assert labels[0] == "b2"
    half_filled = report.state.homo
    assert irreps.labels[half_filled] == "b2"
    shares = irreps.label_shares[half_filled]
    assert shares > 0.999 if rms_A == 0 else 0.8 < shares < 0.9999


def test_uranyl_f_orbitals_are_told_apart_in_any_orientation():
    # Nonbonding f delta and f phi are degenerate here; sigma u and pi u rise. Denning, Struct. Bonding 79, 215 (1992)
    # (memory).
    turn = random_rotation(np.random.default_rng(11))
    report, symmetry, _, irreps = calculated("UO2 2+", whole=False, turn=turn)
    assert symmetry.group.name == "D∞h"
    share = metal_share(report, 3)
    labels = [irreps.labels[k] for k in np.flatnonzero(share > 0.5)]
    assert sorted(labels) == ["δu", "δu", "πu", "πu", "σu+", "φu", "φu"]
    pure = np.flatnonzero(share > 0.999)
    assert sorted(irreps.labels[k] for k in pure) == ["δu", "δu", "φu", "φu"]
    np.testing.assert_allclose(irreps.label_shares[pure], 1.0, atol=1e-9)
    assert np.isin(["πu", "σu+"], [irreps.labels[k] for k in range(pure[-1] + 1, len(share))]).all()


@pytest.mark.parametrize("name", ["[VO(OH2)5]2+", "MnO4 -", "[UO2(OH2)5]2+"])
def test_orientation_changes_neither_labels_nor_shares(name):
    turn = random_rotation(np.random.default_rng(12))
    _, _, _, still = calculated(name, whole=False, rms_A=0.03)
    _, _, _, turned = calculated(name, whole=False, rms_A=0.03, turn=turn)
    assert turned.labels == still.labels
    np.testing.assert_allclose(turned.shares, still.shares, atol=1e-5)


def test_shares_do_not_depend_on_the_combinations_within_a_degenerate_set():
    report, symmetry, lowdin, still = calculated("UO2 2+")
    energies = report.state.energies_eV
    rng = np.random.default_rng(13)
    mixed = lowdin.copy()
    starts = [*np.flatnonzero(np.diff(energies, prepend=-np.inf) > 1e-4), len(energies)]
    for first, stop in pairwise(starts):
        turn, _ = np.linalg.qr(rng.normal(size=(stop - first, stop - first)))
        mixed[:, first:stop] = mixed[:, first:stop] @ turn
    again = orbital_irreps(symmetry, report.basis, mixed, energies)
    assert again.labels == still.labels
    np.testing.assert_allclose(again.shares, still.shares, atol=1e-9)


def test_shares_are_those_of_projectors_written_out():
    report, symmetry, lowdin, irreps = calculated("VOCl3", whole=False, rms_A=0.06)
    assert symmetry.group.name == "C3v"
    basis, group = report.basis, symmetry.group
    rows = functions_of_atoms(basis, symmetry.atoms)
    lab = symmetry.axes.T @ group.operations @ symmetry.axes
    places = {int(row): k for k, row in enumerate(rows)}
    projected = np.zeros((len(group.irreps), len(rows), lowdin.shape[1]))
    for operation, images, weights in zip(lab, symmetry.permutations, group.projection_weights.T, strict=True):
        matrix = np.zeros((len(rows), len(rows)))
        for atom, image in zip(symmetry.atoms, symmetry.atoms[images], strict=True):
            shift = 0
            for l in basis.layouts[atom]:
                to = [places[basis.atom_start[image] + shift + k] for k in range(2 * l + 1)]
                out = [places[basis.atom_start[atom] + shift + k] for k in range(2 * l + 1)]
                matrix[np.ix_(to, out)] = harmonic_rotations(operation[None], l)[0]
                shift += 2 * l + 1
        projected += weights[:, None, None] * (matrix @ lowdin[rows])
    expected = (projected**2).sum(axis=1).T
    expected /= expected.sum(axis=1, keepdims=True)
    np.testing.assert_allclose(irreps.shares, expected, atol=1e-9)


def test_rows_of_the_judged_atoms_suffice():
    report, symmetry, lowdin, irreps = calculated("[VO(OH2)5]2+", whole=False)
    rows = functions_of_atoms(report.basis, symmetry.atoms)
    again = orbital_irreps(symmetry, report.basis, lowdin[rows], report.state.energies_eV)
    assert again.labels == irreps.labels
    with pytest.raises(ValueError, match="rows, expected"):
        orbital_irreps(symmetry, report.basis, lowdin[rows[1:]], report.state.energies_eV)


def test_orbitals_off_the_judged_atoms_get_no_label():
    report, _, lowdin, _ = calculated("[VO(OH2)5]2+")
    metal_alone = find_symmetry(report.fragment.positions_A, [0] * len(report.fragment), atoms=[0], origin=0)
    irreps = orbital_irreps(metal_alone, report.basis, lowdin, report.state.energies_eV)
    unlabelled = np.array([label == "" for label in irreps.labels])
    np.testing.assert_array_equal(unlabelled, irreps.parts < 1e-3)
    assert unlabelled.any()
    assert set(irreps.labels) - {""} <= {"a1g", "t1u", "eg", "t2g"}


def test_atoms_of_different_elements_may_not_be_exchanged():
    report, _, lowdin, _ = calculated("VOCl3")
    positions = SPHERES["tetrahedron"].positions_A
    careless = find_symmetry(positions, [0, 1, 1, 1, 1], origin=0)
    wrong = replace(careless, atoms=np.array([0, 1, 2, 3, 4]))
    basis = report.basis
    bare = Basis(
        basis.symbols, basis.core_charges, basis.shell_atom[:-1], basis.shell_n[:-1], basis.shell_l[:-1],
        basis.shell_type[:-1], basis.type_h_ii_eV,
    )  # fmt: skip
    with pytest.raises(ValueError, match="different shells"):
        orbital_irreps(wrong, bare, lowdin[: len(bare)], report.state.energies_eV)


# Sigma and pi functions of the donors: Cotton 1990, chapters 8 and 9 (memory).
@pytest.mark.parametrize(
    ("name", "sigma", "pi"),
    [
        ("octahedron", {"a1g": 1, "eg": 1, "t1u": 1}, {"t1g": 1, "t2g": 1, "t1u": 1, "t2u": 1}),
        ("tetrahedron", {"a1": 1, "t2": 1}, {"e": 1, "t1": 1, "t2": 1}),
        (
            "square plane",
            {"a1g": 1, "b1g": 1, "eu": 1},
            {"a2g": 1, "b2g": 1, "eg": 1, "a2u": 1, "b2u": 1, "eu": 1},
        ),
        (
            "trigonal bipyramid",
            {"a1'": 2, "e'": 1, "a2''": 1},
            {"a2'": 1, "e'": 2, "a2''": 1, "e''": 2},
        ),
        ("linear dioxo", {"σg+": 1, "σu+": 1}, {"πg": 1, "πu": 1}),
    ],
)
def test_donor_functions_span_the_textbook_irreps(name, sigma, pi):
    ideal = SPHERES[name]
    symmetry = find_symmetry(ideal.positions_A, ideal.kinds, origin=0)
    assert donor_irreps(symmetry, np.arange(1, len(ideal.kinds))) == (sigma, pi)


def test_part_of_a_set_of_donors_is_refused():
    ideal = SPHERES["octahedron"]
    symmetry = find_symmetry(ideal.positions_A, ideal.kinds, origin=0)
    with pytest.raises(ValueError, match="whole set"):
        donor_irreps(symmetry, np.array([1, 2]))


def test_e_joined_from_two_conjugate_irreps_projects_as_one():
    group = point_group("C4")
    weights = group.projection_weights[group.irreps.index("e")]
    projector = np.einsum("g,gab->ab", weights, group.operations)
    np.testing.assert_allclose(projector, np.diag([1.0, 1.0, 0.0]), atol=1e-12)
