"""Names of operations, classes, groups and representations."""

from __future__ import annotations

from fractions import Fraction

import numpy as np

from ehmo.records.arrays import FloatArray

LINEAR_LETTERS = "σπδφγηικλ"
"""Letter of a representation of a linear group by |m| about the axis (Greek, as for atoms: s p d f g h i k l)."""

_ASCII = {
    "σ": "sigma",
    "π": "pi",
    "δ": "delta",
    "φ": "phi",
    "γ": "gamma",
    "η": "eta",
    "ι": "iota",
    "κ": "kappa",
    "λ": "lambda",
    "∞": "inf",
}
_SUPERSCRIPTS = str.maketrans("123456789", "¹²³⁴⁵⁶⁷⁸⁹")
_NAMED_BY_AXES = ("D2", "C2v", "D2h")
_CLOSE = 1e-6


def ascii_symbol(symbol: str) -> str:
    """Group or representation without letters beyond ASCII.

    Parameters
    ----------
    symbol : str
        Such as ``σg+`` or ``D∞h``.

    Returns
    -------
    plain : str

    Examples
    --------
    >>> [ascii_symbol(symbol) for symbol in ("σg+", "πu", "σ-", "D∞h", "b2g")]
    ['sigma_g+', 'pi_u', 'sigma-', 'Dinfh', 'b2g']
    """
    name = _ASCII.get(symbol[:1])
    if name is None:
        return symbol.replace("∞", _ASCII["∞"])
    rest = symbol[1:]
    return f"{name}_{rest}" if rest[:1] in ("g", "u") else name + rest


def with_parity(stem: str, suffix: str) -> str:
    """Mulliken symbol with g, u, ' or '' in its place: ``b1`` and ``g`` give ``b1g``, ``σ+`` and ``u`` give ``σu+``."""
    return f"{stem[:-1]}{suffix}{stem[-1]}" if stem[-1] in "+-" else stem + suffix


def class_label(members: FloatArray, group: str) -> str:
    """Label of a class, such as ``2C4``.

    Parameters
    ----------
    members : (n, 3, 3) ndarray
        Operations of the class.
    group : str
        Schoenflies symbol: in D2, C2v and D2h axes and planes are named by coordinates.

    Returns
    -------
    label : str
        Number of members, if more than one, and the symbol of the operation. C2' and σv go with the x axis.
    """
    count = str(len(members)) if len(members) > 1 else ""
    return count + _symbol(members, group)


def _symbol(members: FloatArray, group: str) -> str:
    first = members[0]
    improper = np.linalg.det(first) < 0
    turn = min(turn_fraction(operation) for operation in members)
    if (not improper and turn == 0) or (improper and turn == Fraction(1, 2)):
        return "i" if improper else "E"
    if turn in (0, Fraction(1, 2)):
        return _mirror(members, group) if improper else _two_fold(members, group)
    power, order = turn.numerator, turn.denominator
    if improper and order % 2 and power % 2 == 0:
        power += order  # an even power of S3 is a rotation: the turn by 240 degrees with reflection is S3^5
    letter = "S" if improper else "C"
    return f"{letter}{order}" + (str(power).translate(_SUPERSCRIPTS) if power > 1 else "")


def turn_fraction(operation: FloatArray) -> Fraction:
    """Angle of an operation in full turns: of the rotation, or of the rotation that goes with a reflection.

    Parameters
    ----------
    operation : (3, 3) ndarray
        Orthogonal matrix.

    Returns
    -------
    turn : Fraction
        0 up to, not including, 1 for an axis along z; 0 to 1/2 for any other.
    """
    determinant = round(float(np.linalg.det(operation)))
    if abs(operation[2, 2] - determinant) < _CLOSE:
        angle = np.arctan2(operation[1, 0], operation[0, 0])
    else:
        angle = np.arccos(np.clip((np.trace(operation) - determinant) / 2, -1, 1))
    return Fraction(float(angle / (2 * np.pi)) % 1.0).limit_denominator(60) % 1


def _two_fold(members: FloatArray, group: str) -> str:
    along = _coordinate_axes(members, 1.0)
    if group in _NAMED_BY_AXES:
        return f"C2({'xyz'[along[0]]})"
    return "C2" if 2 in along else "C2'" if 0 in along or group == "Oh" else "C2''"


def _mirror(members: FloatArray, group: str) -> str:
    normals = _coordinate_axes(members, -1.0)
    if group in _NAMED_BY_AXES:
        return f"σ({'xyz'.replace('xyz'[normals[0]], '')})"
    if 2 in normals:
        return "σh"
    return "σv" if 0 in _coordinate_axes(members, 1.0) and group not in ("Td", "Oh") else "σd"


def _coordinate_axes(members: FloatArray, sign: float) -> list[int]:
    """Axes x, y, z (0, 1, 2) that some member leaves alone (sign 1) or turns round (sign -1)."""
    diagonals = members[:, range(3), range(3)]
    return [axis for axis in range(3) if (np.abs(diagonals[:, axis] - sign) < _CLOSE).any()]
