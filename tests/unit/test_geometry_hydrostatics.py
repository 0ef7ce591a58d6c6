"""Hydrostatics and hull forms against handbook formulas.

Volumes and centroids of box, cylinder, sphere and its cap, second moments of rectangle and circle:
textbook mensuration. Wigley's hull: integrals of its own polynomial. Four columns on pontoons:
cylinder and box volumes, intersections left out (stated where used).
"""

import math

import numpy as np
import pytest

from bemwave.errors import InputError
from bemwave.geometry.columns import columns
from bemwave.geometry.faults import find_faults
from bemwave.geometry.forms import box, cylinder, sphere, wigley
from bemwave.geometry.hydrostatics import hydrostatics
from bemwave.geometry.remesh import quality
from bemwave.geometry.topology import boundary_loops


def symmetric(mesh, axis):
    """Whether mirroring in the plane x = 0 or y = 0 gives the same triangles."""
    mirror = np.ones(3)
    mirror[axis] = -1.0

    def canonical(vertices):
        keys = [tuple(sorted(map(tuple, np.round(t, 9) + 0.0))) for t in vertices]
        return sorted(keys)

    return canonical(mesh.vertices) == canonical(mesh.vertices * mirror)


def test_box():
    data = hydrostatics(box(6.0, 2.0, 1.5, 0.4))
    assert data.volume == pytest.approx(18.0, rel=1e-13)
    assert data.waterplane_area == pytest.approx(12.0, rel=1e-13)
    assert data.waterplane_xx == pytest.approx(2.0 * 6.0**3 / 12.0, rel=1e-13)
    assert data.waterplane_yy == pytest.approx(6.0 * 2.0**3 / 12.0, rel=1e-13)
    assert data.waterplane_xy == pytest.approx(0.0, abs=1e-12)
    np.testing.assert_allclose(data.centre_of_buoyancy, [0, 0, -0.75], atol=1e-13)
    assert (data.length, data.beam, data.draught) == (6.0, 2.0, 1.5)
    assert data.wetted_area == pytest.approx(12.0 + 2 * 1.5 * 8.0, rel=1e-13)


def test_moved_and_turned_box_keeps_its_moments_about_its_own_centre():
    mesh = box(6.0, 2.0, 1.5, 0.4)
    c, s = math.cos(0.7), math.sin(0.7)
    moved = mesh.points @ np.array([[c, -s, 0], [s, c, 0], [0, 0, 1]]).T + [300.0, -200.0, 0.0]
    data = hydrostatics(mesh.with_points(moved))
    assert data.volume == pytest.approx(18.0, rel=1e-12)
    np.testing.assert_allclose(data.centre_of_buoyancy, [300, -200, -0.75], rtol=1e-12)
    np.testing.assert_allclose(data.centre_of_flotation, [300, -200], rtol=1e-12)
    # rotation of a second-moment tensor
    assert data.waterplane_xx == pytest.approx(36 * c**2 + 4 * s**2, rel=1e-10)
    assert data.waterplane_yy == pytest.approx(36 * s**2 + 4 * c**2, rel=1e-10)
    assert data.waterplane_xy == pytest.approx((36 - 4) * s * c, rel=1e-10)


@pytest.mark.parametrize("on_bed", [False, True])
def test_cylinder_is_exact_in_volume_and_waterplane(on_bed):
    mesh = cylinder(2.0, 5.0, 0.7, stands_on_bed=on_bed)
    data = hydrostatics(mesh)
    assert data.volume == pytest.approx(math.pi * 4.0 * 5.0, rel=1e-12)
    assert data.waterplane_area == pytest.approx(math.pi * 4.0, rel=1e-12)
    assert data.waterplane_xx == pytest.approx(math.pi * 2.0**4 / 4.0, rel=1e-3)
    np.testing.assert_allclose(data.centre_of_buoyancy, [0, 0, -2.5], atol=1e-12)
    assert len(boundary_loops(mesh.triangles)) == 1 + on_bed


def test_cylinder_panels_are_smaller_towards_the_lower_edge():
    z = np.unique(np.round(cylinder(1.0, 2.0, 0.2).points[:, 2], 12))
    heights = np.diff(z)  # from the bottom up
    assert heights[0] < 0.5 * heights[-1]
    assert np.all(np.diff(heights) > 0)


@pytest.mark.parametrize("centre_depth", [-0.5, 0.0, 0.5])
def test_floating_sphere_displaces_its_cap(centre_depth):
    radius, height = 1.0, 1.0 + centre_depth
    mesh = sphere(radius, centre_depth, 0.1)
    data = hydrostatics(mesh)
    volume = math.pi * height**2 * (3.0 - height) / 3.0
    assert data.volume == pytest.approx(volume, rel=1e-12)
    # centroid of a cap, below its flat: from the integral of z over the slices
    first = -math.pi * height**3 * (4.0 - height) / 12.0
    assert data.centre_of_buoyancy[2] == pytest.approx(first / volume, rel=0.01)
    assert data.waterplane_area == pytest.approx(math.pi * (1 - centre_depth**2), rel=1e-12)
    assert np.all(mesh.points[boundary_loops(mesh.triangles)[0], 2] == 0.0)


def test_hemisphere_has_four_m_squared_triangles_and_the_circle_s_waterplane():
    for rings in (4, 9, 18):
        mesh = sphere(1.0, 0.0, 0.5 * math.pi / rings)
        assert len(mesh.triangles) == 4 * rings**2
        assert hydrostatics(mesh).waterplane_area == pytest.approx(math.pi, rel=1e-12)


def test_submerged_sphere():
    data = hydrostatics(sphere(1.0, 2.5, 0.2))
    assert data.volume == pytest.approx(4.0 / 3.0 * math.pi, rel=1e-12)
    assert data.waterplane_area == 0.0
    np.testing.assert_allclose(data.centre_of_buoyancy, [0, 0, -2.5], atol=1e-12)


def test_wigley_converges_to_its_formula_at_second_order():
    error = []
    for size in (0.4, 0.2, 0.1):
        data = hydrostatics(wigley(10.0, 1.0, 0.625, size))
        error.append(1.0 - data.volume / (4.0 / 9.0 * 10.0 * 0.625))
        assert data.waterplane_area == pytest.approx(2.0 / 3.0 * 10.0, rel=0.01)
        # int x^2 y dx = B L^3/30, and depth of centroid 3/8 T, of the polynomial itself
        assert data.waterplane_xx == pytest.approx(1.0 * 10.0**3 / 30.0, rel=0.01)
        assert data.centre_of_buoyancy[2] == pytest.approx(-0.375 * 0.625, rel=0.03)
    assert error[2] < 0.004
    assert np.log2(error[1] / error[2]) == pytest.approx(2.0, abs=0.3)


@pytest.mark.parametrize(
    ("mesh", "axes"),
    [
        (wigley(10, 1, 0.625, 0.3), (0, 1)),
        (box(4, 2, 1, 0.3), (0, 1)),
        (cylinder(1, 2, 0.3), (0, 1)),
        (sphere(1, 0.0, 0.2), (0, 1)),
        (sphere(1, 0.6, 0.2), (0, 1)),
        (sphere(1, 2.0, 0.2), (0, 1)),
    ],
)
def test_forms_are_sound_symmetric_and_of_good_shape(mesh, axes):
    assert find_faults(mesh.flipped(), open_at=[0.0]) == []
    assert all(symmetric(mesh, axis) for axis in axes)
    assert quality(mesh).min() > 0.25
    assert hydrostatics(mesh).volume > 0


@pytest.mark.parametrize(
    "make",
    [
        lambda: box(0.0, 1, 1, 0.1),
        lambda: wigley(1, 1, math.nan, 0.1),
        lambda: cylinder(1, 1, -1),
        lambda: sphere(1, -1.0, 0.1),
        lambda: sphere(1, 1.0, 0.1),
        lambda: columns(3, 2, 1, 4, 0.5),
        lambda: columns(20, 2, 5, 8, 1.0),
        lambda: columns(20, 2, 2, math.inf, 1.0),
    ],
)
def test_impossible_forms_are_refused(make):
    with pytest.raises(InputError):
        make()


def test_columns_on_pontoons(needs_gmsh):
    mesh = columns(spacing=20, column_radius=2, pontoon=2.5, draught=8, panel_size=1.0)
    data = hydrostatics(mesh)
    assert data.waterplane_area == pytest.approx(4 * math.pi * 4.0, rel=1e-12)
    # pontoon from column to column, less what lies inside the columns: between flat ends at the
    # axis and the circle's mean half-width, 2/p int_0^(p/2) sqrt(r^2 - y^2) dy
    p, r = 2.5, 2.0
    y = np.linspace(0, p / 2, 20001)
    ends = 2 * np.trapezoid(np.sqrt(r**2 - y**2), y) / p
    volume = 4 * math.pi * r**2 * 8.0 + 4 * p**2 * (20.0 - 2 * ends)
    finer = hydrostatics(columns(20, 2, 2.5, 8, panel_size=0.5))
    error, less = data.volume / volume - 1, finer.volume / volume - 1  # chords, second order
    assert abs(error) < 0.006
    assert abs(less) < 0.4 * abs(error)
    np.testing.assert_allclose(data.centre_of_buoyancy[:2], 0.0, atol=1e-9)
    assert find_faults(mesh.flipped(), open_at=[0.0]) == []
    assert symmetric(mesh, 0)
    assert symmetric(mesh, 1)
    assert quality(mesh).min() > 0.2
    assert len(boundary_loops(mesh.triangles)) == 4
