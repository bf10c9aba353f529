"""A regular grid of points in space."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ehmo.records.arrays import FloatArray, frozen_floats


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """Points of a box whose edges lie along x, y and z.

    Attributes
    ----------
    origin_A : (3,) ndarray
        First point [angstrom].
    spacing_A : (3,) ndarray
        Distance of neighbours along x, y and z [angstrom].
    shape : tuple of (int, int, int)
        Points along x, y and z.
    """

    origin_A: FloatArray
    spacing_A: FloatArray
    shape: tuple[int, int, int]

    def __post_init__(self) -> None:
        object.__setattr__(self, "origin_A", frozen_floats(self.origin_A, (3,), "origin_A"))
        object.__setattr__(self, "spacing_A", frozen_floats(self.spacing_A, (3,), "spacing_A"))
        if min(self.shape) < 2 or not (self.spacing_A > 0).all():
            raise ValueError(f"a grid of {self.shape} points with spacing {self.spacing_A} holds no volume")

    def axes_A(self) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Coordinates of the points along x, y and z [angstrom]."""
        x, y, z = (self.origin_A[k] + self.spacing_A[k] * np.arange(self.shape[k]) for k in range(3))
        return x, y, z

    @property
    def cell_volume_A3(self) -> float:
        """Volume that each point stands for [angstrom^3]."""
        return float(self.spacing_A.prod())
