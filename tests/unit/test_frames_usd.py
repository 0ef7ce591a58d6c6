"""OpenUSD frames reopened with usd-core: the run's own values, valid, whole at every moment."""

import numpy as np
import pytest

from bemwave.case.output import Frames as Entry
from bemwave.frames import DrawnBody, FrameWriter, Guide, MovingSurface, grid_sheet
from bemwave.geometry import forms
from bemwave.geometry.pose import Pose, on_earth, trim_and_heel
from bemwave.waves import Sea

pxr = pytest.importorskip("pxr", reason='needs usd-core: pip install "bemwave[pictures]"')
from pxr import Usd, UsdGeom, UsdValidation  # noqa: E402  after the skip

SEA = Sea.of([1.1, 1.7], [0.3, -0.4], [0.5, 0.1], [0.2, 1.0], depth=20.0)
FPS, FIRST = 10.0, 101
KEYS = {
    "end": 0.9, "fps": FPS, "first_number": FIRST, "formats": ("usd",), "shading": True,
    "region": {"size": [24.0, 16.0]}, "spacing": 0.5,
}  # fmt: skip
BLOCK = forms.box(4.0, 2.0, 2.0, 1.0).flipped()
PLACE = on_earth((3.0, -2.0), 0.4)
GUIDES = [
    Guide("bow-1", [np.array([[5.0, 0.0, -1.0], [5.0, 0.0, 1.0]])]),
    Guide("bow_1", [np.array([[6.0, 0.0, -1.0], [6.0, 0.0, 1.0]])]),
]


def gone(time):
    return {"tender": Pose(trim_and_heel(0.05 * time, 0.3 * time), np.array([0.0, 0.0, time]))}


def writer(folder, keep=0):
    surface = MovingSurface(grid_sheet((2.0, 0.0), (24.0, 16.0), 0.5), SEA, None)
    bodies = [DrawnBody("tender", BLOCK, PLACE, moves=True), DrawnBody("2nd", BLOCK)]
    return FrameWriter(Entry(**KEYS), surface, bodies, folder, keep, GUIDES, "for pictures only")


@pytest.fixture(scope="module")
def state():
    from bemwave.running.solution import nothing_solved

    return nothing_solved


@pytest.fixture(scope="module")
def folder(tmp_path_factory, state):
    folder = tmp_path_factory.mktemp("frames")
    frames = writer(folder)
    for time in frames.times:
        frames.write(state(time), gone(time))
    return folder


@pytest.fixture(scope="module")
def stage(folder):
    return Usd.Stage.Open(str(folder / "surface.usdc"))


def mesh_of(stage, path="/sea/water"):
    return UsdGeom.Mesh(stage.GetPrimAtPath(path))


def test_it_is_one_file_in_metres_with_z_up_and_the_case_s_frames(stage, folder):
    assert [path.name for path in folder.iterdir()] == ["surface.usdc"]
    assert UsdGeom.GetStageUpAxis(stage) == "Z"
    assert UsdGeom.GetStageMetersPerUnit(stage) == 1.0
    assert stage.GetDefaultPrim().GetPath() == "/sea"
    assert (stage.GetStartTimeCode(), stage.GetEndTimeCode()) == (101.0, 110.0)
    assert stage.GetTimeCodesPerSecond() == stage.GetFramesPerSecond() == FPS
    assert stage.GetRootLayer().documentation == "for pictures only"
    files = [layer for layer in stage.GetUsedLayers() if not layer.anonymous]
    assert files == [stage.GetRootLayer()]  # nothing beside it
    paths = [str(prim.GetPath()) for prim in stage.Traverse(Usd.PrimAllPrimsPredicate)]
    assert paths == [
        "/sea", "/sea/water", "/sea/bodies", "/sea/bodies/tender", "/sea/bodies/_2nd",
        "/sea/guides", "/sea/guides/bow_1", "/sea/guides/bow_1_2",
    ]  # fmt: skip
    assert stage.GetPrimAtPath("/sea/bodies/_2nd").GetDisplayName() == "2nd"


def test_the_water_is_the_sea_s_in_single_precision(stage):
    water = mesh_of(stage)
    assert len(water.GetPointsAttr().GetTimeSamples()) == 10
    for k in (0, 4, 9):
        code, time = float(FIRST + k), k / FPS
        points = np.asarray(water.GetPointsAttr().Get(code))
        x, y = points[:, :2].astype(float).T
        want = SEA.elevation(x, y, time).astype(np.float32)
        np.testing.assert_allclose(points[:, 2], want, atol=1e-7)
        low, high = np.asarray(water.GetExtentAttr().Get(code))
        np.testing.assert_array_equal(low, points.min(axis=0))
        np.testing.assert_array_equal(high, points.max(axis=0))
        normals = np.asarray(water.GetNormalsAttr().Get(code), dtype=float)
        np.testing.assert_allclose(np.linalg.norm(normals, axis=1), 1.0, atol=1e-6)
        slope = -np.stack([SEA.elevation(x + d, y + e, time) - SEA.elevation(x - d, y - e, time)
                           for d, e in ((1e-4, 0), (0, 1e-4))]) / 2e-4  # fmt: skip
        inner = (np.abs(x - 2) < 11.4) & (np.abs(y) < 7.4)
        got = (normals[:, :2] / normals[:, 2:]).T
        assert np.abs(got - slope)[:, inner].max() < 0.01 * np.abs(slope).max()
        steep = np.asarray(UsdGeom.PrimvarsAPI(water).GetPrimvar("steepness").Get(code))
        np.testing.assert_allclose(steep, np.hypot(*got), atol=1e-5)
    for name in ("st", "inside", "steepness", "downward_acceleration"):
        primvar = UsdGeom.PrimvarsAPI(water).GetPrimvar(name)
        assert primvar.GetInterpolation() == "vertex"
        assert len(primvar.Get(105.0)) == len(points)
    st = np.asarray(UsdGeom.PrimvarsAPI(water).GetPrimvar("st").Get())
    np.testing.assert_allclose(st, np.stack([(x + 10) / 24, (y + 8) / 16], 1), atol=1e-6)
    acceleration = SEA.at(np.stack([x, y, 0 * x], 1)).acceleration(0.9)[:, 2]
    got = UsdGeom.PrimvarsAPI(water).GetPrimvar("downward_acceleration").Get(110.0)
    np.testing.assert_allclose(np.asarray(got), -acceleration, atol=1e-6)


def test_velocities_are_the_differences_of_points(stage):
    water = mesh_of(stage)
    before, after = (np.asarray(water.GetPointsAttr().Get(c), dtype=float) for c in (104.0, 106.0))
    got = np.asarray(water.GetVelocitiesAttr().Get(105.0), dtype=float)
    want = (after - before) * FPS / 2.0
    assert np.abs(got - want).max() < 0.02 * np.abs(want).max()


def test_triangles_fit_together_and_face_up(stage):
    for path in ("/sea/water", "/sea/bodies/tender"):
        mesh = mesh_of(stage, path)
        points = mesh.GetPointsAttr().Get(101.0)
        corners = mesh.GetFaceVertexIndicesAttr().Get()
        counts = mesh.GetFaceVertexCountsAttr().Get()
        assert UsdGeom.Mesh.ValidateTopology(corners, counts, len(points))[0]
        assert mesh.GetSubdivisionSchemeAttr().Get() == "none"
        assert set(np.asarray(counts)) == {3}
    at = np.asarray(mesh_of(stage).GetPointsAttr().Get(101.0))
    corners = np.asarray(mesh_of(stage).GetFaceVertexIndicesAttr().Get()).reshape(-1, 3)
    a, b, c = (at[corners[:, k]] for k in range(3))
    assert (np.cross(b - a, c - a)[:, 2] > 0.0).all()


def test_bodies_are_rigid_and_stand_where_their_motions_take_them(stage):
    body = mesh_of(stage, "/sea/bodies/tender")
    assert not body.GetPointsAttr().ValueMightBeTimeVarying()
    points = np.asarray(body.GetPointsAttr().Get(), dtype=float)
    for k in (0, 7):
        matrix = UsdGeom.Xformable(body).ComputeLocalToWorldTransform(float(FIRST + k))
        moved = np.column_stack([points, np.ones(len(points))]) @ np.array(matrix)
        want = gone(k / FPS)["tender"](PLACE(BLOCK.points))
        np.testing.assert_allclose(moved[:, :3], want, atol=1e-6)
    # a box has edges: each corner of a triangle has that triangle's own normal
    normals = np.asarray(body.GetNormalsAttr().Get())
    np.testing.assert_allclose(normals, np.repeat(BLOCK.normals, 3, axis=0), atol=1e-6)
    assert body.GetNormalsInterpolation() == "faceVarying"
    for name in ("bow_1", "bow_1_2"):
        guide = UsdGeom.Imageable(stage.GetPrimAtPath(f"/sea/guides/{name}"))
        assert guide.ComputePurpose() == "guide"


def test_no_validator_finds_an_error(stage):
    registry = UsdValidation.ValidationRegistry()
    validators = registry.GetOrLoadAllValidators()
    assert len(validators) > 10
    found = UsdValidation.ValidationContext(validators).Validate(stage)
    assert [error.GetMessage() for error in found] == []


def test_it_opens_after_every_frame_and_goes_on_to_the_same_file(tmp_path, folder, state):
    whole = Usd.Stage.Open(str(folder / "surface.usdc"))
    frames = writer(tmp_path)
    for k in range(6):
        frames.write(state(frames.times[k]), gone(frames.times[k]))
        so_far = Usd.Stage.Open(str(tmp_path / "surface.usdc"))
        assert so_far.GetEndTimeCode() == FIRST + k
        for code in (101.0, float(FIRST + k)):
            same_samples(so_far, whole, code)
        del so_far
    (tmp_path / "surface.parts" / "part.107.usdc").write_bytes(b"PXR-USDC cut off by a kill")
    again = writer(tmp_path, keep=4)
    for time in again.times[4:]:
        again.write(state(time), gone(time))
    assert [path.name for path in tmp_path.iterdir()] == ["surface.usdc"]
    resumed = Usd.Stage.Open(str(tmp_path / "surface.usdc"))
    for code in mesh_of(whole).GetPointsAttr().GetTimeSamples():
        same_samples(resumed, whole, code)
    # a run taken up before its frames were all written finds them there
    once_more = writer(tmp_path, keep=4)
    once_more.write(state(once_more.times[4]), gone(once_more.times[4]))
    assert [path.name for path in tmp_path.iterdir()] == ["surface.usdc"]


def same_samples(one, other, code):
    for prim in one.Traverse(Usd.PrimAllPrimsPredicate):
        for attribute in prim.GetAttributes():
            mine = attribute.Get(code)
            yours = other.GetAttributeAtPath(attribute.GetPath()).Get(code)
            assert mine == yours, f"{attribute.GetPath()} at {code}"


def test_a_file_whose_corners_run_out_of_points_would_be_noticed(stage):
    points = mesh_of(stage).GetPointsAttr().Get(101.0)
    assert not UsdGeom.Mesh.ValidateTopology([0, 1, len(points)], [3], len(points))[0]
