"""surface.usdc of runs on both routes, reopened with usd-core: it is the run, and it is valid."""

from __future__ import annotations

from collections.abc import Callable
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy.spatial import KDTree

import bemwave
from bemwave.bodies.modes import displacement
from bemwave.case import Case
from bemwave.frames.bodies import drawn_mesh
from bemwave.handoff.netcdf import reading
from bemwave.records.series import in_radians

pxr = pytest.importorskip("pxr", reason='needs usd-core: pip install "bemwave[pictures]"')
from pxr import Usd, UsdGeom, UsdValidation  # noqa: E402  after the skip

pytestmark = [pytest.mark.slow, pytest.mark.usefixtures("needs_gmsh")]

FPS = 24.0
START, END = 3.0, 3.5
REGION = {"centre": [1.0, 0.0], "size": [16.0, 13.0]}
PILE = {"name": "pile", "form": "cylinder", "radius": 2.0, "draught": 4.0, "position": [-3.0, 0.5]}
BALL = {
    "name": "ball", "form": "sphere", "radius": 1.5, "position": [5.0, -1.0],
    "attitude": "forced", "forced": {"mode": "heave", "amplitude": 0.15, "period": 2.5},
}  # fmt: skip
BUOY = {
    "name": "buoy", "form": "cylinder", "radius": 0.5, "draught": 0.4, "position": [1.0, 5.0],
    "attitude": "follow",
}  # fmt: skip


def made(folder: Path, route: str, **frames: Any) -> tuple[bemwave.Run, Usd.Stage]:
    """A run whose frames are on its records, and its file."""
    case = Case(
        water={"depth": 20.0},
        waves=[{"kind": "jonswap", "height": 0.4, "period": 3.2, "spreading": 8.0,
                "components": 60, "band": [0.8, 1.2]}],
        surface={"size": [19.0, 15.0], "spacing": 0.9, "absorber": 8.0, "route": route},
        body=[BUOY, PILE | {"panel_size": 0.8}, BALL | {"panel_size": 0.7}],
        frames={"formats": ["usd"], "fps": FPS, "start": START, "end": END, "region": REGION,
                "shading": True, **frames},
        run={"duration": END, "record_every": 1.0 / FPS, "ramp": 1.5},
    )  # fmt: skip
    run = bemwave.run(case, folder / "run")
    return run, Usd.Stage.Open(str(run.folder.frames / "surface.usdc"))


SHAPED = {"spacing": 0.4, "horizontal_displacement": True}  # with detail, which is finer


@pytest.fixture(scope="module")
def kept(tmp_path_factory: pytest.TempPathFactory) -> Callable[[str], Any]:
    """Runs by name, each made once."""

    @cache
    def one(name: str) -> Any:
        route, *shaped = name.split()
        return made(tmp_path_factory.mktemp(route), route, **(SHAPED if shaped else {}))

    return one


@pytest.fixture(params=["panels", "grid"])
def plain(request: pytest.FixtureRequest, kept: Callable[[str], Any]) -> Any:
    """What was solved, drawn on squares as large as the solver's: nothing added."""
    return kept(request.param)


@pytest.fixture(params=["panels", "grid", "grid shaped"])
def stage(request: pytest.FixtureRequest, kept: Callable[[str], Any]) -> Usd.Stage:
    return kept(request.param)[1]


def water_of(stage: Usd.Stage) -> UsdGeom.Mesh:
    return UsdGeom.Mesh(stage.GetPrimAtPath("/sea/water"))


def codes(stage: Usd.Stage) -> np.ndarray:
    return np.arange(stage.GetStartTimeCode(), stage.GetEndTimeCode() + 1)


def array(attribute: Usd.Attribute, code: float) -> np.ndarray:
    return np.asarray(attribute.Get(code), dtype=np.float64)


def test_its_points_are_the_run_s_to_single_precision(plain: Any) -> None:
    run, stage = plain
    water = water_of(stage)
    assert UsdGeom.GetStageUpAxis(stage) == "Z"
    assert UsdGeom.GetStageMetersPerUnit(stage) == 1.0
    assert len(codes(stage)) == 13
    inside = np.asarray(UsdGeom.PrimvarsAPI(water).GetPrimvar("inside").Get()) > 0
    assert inside.any()
    largest = 0.0
    for code in codes(stage)[::4]:
        points = array(water.GetPointsAttr(), code)
        time = START + (code - 1) / FPS
        want = run.elevation(*points[~inside, :2].T, float(time))
        largest = max(largest, float(np.nanmax(np.abs(want))))
        assert np.isfinite(want).mean() > 0.99  # the hulls' panels are a little within their lines
        # history.nc is single precision as the file is
        assert np.nanmax(np.abs(points[~inside, 2] - want)) < 3e-6
    assert largest > 0.2
    scattered = run.elevation(*points[~inside, :2].T, END) - run.sea.elevation(
        *points[~inside, :2].T, END
    )
    assert np.nanmax(np.abs(scattered)) > 0.05  # it is no sea alone


def test_normals_extent_and_triangles_are_those_of_its_points(stage: Usd.Stage) -> None:
    water = water_of(stage)
    indices = water.GetFaceVertexIndicesAttr().Get()
    corners = np.asarray(indices).reshape(-1, 3)
    for code in codes(stage)[[0, -1]]:
        points = array(water.GetPointsAttr(), code)
        counts = water.GetFaceVertexCountsAttr().Get()
        assert UsdGeom.Mesh.ValidateTopology(indices, counts, len(points))[0]
        a, b, c = (points[corners[:, k]] for k in range(3))
        area = np.cross(b - a, c - a)
        assert (area[:, 2] > 0.0).all()
        want = np.zeros_like(points)
        for k in range(3):
            np.add.at(want, corners[:, k], area)
        want /= np.linalg.norm(want, axis=1, keepdims=True)
        np.testing.assert_allclose(array(water.GetNormalsAttr(), code), want, atol=1e-5)
        low, high = array(water.GetExtentAttr(), code)
        np.testing.assert_array_equal(low, points.min(axis=0))
        np.testing.assert_array_equal(high, points.max(axis=0))


def test_velocities_are_the_differences_of_points_between_frames(stage: Usd.Stage) -> None:
    water = water_of(stage)
    points, speeds = [
        np.array([array(attribute, code) for code in codes(stage)])
        for attribute in (water.GetPointsAttr(), water.GetVelocitiesAttr())
    ]
    want = (points[2:] - points[:-2]) * FPS / 2.0
    error = np.sqrt(np.mean((speeds[1:-1] - want) ** 2)) / np.sqrt(np.mean(want**2))
    print(f"velocities: {error:.2e}")
    assert error < 0.02


def test_no_validator_finds_an_error(stage: Usd.Stage) -> None:
    validators = UsdValidation.ValidationRegistry().GetOrLoadAllValidators()
    assert len(validators) > 10
    found = UsdValidation.ValidationContext(validators).Validate(stage)
    assert [error.GetMessage() for error in found] == []


def test_hulls_stand_where_bodies_nc_has_them(plain: Any) -> None:
    run, stage = plain
    with reading(run.folder.bodies) as file:
        names = [str(name) for name in file["body"][:]]
        motion = in_radians(np.asarray(file["motion"][-1], dtype=np.float64))
    assert names == ["pile", "ball", "buoy"]
    for hull in run.hulls + run.riders:
        prim = UsdGeom.Mesh(stage.GetPrimAtPath(f"/sea/bodies/{hull.name}"))
        points = array(prim.GetPointsAttr(), 1.0)
        drawn = drawn_mesh(hull).points  # mesh.vtp has the same points in another order
        assert len(points) == len(drawn)
        assert KDTree(drawn).query(points)[0].max() < 1e-6
        matrix = np.array(UsdGeom.Xformable(prim).ComputeLocalToWorldTransform(13.0))
        got = np.column_stack([points, np.ones(len(points))]) @ matrix
        want = displacement(hull, motion[names.index(hull.name)])(hull.place(points))
        np.testing.assert_allclose(got[:, :3], want, atol=1e-5)
        assert np.abs(want - hull.place(points)).max() > 0.02 or hull.name == "pile"
