"""Operations and characters of the point groups."""

import numpy as np
import pytest

from ehmo.analysis.symmetry import GROUP_NAMES, ascii_symbol, point_group, shell_irreps
from ehmo.analysis.symmetry.adapted import shell_operations
from ehmo.analysis.symmetry.groups import multiplication_table
from ehmo.conventions import ORBITAL_NAMES
from ehmo.errors import InputError

ORDERS = {
    "C1": 1, "Cs": 2, "Ci": 2, "C6": 6, "C5v": 10, "C4h": 8, "C3h": 6, "D2": 4, "D6": 12, "D2h": 8, "D5h": 20,
    "D6h": 24, "D2d": 8, "D4d": 16, "D5d": 20, "D6d": 24, "S4": 4, "S6": 6, "S8": 8, "Td": 24, "Oh": 48,
}  # fmt: skip


@pytest.fixture(params=GROUP_NAMES)
def group(request):
    return point_group(request.param)


def test_operations_are_orthogonal_and_form_a_group(group):
    np.testing.assert_allclose(
        group.operations @ group.operations.swapaxes(1, 2),
        np.broadcast_to(np.eye(3), group.operations.shape),
        atol=1e-12,
    )
    table = multiplication_table(group.operations)
    places = np.arange(len(group))
    assert (np.sort(table, axis=0) == places[:, None]).all()
    assert (np.sort(table, axis=1) == places).all()
    np.testing.assert_array_equal(group.operations[0], np.eye(3))


@pytest.mark.parametrize(("name", "order"), ORDERS.items())
def test_order_of_the_group(name, order):
    assert len(point_group(name)) == order


def test_operations_that_do_not_close_are_refused():
    with pytest.raises(ValueError, match="do not close"):
        multiplication_table(point_group("C4").operations[:2])


def test_rows_of_the_character_table_are_orthogonal(group):
    # Great orthogonality theorem (Wigner 1931); E joined from two conjugate representations has norm 2.
    products = group.by_operation @ group.by_operation.T / len(group)
    norms = products.diagonal()
    joined = (group.dimensions == 2) & (norms > 1.5)
    np.testing.assert_allclose(products, np.diag(np.where(joined, 2.0, 1.0)), atol=1e-12)
    cyclic = group.name[0] == "S" or (group.name[0] == "C" and group.name[2:] in ("", "h"))
    assert joined.any() == (cyclic and (group.dimensions == 2).any())


def test_columns_of_the_character_table_are_orthogonal(group):
    norms = (group.by_operation**2).sum(axis=1) / len(group)
    columns = group.characters.T @ (group.characters / norms[:, None])
    sizes = np.bincount(group.class_of)
    first = [int(np.flatnonzero(group.class_of == k)[0]) for k in range(len(sizes))]
    inverse = [
        group.class_of[np.abs(group.operations - group.operations[k].T).max(axis=(1, 2)).argmin()] for k in first
    ]
    same = np.eye(len(sizes))
    # Real characters cannot tell a class from that of its inverses: the theorem for the mean of both.
    np.testing.assert_allclose(columns, (same + same[inverse]) / 2 * len(group) / sizes, atol=1e-9)


def test_squared_dimensions_add_up_to_the_order(group):
    norms = (group.by_operation**2).sum(axis=1) / len(group)
    assert (group.dimensions**2 / norms).sum() == pytest.approx(len(group))
    np.testing.assert_array_equal(group.dimensions, group.characters[:, 0])


def test_classes_are_closed_under_conjugation_and_named_by_their_size(group):
    table = multiplication_table(group.operations)
    for k in range(len(group)):
        inverse = int((table[k] == 0).argmax())
        conjugates = table[table[k], inverse]
        np.testing.assert_array_equal(group.class_of[conjugates], group.class_of)
    for label, size in zip(group.class_labels, np.bincount(group.class_of), strict=True):
        assert (int(label[: len(str(size))]) if size > 1 else 1) == size
    assert len(set(group.class_labels)) == len(group.class_labels)


def test_characters_of_one_dimension_multiply_like_the_operations(group):
    table = multiplication_table(group.operations)
    for characters in group.by_operation[group.dimensions == 1]:
        np.testing.assert_allclose(characters[table], np.outer(characters, characters), atol=1e-12)


def test_symbols_follow_the_signs_of_the_operations(group):
    # Mulliken 1955: g and u by inversion, ' and '' by the horizontal plane.
    for operation, marks in ((-np.eye(3), "gu"), (np.diag([1.0, 1.0, -1.0]), ("'", "''"))):
        found = np.flatnonzero(np.abs(group.operations - operation).max(axis=(1, 2)) < 1e-9)
        if not found.size or (marks != "gu" and "''" not in "".join(group.irreps)):
            continue
        for irrep, value in zip(group.irreps, group.by_operation[:, found[0]], strict=True):
            if marks == "gu":
                assert ("g" in irrep) == (value > 0), irrep
            else:
                assert ("''" in irrep) == (value < 0), irrep


# Vector and d functions: Cotton, Chemical Applications of Group Theory, 3rd ed. 1990, appendix II (memory).
TEXTBOOK = {
    "Cs": ("2 a' + a''", "3 a' + 2 a''"),
    "Ci": ("3 au", "5 ag"),
    "C2": ("a + 2 b", "3 a + 2 b"),
    "C3": ("a + e", "a + 2 e"),
    "C4": ("a + e", "a + 2 b + e"),
    "C2v": ("a1 + b1 + b2", "2 a1 + a2 + b1 + b2"),
    "C3v": ("a1 + e", "a1 + 2 e"),
    "C4v": ("a1 + e", "a1 + b1 + b2 + e"),
    "C5v": ("a1 + e1", "a1 + e1 + e2"),
    "C6v": ("a1 + e1", "a1 + e1 + e2"),
    "C2h": ("au + 2 bu", "3 ag + 2 bg"),
    "C3h": ("e' + a''", "a' + e' + e''"),
    "C4h": ("au + eu", "ag + 2 bg + eg"),
    "D2": ("b1 + b2 + b3", "2 a + b1 + b2 + b3"),
    "D3": ("a2 + e", "a1 + 2 e"),
    "D4": ("a2 + e", "a1 + b1 + b2 + e"),
    "D5": ("a2 + e1", "a1 + e1 + e2"),
    "D2h": ("b1u + b2u + b3u", "2 ag + b1g + b2g + b3g"),
    "D3h": ("e' + a2''", "a1' + e' + e''"),
    "D4h": ("a2u + eu", "a1g + b1g + b2g + eg"),
    "D5h": ("e1' + a2''", "a1' + e2' + e1''"),
    "D6h": ("a2u + e1u", "a1g + e1g + e2g"),
    "D2d": ("b2 + e", "a1 + b1 + b2 + e"),
    "D3d": ("a2u + eu", "a1g + 2 eg"),
    "D4d": ("b2 + e1", "a1 + e2 + e3"),
    "D5d": ("a2u + e1u", "a1g + e1g + e2g"),
    "D6d": ("b2 + e1", "a1 + e2 + e5"),
    "S4": ("b + e", "a + 2 b + e"),
    "S6": ("au + eu", "ag + 2 eg"),
    "S8": ("b + e1", "a + e2 + e3"),
    "Td": ("t2", "e + t2"),
    "Oh": ("t1u", "eg + t2g"),
    "C∞v": ("σ+ + π", "σ+ + π + δ"),
    "D∞h": ("σu+ + πu", "σg+ + πg + δg"),
}


@pytest.mark.parametrize("name", TEXTBOOK)
@pytest.mark.parametrize("l", [1, 2])
def test_vector_and_d_functions_decompose_as_in_the_textbook(name, l):
    counts = shell_irreps(point_group(name), l)
    assert (
        " + ".join(f"{count} {irrep}" if count > 1 else irrep for irrep, count in counts.items())
        == TEXTBOOK[name][l - 1]
    )


# f functions: Griffith, The Theory of Transition-Metal Ions, 1961 (memory); Td by correlation with Oh.
@pytest.mark.parametrize(
    ("name", "expected"),
    [
        ("Oh", {"a2u", "t1u", "t2u"}),
        ("Td", {"a1", "t1", "t2"}),
        ("D∞h", {"σu+", "πu", "δu", "φu"}),
        ("C∞v", {"σ+", "π", "δ", "φ"}),
    ],
)
def test_f_functions_decompose_as_in_the_textbook(name, expected):
    assert set(shell_irreps(point_group(name), 3)) == expected


ORBITALS = {
    "C4v": {"dx2-y2": "b1", "dxy": "b2", "dz2": "a1", "dxz": "e", "dyz": "e", "pz": "a1"},
    "C2v": {"px": "b1", "py": "b2", "dxy": "a2", "dxz": "b1", "dyz": "b2", "dx2-y2": "a1"},
    "C3v": {"dz2": "a1", "dxy": "e", "dxz": "e"},
    "D4h": {"dx2-y2": "b1g", "dxy": "b2g", "dz2": "a1g", "dxz": "eg", "pz": "a2u", "px": "eu"},
    "D2h": {"dxy": "b1g", "dxz": "b2g", "dyz": "b3g", "pz": "b1u", "py": "b2u", "px": "b3u"},
    "D2": {"pz": "b1", "py": "b2", "px": "b3"},
    "D2d": {"dx2-y2": "b1", "dxy": "b2", "dxz": "e", "pz": "b2"},
    "D3h": {"dz2": "a1'", "dxy": "e'", "dx2-y2": "e'", "dxz": "e''", "pz": "a2''", "px": "e'"},
    "D5h": {"dz2": "a1'", "dxy": "e2'", "dxz": "e1''"},
    "D6h": {"dxz": "e1g", "dxy": "e2g"},
    "Oh": {"dz2": "eg", "dx2-y2": "eg", "dxy": "t2g", "pz": "t1u", "fxyz": "a2u"},
    "Td": {"dz2": "e", "dx2-y2": "e", "dxy": "t2", "pz": "t2", "fxyz": "a1"},
    "D∞h": {"dz2": "σg+", "dxz": "πg", "dxy": "δg", "fz3": "σu+", "fxz2": "πu", "fxyz": "δu", "fx(x2-3y2)": "φu"},
    "C∞v": {"pz": "σ+", "px": "π", "dxy": "δ"},
}


@pytest.mark.parametrize(
    ("name", "orbital", "irrep"), [(name, *item) for name, items in ORBITALS.items() for item in items.items()]
)
def test_single_functions_carry_the_customary_label(name, orbital, irrep):
    group = point_group(name)
    l = next(l for l, names in enumerate(ORBITAL_NAMES) if orbital in names)
    place = ORBITAL_NAMES[l].index(orbital)
    own = shell_operations(name, l)[:, place, place]
    shares = dict(zip(group.irreps, group.projection_weights @ own, strict=True))
    assert shares[irrep] == pytest.approx(1.0)


def test_axial_vectors_of_linear_groups_have_a_minus_sign():
    # Rotation about the axis is sigma minus: its character is the determinant times that of the z coordinate.
    for name, irrep in (("D∞h", "σg-"), ("C∞v", "σ-")):
        group = point_group(name)
        axial = np.linalg.det(group.operations) * group.operations[:, 2, 2]
        assert group.multiplicities(axial)[group.irreps.index(irrep)] == 1


@pytest.mark.parametrize(
    ("name", "product", "expected"),
    [
        ("Oh", ("t2g", "t2g"), {"a1g": 1, "eg": 1, "t1g": 1, "t2g": 1}),
        ("Oh", ("eg", "t2g"), {"t1g": 1, "t2g": 1}),
        ("Td", ("e", "e"), {"a1": 1, "a2": 1, "e": 1}),
        ("C4v", ("e", "e"), {"a1": 1, "a2": 1, "b1": 1, "b2": 1}),
        ("D∞h", ("πg", "πu"), {"σu+": 1, "σu-": 1, "δu": 1}),
        ("D∞h", ("δu", "φu"), {"πg": 1, "ηg": 1}),
    ],
)
def test_direct_products(name, product, expected):
    # Wilson, Decius, Cross, Molecular Vibrations, 1955, appendix X (memory); |m| adds and subtracts (law).
    group = point_group(name)
    first, second = (group.by_operation[group.irreps.index(irrep)] for irrep in product)
    counts = dict(zip(group.irreps, group.multiplicities(first * second), strict=True))
    assert {irrep: count for irrep, count in counts.items() if count} == expected


@pytest.mark.parametrize("name", ["C1", "Ci", "Cs", "C2", "C2v", "C2h", "D2", "D2h"])
def test_characters_agree_with_pyscf(name):
    param = pytest.importorskip("pyscf.symm.param")
    group = point_group(name)
    operations = [np.array(param.D2H_OPS[label]) for label in param.OPERATOR_TABLE[name]]
    columns = [np.abs(group.operations - operation).max(axis=(1, 2)).argmin() for operation in operations]
    assert sorted(columns) == list(range(len(group)))
    theirs = {row[0].replace('"', "''"): row[1:] for row in param.CHARACTER_TABLE[name]}
    ours = {irrep: values[columns] for irrep, values in zip(group.term_irreps, group.by_operation, strict=True)}
    assert set(theirs) == set(ours)
    for irrep, values in theirs.items():
        np.testing.assert_array_equal(ours[irrep], values)


def test_an_unknown_group_is_refused_with_the_list_of_groups():
    with pytest.raises(InputError, match="no character table for the point group 'Ih'") as caught:
        point_group("Ih")
    assert "D∞h" in str(caught.value.mend)


def test_linear_groups_go_by_their_plain_names_too():
    assert point_group("Dinfh").name == "D∞h"


def test_irreps_of_all_groups_have_ascii_names_that_differ(group):
    plain = [ascii_symbol(irrep) for irrep in group.irreps]
    assert len(set(plain)) == len(plain)
    assert all(name.isascii() for name in [*plain, ascii_symbol(group.name)])


@pytest.mark.parametrize(
    ("name", "irrep", "in_terms"), [("C4v", "b2", "B2"), ("Oh", "t1g", "T1g"), ("D∞h", "σg+", "Σg+")]
)
def test_terms_have_a_capital(name, irrep, in_terms):
    group = point_group(name)
    assert group.term_irreps[group.irreps.index(irrep)] == in_terms
