import math

import meshio
import numpy as np
import pytest
import pyvista

from bemwave.case import Case
from bemwave.case.output import Frames as Entry
from bemwave.errors import InputError
from bemwave.frames import (
    DrawnBody,
    FrameWriter,
    MovingSurface,
    cut_sheet,
    frame_times,
    grid_sheet,
    sheet_of,
)
from bemwave.geometry import forms
from bemwave.geometry.hull import place_hull
from bemwave.geometry.outline import Rectangle
from bemwave.geometry.patterns import grid_triangles
from bemwave.geometry.pose import Pose
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.geometry.topology import boundary_loops
from bemwave.geometry.water_surface import water_surface
from bemwave.running import run
from bemwave.waves import Sea

INCIDENT = Sea.of([1.1], [0.3], [0.5], [0.2], depth=20.0)
SOLVED = Sea.of([1.3], [-1.0], [0.2], [0.7], depth=20.0)
BOTH = INCIDENT + SOLVED
REGION = {"centre": [3.0, -2.0], "size": [12.0, 8.0]}
PLANE = SurfaceMesh.of_one_part(
    [[x, y, 0.0] for y in (0.0, 2.0, 4.0) for x in (0.0, 2.0, 4.0)], grid_triangles(2, 2), "water"
)


def entry(**keys):
    keys = {"formats": ("ply", "vtk"), "waterline": "skirt"} | keys
    return Entry(end=0.5, spacing=0.5, fps=4.0, region=REGION, **keys)


def write(folder, entry, flow, state_at, bodies=(), hulls=(), places=None, keep=0):
    surface = MovingSurface(sheet_of(entry, PLANE, hulls, None), INCIDENT, flow)
    writer = FrameWriter(entry, surface, bodies, folder, keep)
    for time in writer.times[writer.count :]:
        writer.write(state_at(time), places(time) if places else None)
    return writer


def test_frames_reopen_with_the_surface_where_the_closed_form_has_it(tmp_path, flow_of, state_at):
    writer = write(tmp_path, entry(first_number=7), flow_of(SOLVED), state_at)
    assert writer.times.tolist() == [0.0, 0.25, 0.5]
    files = sorted(path.name for path in tmp_path.iterdir())
    assert files == sorted(
        [f"surface_{n:05d}.{e}" for n in (7, 8, 9) for e in ("ply", "vtp")] + ["surface.pvd"]
    )
    for number, time in zip((7, 8, 9), writer.times, strict=True):
        vtp = pyvista.read(tmp_path / f"surface_{number:05d}.vtp")
        ply = meshio.read(tmp_path / f"surface_{number:05d}.ply")
        seen = pyvista.read(tmp_path / f"surface_{number:05d}.ply")
        x, y, z = np.asarray(vtp.points, dtype=float).T
        np.testing.assert_allclose(z, BOTH.elevation(x, y, time), atol=2e-7)
        np.testing.assert_array_equal(vtp.points, ply.points.astype(np.float32))
        np.testing.assert_array_equal(vtp.points, seen.points)
        np.testing.assert_array_equal(vtp.regular_faces, ply.cells_dict["triangle"])
        np.testing.assert_array_equal(vtp["elevation"], ply.point_data["elevation"])
        still = np.column_stack([x, y, 0 * x])
        water = BOTH.velocity(still, time)
        for name, want in (("water_velocity", water), ("velocity", water * [0, 0, 1])):
            velocity = np.column_stack([ply.point_data[f"{name}_{n}"] for n in "xyz"])
            np.testing.assert_array_equal(vtp[name], velocity)
            np.testing.assert_allclose(velocity, want, atol=1e-6)
        assert not vtp["inside"].any()
        assert (vtp.bounds[0], vtp.bounds[1], vtp.bounds[2], vtp.bounds[3]) == (-3, 9, -6, 2)


def test_normals_are_those_of_the_wave(tmp_path, flow_of, state_at):
    write(tmp_path, entry(), flow_of(SOLVED), state_at)
    vtp = pyvista.read(tmp_path / "surface_00001.vtp")
    x, y, _ = np.asarray(vtp.points, dtype=float).T
    normals = np.asarray(vtp["Normals"], dtype=float)
    inner = (np.abs(x - 3) < 5.9) & (np.abs(y + 2) < 3.9)
    # n = (-d(eta)/dx, -d(eta)/dy, 1) normalised; slopes by small differences of the closed form
    d = 1e-4
    slope_x = (BOTH.elevation(x + d, y, 0.0) - BOTH.elevation(x - d, y, 0.0)) / (2 * d)
    slope_y = (BOTH.elevation(x, y + d, 0.0) - BOTH.elevation(x, y - d, 0.0)) / (2 * d)
    want = np.column_stack([-slope_x, -slope_y, np.ones(len(x))])
    want /= np.linalg.norm(want, axis=1, keepdims=True)
    np.testing.assert_allclose(np.linalg.norm(normals, axis=1), 1.0, atol=1e-6)
    assert np.abs(normals - want)[inner].max() < 0.002
    assert np.abs(want[:, :2]).max() > 0.05  # the surface is not flat


def test_the_pvd_gives_each_file_its_time(tmp_path, flow_of, state_at):
    write(tmp_path, entry(start=0.25), flow_of(SOLVED), state_at)
    reader = pyvista.get_reader(tmp_path / "surface.pvd")
    assert reader.time_values == [0.25, 0.5]
    assert [d.path for d in reader.datasets] == ["surface_00001.vtp", "surface_00002.vtp"]


def test_frames_go_on_after_an_interruption(tmp_path, flow_of, state_at):
    write(tmp_path, entry(), flow_of(SOLVED), state_at)
    before = {path.name: path.read_bytes() for path in tmp_path.iterdir()}
    for path in tmp_path.glob("surface_00003.*"):
        path.unlink()
    write(tmp_path, entry(), flow_of(SOLVED), state_at, keep=2)
    assert {path.name: path.read_bytes() for path in tmp_path.iterdir()} == before


def hull(radius=2.0):
    return place_hull("buoy", forms.cylinder(radius, 3.0, 0.4), position=(3.0, -2.0))


def test_the_surface_goes_on_under_a_hull_as_a_skirt():
    spacing, cells = 0.25, 3
    sheet = grid_sheet((3.0, -2.0), (12.0, 8.0), spacing, [hull()])
    radius = np.linalg.norm(sheet.mesh.points[:, :2] - [3.0, -2.0], axis=1)
    clear = np.abs(radius - 2.0) > 0.05  # the waterline is a polygon
    np.testing.assert_array_equal(sheet.under_hull[clear], (radius < 2.0)[clear])
    assert 2.0 - (cells + 1.5) * spacing < radius.min() < 2.0 - (cells - 0.5) * spacing
    # no hole between the sheet and the waterline: it reaches inside all round
    inside = sheet.mesh.points[sheet.under_hull, :2] - [3.0, -2.0]
    angles = np.sort(np.arctan2(inside[:, 1], inside[:, 0]))
    assert np.diff(angles).max() < 0.3
    under = np.linalg.norm(sheet.solved_at[sheet.under_hull] - [3.0, -2.0], axis=1)
    assert under == pytest.approx(2.0, abs=0.05)


def test_outside_the_solved_water_there_is_the_sea_alone(flow_of, state_at):
    sheet = grid_sheet((0.0, 0.0), (8.0, 4.0), 1.0, solved_in=lambda plan: plan[:, 0] < 1)
    frame = MovingSurface(sheet, INCIDENT, flow_of(SOLVED)).at(state_at(0.4))
    x, y = sheet.mesh.points[:, 0], sheet.mesh.points[:, 1]
    want = np.where(x < 1, BOTH.elevation(x, y, 0.4), INCIDENT.elevation(x, y, 0.4))
    # The sea is no longer summed wave by wave, to rounding, but by a non-uniform FFT asked for an
    # accuracy of 1e-9 of the strengths that go into it (frames.wave_sum.ACCURACY). Here these are
    # .5 m of elevation and, in the same transform's imaginary part, .53 m/s of velocity: 1.1e-9.
    # Measured: 2.6e-10, and a thousandth of it when 1e-12 is asked for.
    np.testing.assert_allclose(frame.elevation, want, atol=1.1e-9)


def test_without_a_region_the_solver_s_panels_are_drawn(tmp_path, flow_of, state_at):
    plain = Entry(end=0.0, formats=("ply",))
    write(tmp_path, plain, flow_of(SOLVED), state_at)
    got = meshio.read(tmp_path / "surface_00001.ply")
    np.testing.assert_array_equal(got.cells_dict["triangle"], PLANE.triangles)
    np.testing.assert_allclose(got.points[:, :2], PLANE.points[:, :2])


@pytest.mark.usefixtures("needs_gmsh")
def test_without_a_region_the_panels_go_on_under_a_hull_as_a_skirt_too():
    pontoon = place_hull("pontoon", forms.box(10.0, 8.0, 2.0, 0.5), position=(3.0, -2.0))
    water = water_surface(Rectangle(-12.0, 18.0, -14.0, 10.0), 1.5, [pontoon], 0.5)
    cut = sheet_of(Entry(waterline="cut"), water, [pontoon], None)
    np.testing.assert_array_equal(cut.mesh.triangles, water.triangles)
    sheet = sheet_of(Entry(), water, [pontoon], None)
    count = len(water.points)  # the panels' points come first and stay
    np.testing.assert_array_equal(sheet.mesh.points[:count], water.points)
    assert sheet.under_hull.tolist() == [k >= count for k in range(len(sheet.mesh.points))]
    assert (sheet.mesh.area_vectors[:, 2] > 0.0).all()
    # one hole is left, within the waterplane: nothing gapes at the waterline
    loops = [sheet.mesh.points[loop, :2] for loop in boundary_loops(sheet.mesh.triangles)]
    inner = min(loops, key=lambda loop: np.ptp(loop, axis=0).max())
    assert len(loops) == 2
    half = np.abs(inner - [3.0, -2.0]).max(axis=0)
    assert (half < np.array([5.0, 4.0]) - 2 * 0.5).all()
    assert (half > np.array([5.0, 4.0]) - 5 * 0.5).all()
    for place, at in zip(sheet.mesh.points[count:, :2], sheet.solved_at[count:], strict=True):
        off = np.array([5.0, 4.0]) - np.abs(place - [3.0, -2.0])  # from the sides
        assert np.linalg.norm(at - place) == pytest.approx(off.min())


def test_a_waterline_that_cannot_be_drawn_is_refused_before_anything_is_written(tmp_path):
    case = Case(
        water={"depth": 20.0},
        surface={"size": [24.0, 20.0], "spacing": 2.0},
        body=[{"name": "buoy", "form": "cylinder", "radius": 2.0, "draught": 2.0}],
        frames={"waterline": "cut", "region": {"size": [20.0, 3.0]}},
        run={"duration": 4.0},
    )
    with pytest.raises(InputError, match='cuts through the waterline of "buoy"'):
        run(case, tmp_path / "out")
    assert not list(tmp_path.iterdir())


def test_a_moving_body_has_a_file_for_each_frame_and_a_fixed_one_has_one(
    tmp_path, flow_of, state_at
):
    block = forms.box(2.0, 1.0, 1.0, 0.5).flipped()
    bodies = [DrawnBody("mark", block), DrawnBody("float", block, moves=True)]

    def places(time):
        return {"float": Pose(np.eye(3), np.array([0.0, 0.0, time]))}

    write(tmp_path, entry(), flow_of(SOLVED), state_at, bodies, places=places)
    assert not list(tmp_path.glob("body_mark_*"))
    fixed = meshio.read(tmp_path / "body_mark.ply")
    np.testing.assert_allclose(fixed.points, block.points, atol=1e-7)
    for number, time in ((1, 0.0), (3, 0.5)):
        moved = meshio.read(tmp_path / f"body_float_{number:05d}.ply")
        np.testing.assert_allclose(moved.points, block.points + np.array([0, 0, time]), atol=1e-7)
        normals = np.column_stack([moved.point_data[n] for n in ("nx", "ny", "nz")])
        lowest = np.argmin(moved.points[:, 2])
        assert normals[lowest, 2] < 0.0  # out of the body
    times = pyvista.get_reader(tmp_path / "body_float.pvd").time_values
    assert times == [0.0, 0.25, 0.5]


@pytest.mark.usefixtures("needs_gmsh")
def test_the_cut_surface_shares_the_waterline_s_points():
    buoy = hull()
    sheet = cut_sheet((3.0, -2.0), (12.0, 8.0), 0.5, [buoy])
    points = {tuple(p) for p in sheet.mesh.points[:, :2].tolist()}
    assert points >= {tuple(p) for p in buoy.polygons()[0].tolist()}
    radius = np.linalg.norm(sheet.mesh.points[:, :2] - [3.0, -2.0], axis=1)
    assert radius.min() > 1.95
    assert not sheet.under_hull.any()
    with pytest.raises(InputError, match='cuts through the waterline of "buoy"'):
        cut_sheet((3.0, -2.0), (12.0, 3.0), 0.5, [buoy])
    assert len(cut_sheet((30.0, -2.0), (6.0, 3.0), 0.5, [buoy]).mesh.points) == 13 * 7


def test_the_last_frame_is_the_last_that_fits():
    assert frame_times(Entry(end=1.0, fps=24.0))[-1] == 1.0
    assert frame_times(Entry(start=1.0, end=2.1, fps=3.0)).tolist() == [
        1.0 + n / 3 for n in range(4)
    ]
    assert math.isclose(frame_times(Entry(end=0.0))[-1], 0.0)
