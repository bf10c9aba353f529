"""Surfaces and still pictures of a page, and the data that its script draws them from."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np

from basis_params import ParameterTable
from ehmo.records.arrays import FloatArray
from ehmo.records.coordination import MetalDonorBond
from ehmo.records.grid import Grid
from ehmo.records.report import BondReport
from ehmo.report.look import DARK, LIGHT
from ehmo.report.page.molecule import molecule_bodies
from ehmo.report.page.pictures import Body, Scene, view_from
from ehmo.report.page.shown import (
    LEVELS,
    USUAL_LEVEL,
    ShownChannel,
    hybrid_values,
    orbital_grid,
    orbital_key,
    orbital_values,
)
from ehmo.report.page.surfaces import STEP_A, Surface, isosurface, packed

PICTURE_PX: Final = 160
"""Width and height of a still picture."""

_EYE = np.array([0.86, 0.42, 0.30])
_ROOM_A = 1.5


@dataclass(frozen=True, slots=True, eq=False)
class View:
    """Everything drawn on a page.

    Attributes
    ----------
    pictures : dict of str to str
        Still picture of each channel and orbital, as an address.
    data : dict
        For the script: `packed` surfaces of molecule, hybrids and orbitals, labels of the atoms, where to look from.
    """

    pictures: dict[str, str]
    data: dict[str, Any]


def page_view(
    report: BondReport, table: ParameterTable, channels: Sequence[ShownChannel], orbitals: Sequence[int]
) -> View:
    """Surfaces and pictures of channels and orbitals.

    Parameters
    ----------
    report : BondReport
    table : ParameterTable
        The parameter set of the report.
    channels : sequence of ShownChannel
    orbitals : sequence of int

    Returns
    -------
    view : View
    """
    positions = report.fragment.positions_A
    axes = report.coordination.frames[0].axes
    centre = (positions.min(axis=0) + positions.max(axis=0)) / 2
    reach = float(np.linalg.norm(positions - centre, axis=1).max()) + _ROOM_A
    bodies = molecule_bodies(report)
    pictures: dict[str, str] = {}
    surfaces: dict[str, str] = {}

    for bond in dict.fromkeys(shown.bond for shown in channels):
        own = [shown for shown in channels if shown.bond == bond]
        grid, values = hybrid_values(report, table, own)
        ends = positions[list(_ends(report, bond))]
        scene = _scene(report, bond, ends.mean(axis=0), _half_width(report, bond), bodies)
        for k, shown in enumerate(own):
            metal, donor = (_surfaces(values[2 * k + n], grid) for n in (0, 1))
            surfaces[shown.key] = packed([*metal, *donor], axes, centre)
            pictures[shown.key] = scene.with_bodies(_coloured(metal) + _coloured(donor)).address()
    if orbitals:
        grid = orbital_grid(report)
        scene = _scene(report, None, centre, reach - 0.5 * _ROOM_A, bodies)
        for orbital, values in zip(orbitals, orbital_values(report, table, orbitals, grid), strict=True):
            both = _surfaces(values, grid)
            surfaces[orbital_key(orbital)] = packed(both, axes, centre)
            pictures[orbital_key(orbital)] = scene.with_bodies(_coloured(both)).address()
    data = {
        "levels": list(LEVELS),
        "level": USUAL_LEVEL,
        "reach": round(reach, 3),
        "eye": _EYE.round(4).tolist(),
        "molecule": packed([body.surface for body in bodies], axes, centre),
        "colours": [body.colour for body in bodies],
        "phases": [LIGHT.positive, LIGHT.negative],
        "darkPhases": [DARK.positive, DARK.negative],
        "atoms": _atom_labels(report, axes, centre),
        "surfaces": surfaces,
        "step": STEP_A,
        "places": {shown.key: _place(report, shown.bond, axes, centre) for shown in channels},
    }
    return View(pictures, data)


def eye_for(bond: MetalDonorBond, positions_A: FloatArray, axes: FloatArray) -> FloatArray:
    """Direction to look at a bond from, aside of its axis, in the axes of the picture.

    Parameters
    ----------
    bond : MetalDonorBond
    positions_A : (n_atoms, 3) ndarray
        [angstrom]
    axes : (3, 3) ndarray
        Rows are the axes of the picture.

    Returns
    -------
    eye : (3,) ndarray
        Unit vector.
    """
    along = axes @ (positions_A[bond.donor] - positions_A[bond.metal])
    along /= np.linalg.norm(along)
    sides = (_EYE, np.array([-0.42, 0.86, 0.30]))
    side = min(sides, key=lambda eye: abs(float(eye @ along)))
    aside = side - 0.75 * (side @ along) * along
    eye: FloatArray = aside / np.linalg.norm(aside)
    return eye


def _ends(report: BondReport, bond: int) -> tuple[int, int]:
    return report.coordination.bonds[bond].metal, report.coordination.bonds[bond].donor


def _half_width(report: BondReport, bond: int) -> float:
    """Room that the hybrids of a bond need on each side of its middle [angstrom]."""
    return report.coordination.bonds[bond].length_A / 2 + 1.8


def _place(report: BondReport, bond: int, axes: FloatArray, centre_A: FloatArray) -> dict[str, Any]:
    """Where to look at a bond from, in the axes of the picture."""
    positions = report.fragment.positions_A
    middle = axes @ (positions[list(_ends(report, bond))].mean(axis=0) - centre_A)
    return {
        "bond": bond,
        "eye": eye_for(report.coordination.bonds[bond], positions, axes).round(4).tolist(),
        "centre": middle.round(3).tolist(),
        "half": round(_half_width(report, bond), 3),
    }


def _scene(
    report: BondReport, bond: int | None, centre_A: FloatArray, half_width_A: float, bodies: Sequence[Body]
) -> Scene:
    axes, positions = report.coordination.frames[0].axes, report.fragment.positions_A
    eye = _EYE if bond is None else eye_for(report.coordination.bonds[bond], positions, axes)
    view = view_from(axes.T @ eye, axes[2])
    return Scene.empty(view, centre_A, half_width_A, PICTURE_PX).with_bodies(bodies)


def _surfaces(values: FloatArray, grid: Grid) -> list[Surface | None]:
    """Positive and negative surface at each of the levels."""
    return [isosurface(values, grid, sign * level) for level in LEVELS for sign in (1.0, -1.0)]


def _coloured(surfaces: Sequence[Surface | None]) -> list[Body]:
    pair = surfaces[2 * USUAL_LEVEL : 2 * USUAL_LEVEL + 2]
    colours = (LIGHT.positive, LIGHT.negative)
    return [Body(surface, colour) for surface, colour in zip(pair, colours, strict=True) if surface is not None]


def _atom_labels(report: BondReport, axes: FloatArray, centre_A: FloatArray) -> list[dict[str, Any]]:
    """Label and place of metals and donors."""
    shown = sorted({*report.coordination.metals, *(bond.donor for bond in report.coordination.bonds)})
    labels, placed = report.fragment.labels, (report.fragment.positions_A - centre_A) @ axes.T
    return [{"label": labels[atom], "place": placed[atom].round(3).tolist()} for atom in shown]
