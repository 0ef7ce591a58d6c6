"""What every flow map must be, on any mesh: linear, symmetric, without a negative mode.

Meshes are drawn at random: unstructured, graded up to 18:1, cut by a hull, in open and closed
water. The scheme owes these properties to its form, not to the mesh, so the meshes are coarse.
"""

import math
from dataclasses import dataclass

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import linalg
from scipy.spatial import Delaunay

from bemwave.flow.images import Mirror
from bemwave.flow.panels import PanelFlow
from bemwave.geometry.boundary import boundary_mesh
from bemwave.geometry.outline import SIDES
from bemwave.geometry.surface_mesh import SurfaceMesh, joined
from bemwave.geometry.topology import weld

LENGTH, WIDTH, EDGE = 2.0, 1.2, 0.4
HULL_AT, HULL_RADIUS, DRAUGHT = np.array([1.1, 0.6]), 0.25, 0.15


@dataclass(frozen=True)
class Drawn:
    """A mesh to be made: random points `seed`, sizes graded 1:`grading` from one corner."""

    seed: int
    grading: float
    hull: bool
    depth: float


drawings = st.builds(
    Drawn,
    seed=st.integers(0, 2**16),
    grading=st.floats(1.0, 18.0),
    hull=st.booleans(),
    depth=st.sampled_from([0.2, 0.7, 3.0]),
)
often = settings(max_examples=10, deadline=None, derandomize=True)


def circle(radius, z, sides=10):
    turn = 2 * np.pi * np.arange(sides) / sides
    ring = HULL_AT + radius * np.column_stack([np.cos(turn), np.sin(turn)])
    return np.column_stack([ring, np.full(sides, z)])


def hull():
    """A bowl of thirty triangles whose rim is a polygon at z = 0; normals into it."""
    points = np.vstack([circle(HULL_RADIUS, 0.0), circle(0.7 * HULL_RADIUS, -DRAUGHT),
                        [[*HULL_AT, -1.2 * DRAUGHT]]])  # fmt: skip
    k = np.arange(10)
    after = (k + 1) % 10
    rows = [(k, after, k + 10), (after, after + 10, k + 10), (k + 10, after + 10, 0 * k + 20)]
    corners = np.vstack([np.stack(row, axis=1) for row in rows])
    return SurfaceMesh.of_one_part(points, corners, "hull")


def water(drawn):
    """Delaunay triangles of points thrown at random, none nearer another than the local size."""
    rng = np.random.default_rng(drawn.seed)
    x, y = np.arange(0, LENGTH + EDGE / 2, EDGE), np.arange(0, WIDTH + EDGE / 2, EDGE)
    points = [(a, b) for a in x for b in (0, WIDTH)]
    points += [(a, b) for a in (0, LENGTH) for b in y[1:-1]]
    clear = 0.0
    if drawn.hull:
        points += [(a, b) for a, b, _ in circle(HULL_RADIUS, 0.0)]
        clear = 1.2 * HULL_RADIUS
    for throw in rng.random((400, 2)) * [LENGTH, WIDTH]:
        far = np.linalg.norm(throw) / math.hypot(LENGTH, WIDTH)
        size = 0.6 * EDGE * (1.0 + (drawn.grading - 1.0) * far) / drawn.grading
        margin = min(*throw, *([LENGTH, WIDTH] - throw))
        apart = np.linalg.norm(np.array(points) - throw, axis=1).min()
        outside = np.linalg.norm(throw - HULL_AT) > clear
        if len(points) < 90 and apart > size and margin > 0.5 * size and outside:
            points.append(tuple(throw))
    plan = np.array(points)
    triangles = Delaunay(plan).simplices
    if drawn.hull:
        middle = plan[triangles].mean(axis=1)
        triangles = triangles[np.linalg.norm(middle - HULL_AT, axis=1) > 0.95 * HULL_RADIUS]
    a, b = (plan[triangles[:, k]] - plan[triangles[:, 0]] for k in (1, 2))
    turned = a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0] < 0.0
    triangles[turned] = triangles[turned][:, ::-1]
    return SurfaceMesh.of_one_part(np.column_stack([plan, np.zeros(len(plan))]), triangles, "water")


def flow_map(drawn, kind):
    """The flow map of open water, of a tank with meshed walls, or with two walls by mirrors."""
    mesh = water(drawn)
    mirrors = ()
    if kind == "closed":
        mesh = boundary_mesh(mesh, walls=SIDES, depth=drawn.depth)
    if kind == "mirrors":
        mesh = boundary_mesh(mesh, walls=SIDES[2:], depth=drawn.depth)
        mirrors = (Mirror("x", 0.0), Mirror("x", LENGTH))
    if drawn.hull:
        mesh = weld(joined([mesh, hull()]), 1e-9)[0]
    depth = math.inf if kind == "open" and drawn.depth == 3.0 else drawn.depth
    return PanelFlow(mesh, depth, closed=kind != "open", mirrors=mirrors)


@pytest.mark.parametrize("kind", ["open", "closed", "mirrors"])
@often
@given(drawn=drawings)
def test_no_mode_grows(kind, drawn):
    flow = flow_map(drawn, kind)
    matrix = flow.surface_matrix
    scale = np.abs(matrix).max()
    assert np.abs(matrix - matrix.T).max() <= 1e-12 * scale
    for values in (
        linalg.eigvalsh(matrix),
        linalg.eigh(matrix, flow.mass.toarray(), eigvals_only=True),
    ):
        assert values[0] >= -1e-10 * values[-1]
        if kind == "open":
            assert values[0] > 0.0
    if kind != "open":
        still = np.ones(flow.elements.free)
        assert np.abs(matrix @ still).max() <= 1e-10 * scale


@pytest.mark.parametrize("kind", ["open", "closed"])
@often
@given(drawn=drawings)
def test_linear_and_reciprocal(kind, drawn):
    flow = flow_map(drawn, kind)
    rng = np.random.default_rng(drawn.seed)
    phi = rng.normal(size=(flow.elements.free, 2))
    given_flux = rng.normal(size=(len(flow.elements.hull), 2))
    mix = np.array([0.3, -2.0])
    for answer in (flow.surface_flux, flow.hull_potential):
        both = answer(phi, given_flux)
        together = answer(phi @ mix, given_flux @ mix)
        scale = max(np.abs(both).max(initial=0.0), 1.0)
        np.testing.assert_allclose(both @ mix, together, atol=1e-11 * scale)
    # Green's identity where hulls and walls have no flux: int phi1 w2 = int phi2 w1
    flux = flow.surface_flux(phi, 0.0 * given_flux)
    work = phi.T @ (flow.mass @ flux)
    assert work[0, 1] == pytest.approx(work[1, 0], abs=1e-11 * np.abs(work).max())


def test_greens_identity_with_flux_through_walls():
    """int over the whole boundary of phi1 q2 - phi2 q1 = 0, for a wave and a wall that moves."""
    from bemwave.geometry.outline import Rectangle
    from bemwave.geometry.water_surface import water_surface

    sheet = water_surface(Rectangle(0.0, LENGTH, 0.0, WIDTH), 0.1)
    flow = PanelFlow(boundary_mesh(sheet, walls=SIDES, depth=0.5), 0.5, closed=True)
    e = flow.elements
    x = e.points[: e.free, 0]
    wave, no_wave = np.cos(np.pi * x / LENGTH), np.zeros(e.free)
    still = np.zeros(len(e.hull))
    piston = np.where(e.hull_table[:, 9] > 0.5, 1.0, 0.0)
    shares = e.shares(e.hull, e.hull_table)
    on_hull = np.concatenate([wave, flow.hull_potential(wave, still)])
    # state 1 has no flux on the walls and state 2 no potential on the surface
    done_on_surface = wave @ (flow.mass @ flow.surface_flux(no_wave, piston))
    done_on_walls = (shares @ on_hull) @ piston
    # measured: .06 %
    assert done_on_surface + done_on_walls == pytest.approx(0.0, abs=0.01 * abs(done_on_walls))
