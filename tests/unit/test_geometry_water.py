"""The water surface, what lies in it, and the boundary joined of water, hulls and walls."""

import math
import signal
import subprocess
import sys

import numpy as np
import pytest

from bemwave.errors import InputError, MissingLibraryError
from bemwave.geometry.boundary import boundary_mesh, wall_layers
from bemwave.geometry.forms import box, cylinder, sphere, wigley
from bemwave.geometry.hull import place_hull, prepare_hull
from bemwave.geometry.inside import inside
from bemwave.geometry.layout import check_layout, clearance, signed_area
from bemwave.geometry.mesher import INSTALL_LINE, run_job
from bemwave.geometry.outline import SIDES, Circle, Rectangle
from bemwave.geometry.remesh import edge_lengths, quality
from bemwave.geometry.surface_mesh import SurfaceMesh, joined
from bemwave.geometry.topology import boundary_edges, boundary_loops
from bemwave.geometry.water_surface import expected_triangles, fitted_water, water_surface

BASIN = Rectangle(-20.0, 20.0, -12.0, 12.0)


def ship(position=(0.0, 0.0), heading=0.4):
    return place_hull("ship", wigley(12, 3, 1, 0.6), position=position, heading=heading)


def pile(position=(8.0, 6.0)):
    return place_hull("pile", cylinder(1.0, 5.0, 0.4, stands_on_bed=True), position=position)


def ring_pontoon():
    """A square ring with a moonpool in it, open at z = 0, normals out of the water."""
    outer, inner = box(8, 8, 1, 1), box(4, 4, 1, 1).flipped()
    # leave the inner bottom out of both: what remains is a ring with a flat underside
    hole = (np.abs(outer.centroids[:, :2]).max(axis=1) < 2) & (outer.centroids[:, 2] < -0.99)
    lid = (np.abs(inner.centroids[:, :2]).max(axis=1) < 2) & (inner.centroids[:, 2] < -0.99)
    from bemwave.geometry.topology import weld

    return weld(joined([outer.keep(~hole), inner.keep(~lid)]), 1e-9)[0]


# structured sheets


@pytest.mark.parametrize("outline", [BASIN, Circle(3.0, -2.0, 12.0)])
def test_as_many_triangles_as_expected(outline):
    assert expected_triangles(outline, 1.3, [], 1.3) == len(water_surface(outline, 1.3).triangles)


def test_rectangle_is_translation_invariant():
    mesh = water_surface(BASIN, 2.0)
    assert (len(mesh.points), len(mesh.triangles)) == (21 * 13, 2 * 20 * 12)
    assert np.all(mesh.normals == [0, 0, 1])
    assert np.all(mesh.areas == 2.0)
    inner = np.all(np.abs(mesh.points[:, :2]) < [20, 12], axis=1)
    assert set(np.bincount(mesh.triangles.ravel())[inner]) == {6}


def test_circle_has_the_circle_s_area_to_rounding():
    mesh = water_surface(Circle(3.0, -2.0, 5.0), 0.5)
    assert mesh.areas.sum() == pytest.approx(math.pi * 25.0, rel=1e-13)
    assert mesh.points.mean(axis=0) == pytest.approx([3, -2, 0])
    rim = mesh.points[np.unique(boundary_edges(mesh.triangles)), :2] - [3, -2]
    assert np.ptp(np.linalg.norm(rim, axis=1)) < 1e-12
    assert len(rim) == len(Circle(3.0, -2.0, 5.0).rim(0.5)) == 60
    assert quality(mesh).min() > 0.7


@pytest.mark.parametrize("sizes", [(0.0, None), (math.nan, None), (1.0, -0.5), (math.inf, None)])
def test_spacings_must_be_lengths(sizes):
    with pytest.raises(InputError, match=r"spacing = .* above zero"):
        water_surface(BASIN, sizes[0], fine_spacing=sizes[1])


def test_absurdly_small_sizes_are_refused_before_they_fill_the_memory():
    with pytest.raises(InputError, match=r"spacing = 0\.001 m makes about 2e\+09 triangles"):
        water_surface(BASIN, 0.001)
    with pytest.raises(InputError, match=r"box: panel_size = 1e-06 m makes about"):
        box(2.0, 1.0, 1.0, 1e-6)
    tank = box(2.0, 1.0, 1.0, 0.5).flipped()
    with pytest.raises(InputError, match=r"tank: panel_size = 1e-05 m makes about"):
        prepare_hull(tank, "tank", panel_size=1e-5)


def test_a_body_wholly_under_water_leaves_the_surface_structured():
    deep = place_hull("ball", sphere(1.0, 3.0, 0.5))
    np.testing.assert_array_equal(
        water_surface(BASIN, 2.0, [deep]).points, water_surface(BASIN, 2.0).points
    )


# graded sheets round hulls


@pytest.fixture(scope="module")
def scene():
    return [ship(), pile(), place_hull("ring", ring_pontoon(), position=(-12.0, -5.0))]


def directed(mesh):
    return {tuple(edge) for edge in boundary_edges(mesh.triangles).tolist()}


def test_every_waterline_edge_is_kept(needs_gmsh, scene):
    water = water_surface(BASIN, 2.0, scene, 0.5)
    assert np.all(water.points[:, 2] == 0.0)
    assert np.all(water.normals[:, 2] == pytest.approx(1.0))
    assert quality(water).min() > 0.3
    assert quality(water).mean() > 0.93
    places = {tuple(point): k for k, point in enumerate(water.points[:, :2].tolist())}
    edges, count = directed(water), 0
    for hull in scene:
        for polygon in hull.polygons():
            number = [places[tuple(point)] for point in polygon.tolist()]  # equal bit by bit
            count += len(number)
            assert edges.issuperset(zip(number[1:] + number[:1], number, strict=True))
    rim = BASIN.rim(2.0)
    assert {tuple(p) for p in rim.tolist()} <= set(places)
    assert len(edges) == count + len(rim)  # and no other edge is open


def test_the_sheet_covers_the_water_and_the_moonpool_and_nothing_else(needs_gmsh, scene):
    water = water_surface(BASIN, 2.0, scene, 0.5)
    dry = sum(signed_area(polygon) for hull in scene for polygon in hull.polygons())
    assert [signed_area(p) for p in scene[2].polygons()] == pytest.approx([64.0, -16.0])
    assert water.areas.sum() == pytest.approx(40 * 24 - dry, rel=1e-12)
    pool = np.all(np.abs(water.centroids[:, :2] - [-12.0, -5.0]) < 2.0, axis=1)
    assert water.areas[pool].sum() == pytest.approx(16.0, rel=1e-9)


def test_edges_grow_from_fine_to_coarse(needs_gmsh):
    hull = pile((0.0, 0.0))
    water = water_surface(Rectangle(-25, 25, -25, 25), 3.0, [hull], 0.4)
    length, far = edge_lengths(water).mean(axis=1), np.linalg.norm(water.centroids, axis=1)
    assert length[far < 1.6].mean() == pytest.approx(0.45, rel=0.2)
    assert length[far > 18].mean() == pytest.approx(3.0, rel=0.15)
    assert np.all(length < 1.4 * np.minimum(3.0, 0.4 + 0.2 * far))


@pytest.mark.parametrize(("spacing", "fine"), [(2.0, 0.4), (1.5, 0.6), (1.0, 0.5)])
@pytest.mark.parametrize("hulls", [[ship()], [ship(), pile()]])
def test_about_as_many_triangles_as_expected_round_hulls(needs_gmsh, hulls, spacing, fine):
    made = len(water_surface(BASIN, spacing, hulls, fine).triangles)
    assert expected_triangles(BASIN, spacing, hulls, fine) == pytest.approx(made, rel=0.125)


def test_the_same_input_gives_the_same_mesh(needs_gmsh):
    one, other = (water_surface(Circle(0, 0, 10.0), 1.5, [ship()], 0.6) for _ in range(2))
    np.testing.assert_array_equal(one.points, other.points)
    np.testing.assert_array_equal(one.triangles, other.triangles)
    assert one.areas.sum() == pytest.approx(math.pi * 100 - 24.0, rel=0.01)


def test_unstructured_open_water(needs_gmsh):
    mesh = water_surface(BASIN, 2.0, structured=False)
    assert mesh.areas.sum() == pytest.approx(40 * 24, rel=1e-12)
    assert quality(mesh).min() > 0.5
    assert len(mesh.triangles) > 200
    assert len(np.unique(np.round(mesh.areas, 9))) > 50


# a ready-made sheet


def test_a_ready_sheet_is_fitted_to_the_waterlines(needs_gmsh):
    hull = ship()
    water = water_surface(BASIN, 3.0, [hull], 0.6)
    rough = water.points.astype(np.float32).astype(float) + np.array([0, 0, 1e-6])
    turned = SurfaceMesh.of_one_part(rough, water.triangles[:, ::-1], "anything")
    fitted = fitted_water(turned, hull.polygons(), "water.stl")
    assert np.all(fitted.points[:, 2] == 0.0)
    assert np.all(fitted.area_vectors[:, 2] > 0)
    boundary_mesh(fitted, [hull])  # every waterline point is there


def test_a_sheet_made_for_another_place_is_refused(needs_gmsh):
    water = water_surface(BASIN, 3.0, [ship()], 0.6)
    with pytest.raises(InputError, match=r"water.vtu does not follow the waterline"):
        fitted_water(water, ship((1.0, 0.0)).polygons(), "water.vtu")
    with pytest.raises(InputError, match="not in the water mesh"):
        boundary_mesh(water, [ship((1.0, 0.0))])


def test_a_sheet_without_holes_or_not_flat_is_refused():
    sheet = water_surface(BASIN, 0.5)
    square = place_hull("box", box(2.0, 2.0, 1.0, 0.5))
    with pytest.raises(InputError, match="does not follow the waterline"):
        fitted_water(sheet, square.polygons(), "water.vtu")
    with pytest.raises(InputError, match=r"reaches \|z\| = 1 m"):
        fitted_water(sheet.with_points(sheet.points + np.array([0, 0, 1.0])), [], "water.vtu")


# layout


@pytest.mark.parametrize(
    ("hulls", "says"),
    [
        ([ship((17.0, 0.0))], "ship reaches .* outside the water surface, the rectangle x -20"),
        ([ship(), pile((1.0, 0.5))], "ship and pile overlap"),
        ([pile((0, 0)), place_hull("buoy", cylinder(0.3, 1.0, 0.2))], "pile and buoy overlap"),
        ([pile((0, 0)), place_hull("deep", sphere(0.5, 3.0, 0.2))], "pile and deep overlap"),
        (
            [place_hull(n, box(2, 2, 1, 0.5), position=(x, 0)) for n, x in (("a", 0), ("b", 2))],
            "a and b (overlap|touch)",
        ),
        (
            [
                place_hull("a", box(2, 2, 1, 0.5)),
                place_hull("b", box(2, 2, 1, 0.5), position=(2.0005, 0.0)),
            ],
            "a and b touch",
        ),
    ],
)
def test_bodies_outside_overlapping_or_touching(hulls, says):
    with pytest.raises(InputError, match=says):
        check_layout(hulls, BASIN)


def test_long_crossing_hulls_without_points_in_each_other_overlap():
    long = place_hull("long", box(10, 1, 1, 10))
    across = place_hull("across", box(1, 10, 1, 10))
    with pytest.raises(InputError, match="overlap"):
        check_layout([long, across], BASIN)


def test_bodies_clear_of_each_other_pass():
    under = place_hull("under", sphere(1.0, 3.5, 0.3))
    check_layout([ship(), pile(), under], BASIN)
    assert clearance(pile(), pile((8.0, 10.0))) == pytest.approx(2.0, abs=0.05)
    with pytest.raises(InputError, match="outside the water surface, the circle of radius 9"):
        check_layout([pile((8.0, 5.0))], Circle(0, 0, 9.0))


# inside


@pytest.mark.parametrize("hull", [ship((3.0, 1.0), 0.7), pile((3.0, 1.0))])
def test_points_inside_a_hull_are_told_by_its_formula(hull):
    rng = np.random.default_rng(5)
    points = rng.uniform([-5, -6, -5.0], [11, 8, 5.0], (20_000, 3))
    x, y, z = hull.place.back(points).T
    z = -np.abs(z)  # over still water: as at the mirrored point
    if hull.name == "pile":
        margin = 1.0 - np.hypot(x, y)
        margin[z < -5] = -1
    else:
        margin = 1.5 * (1 - (x / 6) ** 2) * (1 - z**2) - np.abs(y)
        margin[(np.abs(x) > 6) | (z < -1)] = -1
    clear = np.abs(margin) > 0.05  # panels cut corners
    np.testing.assert_array_equal(inside(hull.mesh, points)[clear], margin[clear] > 0)
    assert (margin[clear] > 0).sum() > 200


def test_moonpool_water_is_not_inside():
    ring = ring_pontoon()
    points = [[0, 0, -0.5], [3, 0, -0.5], [0, 0, 0], [3, 0, 0], [5, 0, 0], [3, 0, -1.5]]
    assert inside(ring, np.array(points)).tolist() == [False, True, False, True, False, False]


# the joined boundary


def edge_owners(mesh):
    owners = {}
    for corners, part in zip(mesh.triangles.tolist(), mesh.part.tolist(), strict=True):
        for a, b in zip(corners, corners[1:] + corners[:1], strict=True):
            assert (a, b) not in owners, "an edge is run twice in one sense"
            owners[a, b] = mesh.part_names[part]
    return owners


@pytest.mark.parametrize("depth", [5.0, 5.3])
def test_a_walled_basin_is_closed_but_for_the_bed(needs_gmsh, depth):
    on_bed = cylinder(1.0, depth, 0.4, stands_on_bed=True)
    hulls = [ship(), place_hull("pile", on_bed, position=(8.0, 6.0))]
    water = water_surface(BASIN, 2.0, hulls, 0.5)
    mesh = boundary_mesh(water, hulls, SIDES, depth)
    assert mesh.part_names == ("water", "ship", "pile", *(f"wall_{side}" for side in SIDES))
    np.testing.assert_array_equal(mesh.points[: len(water.points)], water.points)
    owners = edge_owners(mesh)
    loops = boundary_loops(mesh.triangles)
    assert len(loops) == 2  # round the bed, and round the pile's foot
    assert all(np.all(mesh.points[loop, 2] == -depth) for loop in loops)
    met = {frozenset((part, owners[b, a])) for (a, b), part in owners.items() if (b, a) in owners}
    assert {frozenset(("water", "ship")), frozenset(("water", "wall_x_min"))} <= met
    assert {frozenset(("wall_x_min", "wall_y_min")), frozenset(("wall_x_max", "wall_y_max"))} <= met
    # closed but for the bed: the area vectors of water, walls and hulls add up to the lid's
    foot = math.pi * 1.0
    assert mesh.area_vectors.sum(axis=0) == pytest.approx([0, 0, 40 * 24 - foot], abs=1e-9)


@pytest.mark.parametrize("side", SIDES)
def test_wall_normals_point_out_of_the_tank(side):
    mesh = boundary_mesh(water_surface(BASIN, 4.0), walls=[side], depth=6.0)
    axis, sign = SIDES.index(side) // 2, 1 if side.endswith("max") else -1
    wall = mesh.in_part(f"wall_{side}")
    np.testing.assert_allclose(
        mesh.normals[wall], sign * np.eye(3)[axis][None].repeat(wall.sum(), 0)
    )
    assert mesh.areas[wall].sum() == pytest.approx(6.0 * (24 if axis == 0 else 40))


def test_round_tank():
    tank = boundary_mesh(water_surface(Circle(0, 0, 1.0), 0.2), walls=["rim"], depth=1.0)
    wall = tank.in_part("wall_rim")
    assert np.all(np.sum(tank.normals * tank.centroids * [1, 1, 0], axis=1)[wall] > 0.9)
    assert [len(loop) for loop in boundary_loops(tank.triangles)] == [30]


def test_open_water_has_its_rim_open():
    mesh = boundary_mesh(water_surface(BASIN, 2.0))
    assert mesh.part_names == ("water",)


def test_walls_need_a_bed():
    with pytest.raises(InputError, match="wall_x_min is to be meshed in water of depth 'deep'"):
        boundary_mesh(water_surface(BASIN, 2.0), walls=["x_min"])


@pytest.mark.parametrize(("depth", "edge"), [(0.3, 1.0), (1.0, 1.0), (5.0, 0.5), (100.0, 1.0)])
def test_wall_layers_start_at_half_the_rim_s_size_and_grow_gently(depth, edge):
    z = wall_layers(depth, edge)
    heights = np.diff(z)
    assert (z[0], z[-1]) == (0.0, pytest.approx(depth))
    assert heights[0] < 0.55 * edge
    assert np.all(heights[1:] / heights[:-1] < 1.5)
    assert np.all(heights[z[1:] <= 10.0 * edge] < 1.1 * edge)
    assert depth < edge or heights[0] > 0.3 * edge


def test_walls_of_unequal_edges_have_common_layers():
    """Else the walls would not hang together where they meet."""
    water = water_surface(Rectangle(0.0, 2.0, 0.0, 1.0), 0.29)
    mesh = boundary_mesh(water, walls=SIDES, depth=0.65)
    assert len(boundary_loops(mesh.triangles)) == 1


# the mesher's manners


def test_ctrl_c_means_the_same_after_meshing(needs_gmsh):
    before = signal.getsignal(signal.SIGINT)
    water_surface(BASIN, 4.0, structured=False)
    assert signal.getsignal(signal.SIGINT) is before
    assert "gmsh" not in sys.modules


def test_meshing_works_outside_the_main_thread(needs_gmsh):
    from concurrent.futures import ThreadPoolExecutor

    with ThreadPoolExecutor(1) as pool:
        mesh = pool.submit(water_surface, BASIN, 4.0, structured=False).result()
    assert mesh.areas.sum() == pytest.approx(960.0)


def test_a_time_limit_stops_the_mesher():
    with pytest.raises(InputError, match=r"meshing this took longer than 0\.01 s"):
        run_job("water", {"loops": 0}, "meshing this", seconds=0.01)


def test_what_the_mesher_cannot_do_is_told_in_one_sentence(needs_gmsh):
    with pytest.raises(InputError, match="meshing this failed in the mesher") as caught:
        run_job("water", {"loops": 0}, "meshing this")
    assert "Traceback" not in str(caught.value)


def test_missing_system_libraries_are_named_with_the_install_line(tmp_path, monkeypatch):
    # a stand-in for the library on a machine without OpenGL
    (tmp_path / "gmsh.py").write_text(
        "raise OSError('libGLU.so.1: cannot open shared object file: No such file or directory')\n"
    )
    monkeypatch.setenv("PYTHONPATH", str(tmp_path))
    with pytest.raises(MissingLibraryError, match=r"libGLU\.so\.1: cannot open") as caught:
        water_surface(BASIN, 4.0, structured=False)
    assert INSTALL_LINE in str(caught.value)


def test_geometry_is_imported_without_any_mesh_library():
    script = (
        "import sys, bemwave.geometry.bodies, bemwave.geometry.boundary, "
        "bemwave.geometry.inspection, bemwave.geometry.water_surface\n"
        "heavy = {'gmsh', 'pygmsh', 'meshio', 'pyvista', 'scipy'} & set(sys.modules)\n"
        "assert not heavy, heavy"
    )
    subprocess.run([sys.executable, "-c", script], check=True)
