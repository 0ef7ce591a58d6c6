import numpy as np
import pytest

from bemwave.geometry.patterns import grid_triangles
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.handoff import Axes, Box, box_points, box_volume, free_points
from bemwave.handoff.box import BOX_FACES, FACES, ZONE, cell_edges
from bemwave.handoff.plan import Waterplane, water_quadrature, waterplane_quadrature

BOX = Box((3.0, -2.0), (10.0, 6.0), np.radians(30), -4.0, 1.0, (0.7, 0.3), 1.5)


def test_still_water_is_an_edge_between_cells():
    x, y, z = cell_edges(BOX)
    assert 0.0 in z
    assert np.diff(z).max() <= 0.3 + 1e-12
    assert (x[0], x[-1], y[0], y[-1], z[0], z[-1]) == (-5.0, 5.0, -3.0, 3.0, -4.0, 1.0)


def test_faces_have_the_box_s_areas_and_close():
    points = box_points(BOX)
    areas = [points.area[points.face == k].sum() for k in range(6)]
    assert areas == pytest.approx([30, 30, 50, 50, 60, 60], rel=1e-12)
    assert np.abs(points.area @ points.normals).max() < 1e-10
    outward = np.einsum("pd,pd->p", points.points - [3, -2, -1.5], points.normals)
    assert np.all(outward[points.face < len(BOX_FACES)] > 0)


def test_a_turned_box_encloses_its_volume():
    # divergence theorem: the flux of (x, y, z) through a closed surface is 3 volumes
    points = box_points(BOX)
    flux = np.einsum("pd,pd->p", points.points, points.normals) @ points.area
    assert flux == pytest.approx(3 * 10 * 6 * 5, rel=1e-12)


def test_the_zone_s_weight_falls_with_the_square_of_the_distance_and_is_largest_at_a_side():
    points = box_points(BOX)
    local = BOX.to_box(points.points[:, :2])
    distance = np.minimum(5 - np.abs(local[:, 0]), 3 - np.abs(local[:, 1]))
    expected = np.where(distance < 1.5, (1 - distance / 1.5) ** 2, 0.0)
    np.testing.assert_allclose(points.zone_weight, expected, atol=1e-9)
    assert set(points.face[points.zone_weight == 1.0]) >= {0, 1, 2, 3}
    assert np.all(points.zone_weight[points.face == ZONE] > 0)
    assert np.all(points.zone_weight[points.face < 4] == pytest.approx(1.0))


def test_without_a_zone_there_are_faces_only():
    points = box_points(Box((0, 0), (4, 4), 0.0, -2, 1, (1, 1)))
    assert set(points.face) == set(range(6))


def test_columns_are_the_distinct_places_in_plan():
    points = box_volume(BOX)
    x, y, z = cell_edges(BOX)
    assert len(points.columns) == (len(x) - 1) * (len(y) - 1)
    assert len(points.points) == len(points.columns) * (len(z) - 1)
    np.testing.assert_allclose(points.columns[points.column], points.points[:, :2], atol=1e-9)


def test_free_points_keep_their_order_and_share_columns():
    given = [[1, 2, -1], [0, 0, 0.5], [1, 2, -3]]
    points = free_points(given)
    np.testing.assert_array_equal(points.points, given)
    assert len(points.columns) == 2
    assert points.column[0] == points.column[2] != points.column[1]
    assert [FACES[k] for k in points.face] == ["free"] * 3


def test_axes_there_and_back():
    rng = np.random.default_rng(4)
    points = rng.normal(size=(20, 3))
    for up in "xyz":
        axes = Axes((3.0, -2.0, 1.0), 0.7, up, 5.0)
        np.testing.assert_allclose(axes.earth_points(axes.points(points)), points, atol=1e-13)
        e = axes.vectors(np.eye(3))
        assert np.linalg.det(e) == pytest.approx(1.0)  # right-handed
        np.testing.assert_allclose(e[2], np.eye(3)["xyz".index(up)], atol=1e-15)


def test_a_place_stands_in_the_axes_it_moves():
    # x' = R(-heading) (x - origin), here by hand: 90 degrees and a shift
    axes = Axes((10.0, 0.0, 0.0), 0.0).moved((1.0, 2.0, 3.0), 90.0, "z", 0.0)
    np.testing.assert_allclose(
        axes.points(np.array([12.0, 5.0, 4.0])), [3.0, -1.0, 1.0], atol=1e-13
    )


def test_plan_integrals_are_exact_for_linear_functions():
    x, y = np.meshgrid(np.linspace(-9, 15, 14), np.linspace(-12, 9, 12), indexing="ij")
    points = np.column_stack([x.ravel(), y.ravel(), np.zeros(x.size)])
    water = SurfaceMesh.of_one_part(points, grid_triangles(13, 11), "water")
    water = water if water.normals[0, 2] > 0 else water.flipped()
    where, weights = water_quadrature(BOX, water)
    assert weights.sum() == pytest.approx(60.0, rel=1e-12)
    assert weights @ (2 + where @ [0.3, -0.8]) == pytest.approx(
        60 * (2 + 0.3 * 3 + 0.8 * 2), rel=1e-12
    )


def test_waterplane_integrals_reach_only_the_part_inside_the_box():
    # an L-shaped waterplane, its outer arm beyond the box
    loop = np.array([[0, 0], [20, 0], [20, 1], [1, 1], [1, 2], [0, 2]], dtype=float)
    box = Box((0.0, 0.0), (8.0, 8.0), 0.0, -1, 1, (1, 1))
    where, weights = waterplane_quadrature(box, Waterplane([loop], (0.0, 0.0)))
    assert weights.sum() == pytest.approx(5.0, rel=1e-12)
    assert weights @ where[:, 0] == pytest.approx(4 * 2 + 1 * 0.5, rel=1e-12)
