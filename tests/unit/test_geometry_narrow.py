"""Narrow places of hulls and of the water between them, against shapes known exactly.

References: incircles of elementary plane figures; the Chebyshev centre of convex polygons by a
linear program (Boyd & Vandenberghe 2004, 4.3.1) of scipy.
"""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import linprog
from scipy.spatial import ConvexHull

from bemwave.geometry.forms import box, cylinder, sphere, wigley
from bemwave.geometry.hull import place_hull
from bemwave.geometry.narrow import largest_disc, narrowest_gap, thin_member, waterplane_widths
from bemwave.geometry.patterns import grid_triangles
from bemwave.geometry.surface_mesh import SurfaceMesh, joined
from bemwave.geometry.topology import weld


def ngon(radius, sides, x=0.0, y=0.0):
    """The regular polygon round a circle, anticlockwise."""
    angle = 2 * math.pi * np.arange(sides) / sides
    corner = radius / math.cos(math.pi / sides)
    return np.stack([x + corner * np.cos(angle), y + corner * np.sin(angle)], axis=1)


def rectangle(length, beam, x=0.0, y=0.0):
    half = np.array([length, beam]) / 2
    return np.array([[-1, -1], [1, -1], [1, 1], [-1, 1]]) * half + [x, y]


def turned(points, angle):
    c, s = math.cos(angle), math.sin(angle)
    return points @ np.array([[c, s], [-s, c]])


def shifted(mesh, x=0.0, y=0.0, z=0.0):
    return mesh.with_points(mesh.points + np.array([x, y, z]))


def wall(plan, draught, size):
    """Upright sides over a plan polygon, open at the bed; normals out of the water."""
    sides = zip(plan, np.roll(plan, -1, axis=0), strict=True)
    steps = [a + (b - a) * t for a, b in sides for t in _parts(np.hypot(*(b - a)), size)]
    ring = np.array([*steps, steps[0]])
    depths = np.linspace(-draught, 0.0, max(1, round(draught / size)) + 1)
    points = np.array([[*xy, z] for z in depths for xy in ring])
    triangles = grid_triangles(len(depths) - 1, len(ring) - 1)[:, ::-1]
    return weld(SurfaceMesh.of_one_part(points, triangles, "hull"), 1e-9)[0]


def _parts(length, size):
    count = max(1, round(length / size))
    return [[k / count] for k in range(count)]


def hull(*meshes, name="hull", position=(0.0, 0.0)):
    return place_hull(name, joined(meshes), position=position)


# discs


@settings(deadline=None, max_examples=40)
@given(
    length=st.floats(1.0, 100.0),
    share=st.floats(1e-4, 1.0),
    angle=st.floats(0.0, 6.3),
    x=st.floats(-500.0, 500.0),
)
def test_of_a_rectangle_it_is_as_wide_as_the_lesser_side(length, share, angle, x):
    plan = turned(rectangle(length, share * length), angle) + np.array([x, -x])
    diameter, centre = largest_disc([plan])
    assert diameter == pytest.approx(share * length, rel=1e-3)
    assert np.linalg.norm(turned(np.array(centre) - [x, -x], -angle)) <= length


@settings(deadline=None, max_examples=40)
@given(seed=st.integers(0, 10_000), count=st.integers(3, 30), flat=st.floats(0.02, 1.0))
def test_of_a_convex_polygon_it_is_the_disc_of_a_linear_program(seed, count, flat):
    points = np.random.default_rng(seed).normal(size=(count, 2)) * [1.0, flat]
    rim = ConvexHull(points)
    planes = rim.equations  # n.x + d <= 0 within
    best = linprog(
        [0, 0, -1],
        A_ub=np.column_stack([planes[:, :2], np.ones(len(planes))]),
        b_ub=-planes[:, 2],
        bounds=[(None, None), (None, None), (0, None)],
    )
    diameter, _ = largest_disc([points[rim.vertices]])
    assert diameter == pytest.approx(2 * best.x[2], rel=1e-3)


@pytest.mark.parametrize("angle", [0.0, 0.4])
def test_of_an_l_it_is_wider_than_the_arms(angle):
    """Arms of 1: the disc in the corner goes through the inner one, (1 - r)^2 2 = r^2."""
    plan = np.array([[0, 0], [4, 0], [4, 1], [1, 1], [1, 4], [0, 4.0]])
    diameter, centre = largest_disc([turned(plan, angle)])
    radius = math.sqrt(2) / (1 + math.sqrt(2))
    assert diameter == pytest.approx(2 * radius, rel=1e-3)
    np.testing.assert_allclose(turned(np.array(centre), -angle), [radius, radius], atol=1e-3)


def test_between_a_rim_and_a_pool_it_is_as_wide_as_the_hull_there():
    outer, pool = ngon(5.0, 64), ngon(2.0, 64, x=1.0)[::-1]
    diameter, centre = largest_disc([outer, pool])
    assert diameter == pytest.approx(4.0, rel=5e-3)  # from -5 to -1
    assert centre == pytest.approx((-3.0, 0.0), abs=0.3)


# waterplanes


def test_pointed_ends_do_not_make_a_ship_thin():
    (width,) = waterplane_widths(hull(wigley(40.0, 4.0, 2.5, 0.8), name="ship"))
    assert width.size == pytest.approx(4.0, rel=5e-3)
    assert width.place == pytest.approx((0.0, 0.0, 0.0), abs=0.5)
    assert width.names == ("ship",)


def test_each_waterplane_is_measured():
    columns = [shifted(cylinder(r, 3.0, 0.3), x, y) for r, x, y in ((1, -8, 0), (2, 8, 0))]
    small, large = sorted(waterplane_widths(hull(*columns)), key=lambda width: width.size)
    assert small.size == pytest.approx(2.0, rel=0.02)
    assert large.size == pytest.approx(4.0, rel=0.02)
    assert small.place[0] == pytest.approx(-8.0, abs=0.01)


def test_a_pool_belongs_to_the_waterplane_round_it():
    ring = [wall(rectangle(12, 12), 2.0, 0.5), wall(rectangle(8, 8)[::-1], 2.0, 0.5)]
    beside = wall(rectangle(5, 5, x=20.0), 2.0, 0.5)
    around, alone = waterplane_widths(hull(*ring, beside))
    # in a corner of the ring, through the pool's corner
    assert around.size == pytest.approx(4 * math.sqrt(2) / (1 + math.sqrt(2)), rel=1e-2)
    assert alone.size == pytest.approx(5.0, rel=1e-3)


def test_a_body_under_water_has_none():
    assert waterplane_widths(hull(sphere(1.0, 3.0, 0.3))) == []


# thin members


@pytest.mark.parametrize("size", [0.2, 1.0])
def test_a_plate_is_as_thin_as_it_is(size):
    found = thin_member(hull(box(10.0, 0.1, 2.0, size), name="plate"), 3.0)
    assert found.size == pytest.approx(0.1)
    assert found.names == ("plate",)
    assert found.share == pytest.approx(40.0 / (40.0 + 1.0 + 0.4), rel=1e-6)  # not its edges
    assert thin_member(hull(box(10.0, 0.1, 2.0, size)), 0.09) is None


@pytest.mark.parametrize("beam", [2.0, 4.0, 12.0])
@pytest.mark.parametrize("under", [0.5, 1.0, 1.8])
def test_ships_are_not_thin_for_their_ends(beam, under):
    assert thin_member(hull(wigley(40.0, beam, 2.5, 0.5)), under) is None


@pytest.mark.parametrize(("half_angle", "thin"), [(20, False), (8, False), (4, False), (2, True)])
def test_a_taper_is_thin_only_if_it_hardly_tapers(half_angle, thin):
    half = 2.0 / math.tan(math.radians(half_angle))
    plan = np.array([[-half, 0], [0, -2], [half, 0], [0, 2.0]])
    found = thin_member(hull(wall(plan, 1.0, 0.5)), 2.0)
    assert (found is not None) == thin


@pytest.mark.parametrize("under", [0.3, 2.0])
def test_a_fin_on_a_thick_body_is_found_where_it_is(under):
    plan = np.array(
        [[-5, -2], [5, -2], [5, -0.1], [8, -0.1], [8, 0.1], [5, 0.1], [5, 2], [-5, 2.0]]
    )
    body = hull(wall(plan, 2.0, 0.25))
    found = thin_member(body, under)
    assert found.size == pytest.approx(0.2)
    assert found.place[0] > 5.0
    assert found.share < 0.3
    assert thin_member(body, 0.19) is None
    assert waterplane_widths(body)[0].size == pytest.approx(4.0, rel=1e-3)


def test_bodies_that_are_thick_all_over_have_no_thin_members():
    for mesh in (sphere(2.0, 0.0, 0.3), cylinder(2.0, 3.0, 0.4), box(6.0, 4.0, 0.3, 0.4)):
        assert thin_member(hull(mesh), 3.0) is None


def test_what_lies_deeper_is_not_asked_for():
    plate = shifted(box(4.0, 0.1, 1.0, 0.5), z=-3.0)
    lid = shifted(plate.with_points(plate.points * [1, 1, -1]).flipped(), z=-6.0)
    submerged = hull(box(4.0, 4.0, 1.0, 0.5), weld(joined([plate, lid]), 1e-9)[0])
    assert thin_member(submerged, 1.0).size == pytest.approx(0.1)
    assert thin_member(submerged, 1.0).place[2] < -2.0
    assert thin_member(submerged, 1.0, down_to=1.9) is None


# gaps


@pytest.mark.parametrize("size", [0.3, 2.0])
def test_between_two_barges_it_is_their_distance_whatever_the_panels(size):
    barges = [hull(box(10, 4, 2, size), name=n, position=(0, y)) for n, y in (("a", 0), ("b", 5.5))]
    gap = narrowest_gap(barges)
    assert gap.size == pytest.approx(1.5)
    assert set(gap.names) == {"a", "b"}
    assert 2.0 <= gap.place[1] <= 3.5


def test_between_corners_of_waterlines():
    barges = [hull(box(4, 4, 2, 0.5), name="a"), hull(box(4, 4, 1, 0.5), name="b", position=(7, 8))]
    assert narrowest_gap(barges).size == pytest.approx(5.0)


def test_between_a_corner_and_a_side():
    turned_box = place_hull("b", box(2, 2, 1, 2.0), position=(4.0, 0.1), heading=math.pi / 4)
    gap = narrowest_gap([hull(box(4, 4, 2, 2.0), name="a"), turned_box])
    assert gap.size == pytest.approx(2.0 - math.sqrt(2.0))


def test_between_columns_of_one_body():
    columns = [shifted(cylinder(1.0, 3.0, 0.25), x, y) for x in (-4, 4) for y in (-3, 3)]
    gap = narrowest_gap([hull(*columns, name="platform")])
    assert gap.size == pytest.approx(4.0, rel=0.02)
    assert gap.names == ("platform",)


def test_across_a_pool_but_not_across_the_hull_round_it():
    ring = [wall(rectangle(12, 8), 2.0, 0.5), wall(rectangle(10, 3)[::-1], 2.0, 0.5)]
    assert narrowest_gap([hull(*ring)]).size == pytest.approx(3.0)


def test_between_the_arms_of_one_waterline():
    plan = np.array([[0, 0], [9, 0], [9, 2], [2, 2], [2, 4], [9, 4], [9, 6], [0, 6.0]])
    assert narrowest_gap([hull(wall(plan, 2.0, 0.5))]).size == pytest.approx(2.0)


def test_under_the_waterline_to_the_size_of_panels():
    bodies = [hull(shifted(sphere(2.0, 4.0, 0.25), x), name=f"ball{x}") for x in (0.0, 5.0)]
    assert narrowest_gap(bodies).size == pytest.approx(1.0, abs=0.05)
    assert narrowest_gap(bodies, down_to=1.0) is None


def test_a_body_alone_has_no_gap():
    assert narrowest_gap([hull(wigley(40.0, 4.0, 2.5, 0.8))]) is None
    assert narrowest_gap([]) is None
