"""Given flux through walls and hulls: a tank that moves as a whole, and added mass."""

import math

import numpy as np
import pytest

from bemwave.flow.panels import PanelFlow
from bemwave.geometry.boundary import boundary_mesh
from bemwave.geometry.outline import SIDES, Circle, Rectangle
from bemwave.geometry.surface_mesh import SurfaceMesh, joined
from bemwave.geometry.topology import weld
from bemwave.geometry.water_surface import water_surface

SPEED = 1.7


@pytest.mark.parametrize("structured", [True, False])
@pytest.mark.parametrize("outline", [Rectangle(0.0, 2.0, 0.0, 1.0), Circle(0.3, -0.2, 1.0)])
def test_tank_whose_walls_all_move_one_way(outline, structured, request):
    """The water moves along: phi = U x on the walls, and no flux through the surface."""
    if not structured:
        request.getfixturevalue("needs_gmsh")
    walls = SIDES if isinstance(outline, Rectangle) else ("rim",)
    water = water_surface(outline, 0.2, structured=structured)
    flow = PanelFlow(boundary_mesh(water, walls=walls, depth=0.6), 0.6, closed=True)
    e = flow.elements
    along = SPEED * e.points[:, 0]
    flux = SPEED * e.hull_table[:, 9]
    # measured: .46 % in a corner of the box, .14 % in the round tank
    assert np.abs(flow.surface_flux(along[: e.free], flux)).max() < 0.01 * SPEED
    found = flow.hull_potential(along[: e.free], flux)
    below = slice(e.free, e.free + e.below)
    # measured: .005 %
    assert np.abs(found - along[below]).max() < 0.01 * np.ptp(along)


def hemisphere(steps):
    """A floating hemisphere of the sphere's volume: an octahedron's lower half blown up.

    Each face is cut in steps x steps equal triangles and its points are moved out to the sphere.
    """
    rows = [(i, j, steps - i - j) for i in range(steps + 1) for j in range(steps + 1 - i)]
    grid = {row[:2]: number for number, row in enumerate(rows)}
    up = [(i, j) for i in range(steps) for j in range(steps - i)]
    triangles = [(grid[i, j], grid[i + 1, j], grid[i, j + 1]) for i, j in up]
    triangles += [
        (grid[i + 1, j], grid[i + 1, j + 1], grid[i, j + 1]) for i, j in up if i + j < steps - 1
    ]
    faces = []
    for quarter in range(4):
        a, b = (0.5 * math.pi * (quarter + k) for k in (0, 1))
        tips = np.array([[0, 0, -1], [math.cos(b), math.sin(b), 0], [math.cos(a), math.sin(a), 0]])
        points = np.array(rows) @ tips
        points /= np.linalg.norm(points, axis=1)[:, None]
        points[np.abs(points[:, 2]) < 1e-12, 2] = 0.0
        faces.append(SurfaceMesh.of_one_part(points, triangles, "hull"))
    mesh = weld(joined(faces), 1e-9)[0]
    # normals must point into the hull, out of the water
    outward = np.sum(mesh.area_vectors * mesh.centroids) > 0.0
    mesh = mesh.flipped() if outward else mesh
    volume = -np.sum(mesh.centroids[:, 2] * mesh.area_vectors[:, 2])
    return mesh.with_points(mesh.points * (2 * math.pi / 3 / volume) ** (1 / 3))


def ring_of_water(hull):
    """One row of triangles round the waterline; with the half-space kernel its size is nothing."""
    rim = np.flatnonzero(hull.points[:, 2] == 0.0)
    turn = np.argsort(np.arctan2(hull.points[rim, 1], hull.points[rim, 0]))
    rim = rim[turn]
    inner = hull.points[rim]
    points = np.vstack([inner, 1.3 * inner])
    n, k = len(rim), np.arange(len(rim))
    after = (k + 1) % n
    corners = np.vstack(
        [np.stack([k, k + n, after + n], axis=1), np.stack([k, after + n, after], axis=1)]
    )
    return SurfaceMesh.of_one_part(points, corners, "water")


def added_mass(hull):
    """At infinite frequency in heave, over the displaced mass."""
    mesh = weld(joined([ring_of_water(hull), hull]), 1e-9)[0]
    flow = PanelFlow(mesh, math.inf, closed=False)
    e = flow.elements
    still = np.zeros(e.free)
    rising = e.hull_table[:, 11]
    phi = np.concatenate([still, flow.hull_potential(still, rising)])
    force = (e.shares(e.hull, e.hull_table) @ phi) @ rising
    return force / (2 * math.pi / 3)


def test_added_mass_of_a_hemisphere():
    """Infinite frequency, heave: .5 of the displaced mass (Lamb, Hydrodynamics, art. 92).

    With the potential zero on the surface the flow is half of that round a rising sphere.
    """
    hull = hemisphere(9)
    assert len(hull.triangles) == 324
    # measured: .50001
    assert added_mass(hull) == pytest.approx(0.5, rel=1e-3)


def test_added_mass_converges():
    errors = np.array([abs(added_mass(hemisphere(steps)) / 0.5 - 1.0) for steps in (4, 6, 12)])
    # measured: 5.6e-4, 1.3e-4, 4e-6
    assert np.all(errors < [1e-3, 2e-4, 1e-5])
