"""Isosurfaces against closed forms, their packed form against a plain loop, and pictures as pixels."""

from __future__ import annotations

import base64
import io

import numpy as np
import pytest

from ehmo.orbitals.grid import grid_around
from ehmo.report.page.pictures import Body, Scene, view_from
from ehmo.report.page.surfaces import STEP_A, Surface, isosurface, packed
from tests.report.page.packing import unpacked

pytest.importorskip("skimage", reason="scikit-image is not installed")

DECAY_PER_A = 1.3
LEVEL = 0.2
RADIUS_A = -np.log(LEVEL) / DECAY_PER_A
"""Where exp(-1.3 r) is 0.2."""


@pytest.fixture(scope="module")
def grid():
    return grid_around(np.zeros((1, 3)), 2.5, 0.1)


@pytest.fixture(scope="module")
def decaying(grid):
    x, y, z = np.meshgrid(*grid.axes_A(), indexing="ij")
    return np.exp(-DECAY_PER_A * np.sqrt(x**2 + y**2 + z**2))


def volume_A3(surface: Surface) -> float:
    """Enclosed volume by the divergence theorem: positive where the triangles face outwards."""
    a, b, c = (surface.vertices_A[surface.faces[:, k]] for k in range(3))
    return float((a * np.cross(b, c)).sum() / 6)


def test_surface_of_a_decaying_function_is_a_sphere(grid, decaying):
    surface = isosurface(decaying, grid, LEVEL)
    np.testing.assert_allclose(np.linalg.norm(surface.vertices_A, axis=1), RADIUS_A, atol=5e-3)
    assert volume_A3(surface) == pytest.approx(4 / 3 * np.pi * RADIUS_A**3, rel=0.01)
    outwards = surface.vertices_A / np.linalg.norm(surface.vertices_A, axis=1, keepdims=True)
    assert (surface.normals() * outwards).sum(axis=1).min() > 0.98


def test_negative_level_takes_the_negative_region(grid, decaying):
    np.testing.assert_allclose(
        isosurface(-decaying, grid, -LEVEL).vertices_A, isosurface(decaying, grid, LEVEL).vertices_A
    )
    assert isosurface(decaying, grid, -LEVEL) is None
    assert isosurface(decaying, grid, 1.5) is None


def test_packed_surfaces_come_back_within_half_a_step(grid, decaying):
    surface = isosurface(decaying, grid, LEVEL)
    turn = view_from(np.array([1.0, 2.0, 0.5]), np.array([0.0, 0.0, 1.0]))
    origin = np.array([0.3, -0.2, 0.1])
    first, none, last = unpacked(packed([surface, None, surface], turn, origin), STEP_A)
    assert none is None
    for vertices, faces in (first, last):
        np.testing.assert_allclose(vertices, (surface.vertices_A - origin) @ turn.T, atol=STEP_A / 2 + 1e-9)
        np.testing.assert_array_equal(faces, surface.faces)


def pixels(scene: Scene) -> np.ndarray:
    """RGBA of a picture, read by the plotting library's own reader."""
    from matplotlib.image import imread

    address = scene.address()
    assert address.startswith("data:image/png;base64,")
    return imread(io.BytesIO(base64.b64decode(address.partition(",")[2])), format="png")


def test_nearer_body_hides_the_farther_one(grid, decaying):
    ball = isosurface(decaying, grid, LEVEL)
    near = Body(Surface(0.5 * ball.vertices_A + [0, 0, 3.0], ball.faces), "#ff0000")
    far = Body(ball, "#0000ff")
    view = view_from(np.array([0.0, 0.0, 1.0]), np.array([0.0, 1.0, 0.0]))
    for order in ((near, far), (far, near)):
        image = pixels(Scene.empty(view, np.zeros(3), 2.0, 60).with_bodies(order))
        red, _, blue, alpha = image[30, 30]
        assert alpha == 1 and red > 0.5 > blue
        edge = image[30, 30 + int(0.8 * RADIUS_A / 2.0 * 30)]
        assert edge[2] > edge[0] and edge[3] == 1
        assert image[0, 0, 3] == 0


def test_view_keeps_up_upwards():
    view = view_from(np.array([1.0, 1.0, 1.0]), np.array([0.0, 0.0, 1.0]))
    np.testing.assert_allclose(view @ view.T, np.eye(3), atol=1e-12)
    assert np.linalg.det(view) == pytest.approx(1.0)
    right, up, towards = view @ np.array([0.0, 0.0, 1.0])
    assert right == pytest.approx(0.0, abs=1e-12) and up > 0 and towards > 0
    assert view_from(np.array([0.0, 0.0, 2.0]), np.array([0.0, 0.0, 1.0])).shape == (3, 3)
