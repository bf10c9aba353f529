"""Read-only arrays with a checked shape, for the fields of frozen records."""

from __future__ import annotations

from typing import TypeVar

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.intp]
_Scalar = TypeVar("_Scalar", bound=np.generic)


def frozen_floats(values: ArrayLike, shape: tuple[int | None, ...], name: str) -> FloatArray:
    """Read-only float array of a given shape.

    Parameters
    ----------
    values : array_like
        Numbers; a float array that is already read-only is not copied.
    shape : tuple of int or None
        Expected shape; None stands for any length.
    name : str
        Field name for the message.

    Returns
    -------
    array : ndarray
        Read-only.

    Raises
    ------
    ValueError
        If the shape differs.
    """
    return _frozen(np.asarray(values, dtype=np.float64), values, shape, name)


def frozen_ints(values: ArrayLike, shape: tuple[int | None, ...], name: str) -> IntArray:
    """Read-only index array of a given shape; see `frozen_floats`."""
    return _frozen(np.asarray(values, dtype=np.intp), values, shape, name)


def _frozen(array: NDArray[_Scalar], given: ArrayLike, shape: tuple[int | None, ...], name: str) -> NDArray[_Scalar]:
    if array.shape != shape:
        _check_shape(array.shape, shape, name)
    if array.flags.writeable:
        if array is given:
            array = array.copy()
        array.flags.writeable = False
    return array


def _check_shape(have: tuple[int, ...], want: tuple[int | None, ...], name: str) -> None:
    if len(have) != len(want) or any(w is not None and w != h for h, w in zip(have, want, strict=True)):
        raise ValueError(f"{name} has shape {have}, expected {want}")
