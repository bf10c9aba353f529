"""Point groups as the labels of terms need them."""

from __future__ import annotations

import numpy as np

from ehmo.analysis.symmetry.groups import point_group
from ehmo.records.arrays import IntArray
from ehmo.records.symmetry import PointGroup


def label_group(group: PointGroup | None) -> PointGroup:
    """Group that labels terms: C1 where there is none."""
    return point_group("C1") if group is None else group


def operation_powers(group: PointGroup, highest: int) -> IntArray:
    """Places of the powers of each operation among the operations.

    Parameters
    ----------
    group : PointGroup
    highest : int
        Highest power.

    Returns
    -------
    places : (highest, n_ops) ndarray of int
        Those of g, g^2, ...
    """
    flat = group.operations.reshape(-1, 9)
    powered = group.operations
    places = []
    for _ in range(highest):
        # Two operations of a group have a trace product of 3 only if they are the same.
        places.append((powered.reshape(-1, 9) @ flat.T).argmax(axis=1))
        powered = powered @ group.operations
    return np.array(places)
