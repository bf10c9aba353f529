"""A molecule as balls and sticks."""

from __future__ import annotations

from functools import cache

import numpy as np

import basis_params
from ehmo.records.arrays import FloatArray, IntArray
from ehmo.records.report import BondReport
from ehmo.report.look import element_colour
from ehmo.report.page.pictures import Body
from ehmo.report.page.surfaces import Surface

STICK_A = 0.07
"""Radius of a stick [angstrom]."""

_BALL_SHARE = 0.22  # radius of a ball in covalent radii
_REACH = 1.25
_PER_BODY = 200  # corners of a packed surface are 16-bit numbers


def drawn_bonds(report: BondReport) -> list[tuple[int, int]]:
    """Pairs of atoms joined by a stick: metal-donor bonds, and contacts within ligands."""
    fragment = report.fragment
    radii = np.array([basis_params.atom(symbol).covalent_radius_A for symbol in fragment.symbols])
    metals = set(report.coordination.metals)
    pairs = [(bond.metal, bond.donor) for bond in report.coordination.bonds]
    for ligand in report.coordination.ligands:
        own = np.array([atom for atom in ligand.atoms if atom not in metals], dtype=np.intp)
        apart = np.linalg.norm(fragment.positions_A[own][:, None] - fragment.positions_A[own], axis=2)
        near = apart < _REACH * (radii[own][:, None] + radii[own])
        light = np.array([fragment.symbols[atom] == "H" for atom in own])
        near &= ~(light[:, None] & light)
        pairs += [(int(own[a]), int(own[b])) for a, b in zip(*np.nonzero(np.triu(near, 1)), strict=True)]
    return pairs


def molecule_bodies(report: BondReport) -> list[Body]:
    """One body for each colour, or a few where it has many atoms: all balls and half sticks of an element."""
    fragment = report.fragment
    parts: dict[str, list[Surface]] = {}
    for symbol, position in zip(fragment.symbols, fragment.positions_A, strict=True):
        radius = _BALL_SHARE * basis_params.atom(symbol).covalent_radius_A
        vertices, faces = _unit_ball()
        parts.setdefault(element_colour(symbol), []).append(Surface(position + radius * vertices, faces))
    for one, other in drawn_bonds(report):
        middle = (fragment.positions_A[one] + fragment.positions_A[other]) / 2
        for atom in (one, other):
            stick = _stick(fragment.positions_A[atom], middle)
            parts.setdefault(element_colour(fragment.symbols[atom]), []).append(stick)
    return [
        Body(joined(surfaces[start : start + _PER_BODY]), colour)
        for colour, surfaces in parts.items()
        for start in range(0, len(surfaces), _PER_BODY)
    ]


def joined(surfaces: list[Surface]) -> Surface:
    """Several surfaces as one."""
    starts = np.cumsum([0, *(len(surface.vertices_A) for surface in surfaces)])
    faces = [surface.faces + start for surface, start in zip(surfaces, starts, strict=False)]
    return Surface(np.concatenate([surface.vertices_A for surface in surfaces]), np.concatenate(faces))


@cache
def _unit_ball() -> tuple[FloatArray, IntArray]:
    """Ball of twelve meridians and seven parallels, with its poles."""
    meridians, parallels = 12, 7
    polar = np.pi * np.arange(1, parallels + 1) / (parallels + 1)
    azimuth = 2 * np.pi * np.arange(meridians) / meridians
    ring = np.stack([np.cos(azimuth), np.sin(azimuth)], axis=1)
    rows = [np.column_stack([np.sin(angle) * ring, np.full(meridians, np.cos(angle))]) for angle in polar]
    vertices = np.concatenate([*rows, [[0, 0, 1], [0, 0, -1]]])
    top, bottom = len(vertices) - 2, len(vertices) - 1
    faces = []
    for k in range(meridians):
        after = (k + 1) % meridians
        faces.append((top, k, after))
        for row in range(parallels - 1):
            here, below = row * meridians, (row + 1) * meridians
            faces += [(here + k, below + k, below + after), (here + k, below + after, here + after)]
        last = (parallels - 1) * meridians
        faces.append((bottom, last + after, last + k))
    return vertices, np.array(faces, dtype=np.intp)


def _stick(start_A: FloatArray, stop_A: FloatArray, sides: int = 8) -> Surface:
    """Open tube from one point to another."""
    along = (stop_A - start_A) / np.linalg.norm(stop_A - start_A)
    side = np.cross(along, np.eye(3)[np.argmin(np.abs(along))])
    side /= np.linalg.norm(side)
    angles = 2 * np.pi * np.arange(sides) / sides
    ring = STICK_A * (np.cos(angles)[:, None] * side + np.sin(angles)[:, None] * np.cross(along, side))
    vertices = np.concatenate([start_A + ring, stop_A + ring])
    faces = []
    for k in range(sides):
        after = (k + 1) % sides
        faces += [(k, after, sides + after), (k, sides + after, sides + k)]
    return Surface(vertices, np.array(faces, dtype=np.intp))
