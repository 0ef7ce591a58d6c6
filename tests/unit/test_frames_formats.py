"""OBJ, GLB and displacement maps reopened by general-purpose readers."""

import json
import struct

import meshio
import numpy as np
import pytest
import pyvista

from bemwave.case import Case
from bemwave.case.output import Frames as Entry
from bemwave.errors import InputError, MissingLibraryError
from bemwave.frames import Crests, DrawnBody, FrameWriter, MovingSurface, drawn_mesh, grid_sheet
from bemwave.geometry import forms
from bemwave.geometry.hull import place_hull
from bemwave.geometry.pose import Pose, on_earth
from bemwave.geometry.topology import boundary_edges
from bemwave.running.solution import nothing_solved
from bemwave.waves import Sea

SEA = Sea.of([1.1, 1.7], [0.3, -0.4], [0.5, 0.1], [0.2, 1.0], depth=20.0)
BLOCK = forms.box(4.0, 2.0, 2.0, 1.0).flipped()
RAISED = Pose(np.eye(3), np.array([0.0, 0.0, 0.5]))


def write(folder, formats, displaced=False, **keys):
    sheet = grid_sheet((2.0, 1.0), (24.0, 16.0), 0.5)
    surface = MovingSurface(sheet, SEA, None, crests=Crests(sheet, (), 1.0) if displaced else None)
    entry = Entry(end=0.5, fps=4.0, formats=formats, region={"size": [24.0, 16.0]}, **keys)
    body = DrawnBody("tender", BLOCK, on_earth((3.0, -2.0), 0.4), moves=True)
    frames = FrameWriter(entry, surface, [body], folder, note="a note")
    for time in frames.times:
        frames.write(nothing_solved(time), {"tender": RAISED})
    return surface


def test_obj_has_the_points_normals_and_triangles_of_every_frame(tmp_path):
    surface = write(tmp_path, ("obj",))
    for number, time in ((1, 0.0), (3, 0.5)):
        frame = surface.at(nothing_solved(time))
        got = meshio.read(tmp_path / f"surface_{number:05d}.obj")
        np.testing.assert_allclose(got.points, frame.mesh.points, atol=5.1e-7)
        np.testing.assert_array_equal(got.cells_dict["triangle"], frame.mesh.triangles)
        seen = pyvista.read(tmp_path / f"surface_{number:05d}.obj")
        np.testing.assert_allclose(np.asarray(seen["Normals"]), frame.normals, atol=1e-6)
        body = meshio.read(tmp_path / f"body_tender_{number:05d}.obj")
        assert body.points[:, 2].max() == pytest.approx(0.5)


def test_glb_is_one_preview_of_the_latest_frame_with_y_up(tmp_path):
    surface = write(tmp_path, ("glb",))
    assert [path.name for path in tmp_path.iterdir()] == ["preview.glb"]
    raw = (tmp_path / "preview.glb").read_bytes()
    magic, version, length = struct.unpack_from("<4sII", raw)
    assert (magic, version, length) == (b"glTF", 2, len(raw))
    size = struct.unpack_from("<I", raw, 12)[0]
    document = json.loads(raw[20 : 20 + size])
    assert document["asset"]["extras"] == {"note": "a note"}
    blocks = pyvista.read(tmp_path / "preview.glb").combine(merge_points=False)
    frame = surface.at(nothing_solved(0.5))
    water = np.asarray(blocks.points)[: len(frame.mesh.points)]
    # the reader applies the turn: x stays, up is y, and y points away from the viewer
    x, y, z = frame.mesh.points.T
    np.testing.assert_allclose(water, np.column_stack([x, z, -y]), atol=1e-5)
    assert blocks.n_cells == len(frame.mesh.triangles) + len(BLOCK.triangles)


def test_maps_hold_how_far_every_vertex_has_moved(tmp_path):
    OpenEXR = pytest.importorskip("OpenEXR")
    surface = write(tmp_path, ("ply",), displaced=True, displacement_maps=True)
    frame = surface.at(nothing_solved(0.25))
    with OpenEXR.File(str(tmp_path / "displacement_00002.exr")) as file:
        image = file.channels()["RGB"].pixels
        assert "a note" in file.header()["comments"]
    assert image.shape == (33, 49, 3)
    assert image.dtype == np.float32
    moved = (frame.mesh.points - surface.sheet.mesh.points).reshape(33, 49, 3)
    np.testing.assert_array_equal(image, moved[::-1].astype(np.float32))
    assert np.abs(image[..., 0]).max() > 0.1


def test_maps_need_squares():
    least = {
        "water": {"depth": 10.0},
        "surface": {"size": [40.0, 30.0], "spacing": 2.0},
        "run": {"duration": 20.0},
    }
    with pytest.raises(InputError, match="displacement_maps: got true with no region"):
        Case(frames={"displacement_maps": True}, **least)
    region = {"region": {"size": [10.0, 10.0]}}
    with pytest.raises(InputError, match='waterline = "cut", expected a region of squares'):
        Case(frames={"displacement_maps": True, "waterline": "cut"} | region, **least)
    frames = Case(frames={"displacement_maps": True} | region, **least).frames
    assert frames.waterline == "skirt"  # what a region has where nothing is said


@pytest.mark.parametrize(
    ("package", "keys"),
    [("pxr", {"formats": ("usd",)}), ("OpenEXR", {"displacement_maps": True})],
)
def test_a_package_that_is_not_there_is_named_with_the_line_that_installs_it(
    package, keys, tmp_path, monkeypatch
):
    monkeypatch.setitem(__import__("sys").modules, package, None)
    with pytest.raises(MissingLibraryError, match=r'pip install "bemwave\[pictures\]"'):
        write(tmp_path, **({"formats": ("ply",)} | keys))
    assert not list(tmp_path.iterdir())


def test_a_form_is_drawn_with_sides_and_a_deck_and_is_closed():
    hull = place_hull("buoy", forms.cylinder(2.0, 4.0, 0.5), position=(7.0, 1.0), heading=0.3)
    mesh = drawn_mesh(hull)
    assert mesh.points[:, 2].max() == 2.0
    assert mesh.points[:, 2].min() == -4.0
    assert np.hypot(*mesh.points[:, :2].T).max() == pytest.approx(2.0, abs=0.03)  # own axes
    volume = np.sum(mesh.centroids * mesh.area_vectors) / 3.0
    wetted = hull.hydrostatics
    assert volume == pytest.approx(wetted.volume + 2.0 * wetted.waterplane_area, rel=1e-6)
    assert len(boundary_edges(mesh.triangles)) == 2 * len(hull.waterlines[0])  # not merged there
