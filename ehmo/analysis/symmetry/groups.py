"""Point groups with operations and real character tables, made from generators and formulas.

Every axial group is made of three generators: a rotor (C_n or S_2n about z), a flip (a mirror or two-fold axis
that turns the rotor round) and a parity (inversion or horizontal mirror) that commutes with both. Their signs
fix a one-dimensional representation, an angular momentum k a two-dimensional one.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from itertools import permutations, product

import numpy as np

from ehmo.analysis.symmetry.labels import LINEAR_LETTERS, class_label, with_parity
from ehmo.errors import InputError
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.symmetry import PointGroup

HIGHEST_ORDER = 6
"""Highest n of C_n, C_nv, C_nh, D_n, D_nh and D_nd."""

LINEAR_FOLD = 17
"""The linear groups are held by C17v and D17d: odd, so that D17d has the inversion, and |m| up to 8 differ."""

_FOLDS = range(2, HIGHEST_ORDER + 1)
GROUP_NAMES: tuple[str, ...] = (
    *("C1", "Cs", "Ci"),
    *(
        f"{letter}{n}{kind}"
        for letter in "CD"
        for kind in ("", "v", "h", "d")
        for n in _FOLDS
        if letter + kind not in ("Cd", "Dv")
    ),
    *("S4", "S6", "S8", "Td", "Oh", "C∞v", "D∞h"),
)
"""Schoenflies symbols of all groups."""

_X_MIRROR = np.diag([1.0, -1.0, 1.0])  # contains x and z
_X_TURN = np.diag([1.0, -1.0, -1.0])  # two-fold about x
_INVERSION = -np.eye(3)
_Z_MIRROR = np.diag([1.0, 1.0, -1.0])
_CLOSE = 1e-10
_GERADE = ("g", "u")
_CUBIC_CLASSES = [
    *[(1, 3, True), (1, 0, False), (1, -1, False), (1, 1, False), (1, -1, True)],
    *[(-1, -3, True), (-1, -1, False), (-1, 0, False), (-1, 1, True), (-1, 1, False)],
]
"""Determinant, trace and whether diagonal: E C3 C2' C4 C2 i S4 S6 σh σd, the customary order."""
_PRIMES = ("'", "''")


@cache
def point_group(name: str) -> PointGroup:
    """A point group with its operations and characters.

    Parameters
    ----------
    name : str
        One of `GROUP_NAMES`; ``Cinfv`` and ``Dinfh`` are understood.

    Returns
    -------
    group : PointGroup

    Raises
    ------
    InputError
        If there is no table for the name.

    References
    ----------
    .. [1] mulliken-notation-1955: R. S. Mulliken, J. Chem. Phys. 23, 1997 (1955) (symbols and axes; from memory).
    """
    name = name.replace("inf", "∞")
    if name not in GROUP_NAMES:
        raise InputError(
            f"no character table for the point group {name!r}", mend=f"use one of {', '.join(GROUP_NAMES)}"
        )
    operations, characters = _cubic(name) if name in ("Td", "Oh") else _axial(name)
    class_of = _classes(operations)
    members = [operations[class_of == k] for k in range(class_of.max() + 1)]
    first = [int(np.flatnonzero(class_of == k)[0]) for k in range(len(members))]
    return PointGroup(
        name=name,
        operations=operations,
        class_labels=tuple(class_label(operations, name) for operations in members),
        class_of=class_of,
        irreps=tuple(characters),
        dimensions=np.array([round(values[0]) for values in characters.values()]),
        characters=np.array([values[first] for values in characters.values()]),
        setting=_setting(name),
    )


@dataclass(frozen=True, slots=True)
class _Generators:
    """Rotor by its fold and whether it reflects z; flip and parity where the group has them."""

    fold: int
    reflects: bool = False
    flip: FloatArray | None = None
    parity: FloatArray | None = None
    suffixes: tuple[str, ...] = ("",)


def _generators(name: str) -> _Generators:
    if name in ("C1", "Cs", "Ci"):
        return {
            "C1": _Generators(1),
            "Cs": _Generators(1, parity=_Z_MIRROR, suffixes=_PRIMES),
            "Ci": _Generators(1, parity=_INVERSION, suffixes=_GERADE),
        }[name]
    if name == "D∞h":
        return _Generators(LINEAR_FOLD, flip=_X_TURN, parity=_INVERSION, suffixes=_GERADE)
    letter, kind = name[0], name[2:]
    fold = LINEAR_FOLD if name[1] == "∞" else int(name[1])
    if letter == "S":
        if fold % 4:
            return _Generators(fold // 2, parity=_INVERSION, suffixes=_GERADE)
        return _Generators(fold, reflects=True)
    flip = _X_MIRROR if kind == "v" else _X_TURN if letter == "D" else None
    if kind == "d" and fold % 2 == 0:
        return _Generators(2 * fold, reflects=True, flip=flip)
    if kind == "d" or (kind == "h" and fold % 2 == 0):
        return _Generators(fold, flip=flip, parity=_INVERSION, suffixes=_GERADE)
    if kind == "h":
        return _Generators(fold, flip=flip, parity=_Z_MIRROR, suffixes=_PRIMES)
    return _Generators(fold, flip=flip)


def _axial(name: str) -> tuple[FloatArray, dict[str, FloatArray]]:
    """Operations, and the character of each under every representation."""
    made = _generators(name)
    rotors = [_rotor(made.fold, power, made.reflects) for power in range(made.fold)]
    flips = [np.eye(3)] if made.flip is None else [np.eye(3), made.flip]
    parities = [np.eye(3)] if made.parity is None else [np.eye(3), made.parity]
    words = list(product(range(len(parities)), range(len(flips)), range(made.fold)))
    operations = np.array([rotors[j] @ flips[s] @ parities[p] for p, s, j in words])
    parity, flipped, power = np.array(words).T
    characters = {}
    for number, suffix in enumerate(made.suffixes):
        sign = (-1.0) ** (number * parity)
        for stem, rotor_sign, flip_sign in _one_dimensional(name, made):
            values = sign * np.where(power % 2, rotor_sign, 1) * np.where(flipped, flip_sign, 1)
            characters[with_parity(_linear_stem(name, stem, number), suffix)] = values
        pairs = (made.fold - 1) // 2
        for k in range(1, pairs + 1):
            stem = LINEAR_LETTERS[k] if "∞" in name else "e" if pairs == 1 else f"e{k}"
            values = sign * np.where(flipped, 0.0, 2 * np.cos(2 * np.pi * k * power / made.fold))
            characters[with_parity(stem, suffix)] = values
    return operations, characters


def _rotor(fold: int, power: int, reflects: bool) -> FloatArray:
    """C_n or S_n to a power."""
    angle = 2 * np.pi * power / fold
    cosine, sine = np.cos(angle), np.sin(angle)
    matrix = np.array([[cosine, -sine, 0], [sine, cosine, 0], [0, 0, -1.0 if reflects and power % 2 else 1.0]])
    exact = np.round(2 * matrix) / 2
    return np.where(np.abs(matrix - exact) < 1e-12, exact, matrix)


def _one_dimensional(name: str, made: _Generators) -> list[tuple[str, int, int]]:
    """Symbol, sign under the rotor and sign under the flip of each one-dimensional representation."""
    if made.fold == 1:
        return [("a", 1, 1)]
    if name in ("D2", "D2h"):
        # Numbered by the coordinate that keeps its sign: b1 z, b2 y, b3 x.
        return [("a", 1, 1), ("b1", 1, -1), ("b2", -1, -1), ("b3", -1, 1)]
    signs = (1, -1) if made.fold % 2 == 0 else (1,)
    if made.flip is None:
        return [("a" if rotor == 1 else "b", rotor, 1) for rotor in signs]
    return [("ab"[rotor < 0] + "12"[flip < 0], rotor, flip) for rotor in signs for flip in (1, -1)]


def _linear_stem(name: str, stem: str, number: int) -> str:
    """σ+ and σ- for a1 and a2: the sign is that of a vertical mirror, which for u is minus that of the flip."""
    if "∞" not in name:
        return stem
    return "σ+" if (stem == "a1") == (number == 0) else "σ-"


def _cubic(name: str) -> tuple[FloatArray, dict[str, FloatArray]]:
    """Td or Oh as signed permutations of the axes."""
    matrices = np.array(
        [
            np.diag(signs) @ np.eye(3)[list(order)]
            for order in permutations(range(3))
            for signs in product((1.0, -1.0), repeat=3)
        ]
    )
    determinants = np.linalg.det(matrices).round()
    # xyz keeps or changes its sign: Td is what keeps it.
    xyz = np.prod(matrices.sum(axis=2), axis=1)
    if name == "Td":
        matrices, determinants = matrices[xyz > 0], determinants[xyz > 0]
    kinds = zip(
        determinants, matrices.trace(axis1=1, axis2=2), np.abs(matrices).trace(axis1=1, axis2=2) > 2, strict=True
    )
    order = np.argsort([_CUBIC_CLASSES.index(kind) for kind in kinds], kind="stable")
    matrices, determinants = matrices[order], determinants[order]
    vector = matrices.trace(axis1=1, axis2=2)
    quadratic = (vector**2 + (matrices @ matrices).trace(axis1=1, axis2=2)) / 2
    if name == "Td":
        ones = np.ones(len(matrices))
        return matrices, {
            "a1": ones,
            "a2": determinants,
            "e": quadratic - 1 - vector,
            "t1": vector * determinants,
            "t2": vector,
        }
    proper_sign = determinants * np.prod(matrices.sum(axis=2), axis=1)
    axial = vector * determinants
    gerade = {
        "a1": np.ones(len(matrices)),
        "a2": proper_sign,
        "e": quadratic - 1 - axial * proper_sign,
        "t1": axial,
        "t2": axial * proper_sign,
    }
    both = {f"{stem}g": values for stem, values in gerade.items()}
    return matrices, both | {f"{stem}u": values * determinants for stem, values in gerade.items()}


def _classes(operations: FloatArray) -> IntArray:
    """Class of each operation, numbered by first appearance."""
    products = multiplication_table(operations)
    inverse = (products == 0).argmax(axis=1)
    conjugates = products[products, inverse[:, None]]
    lowest: IntArray = np.unique(conjugates.min(axis=0), return_inverse=True)[1]
    return lowest


def multiplication_table(operations: FloatArray) -> IntArray:
    """Place of each product in a group.

    Parameters
    ----------
    operations : (n_ops, 3, 3) ndarray
        A group.

    Returns
    -------
    table : (n_ops, n_ops) ndarray of int
        ``operations[table[a, b]]`` is ``operations[a] @ operations[b]``.

    Raises
    ------
    ValueError
        If the operations are no group.
    """
    # A point in general position tells all operations apart; of unit vectors the nearest has the largest product.
    point = np.array([0.31, 0.57, 0.76])
    images = operations @ (point / np.linalg.norm(point))
    cosines = (operations @ images.T).swapaxes(1, 2) @ images.T
    if cosines.max(axis=2).min() < 1 - _CLOSE:
        raise ValueError("the operations do not close under multiplication")
    table: IntArray = cosines.argmax(axis=2)
    return table


def _setting(name: str) -> str:
    """Where the axes and planes lie."""
    if name in ("C1", "Ci"):
        return "axes free"
    if name == "Cs":
        return "plane xy"
    if name == "Td":
        return "S4 axes along x, y, z; C3 along x+y+z"
    if name == "Oh":
        return "C4 axes along x, y, z"
    if name in ("D2", "D2h"):
        return "C2 axes along x, y, z; b1 like z, b2 like y, b3 like x"
    if name == "C2v":
        return "C2 along z; b1 like x, b2 like y"
    if "∞" in name:
        return "axis along z; + and - by a plane through the axis"
    made = _generators(name)
    axis = name if name[0] == "S" else f"S{made.fold}" if made.reflects else f"C{made.fold}"
    x = "x free" if made.flip is None else "xz is a plane σv" if made.flip is _X_MIRROR else "C2' along x"
    return f"{axis} along z; {x}"
