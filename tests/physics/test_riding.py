"""Bodies that ride the surface in a run: with the water, and unseen by all that is solved."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import netCDF4
import numpy as np
import pytest
import pyvista

import bemwave
from bemwave.case import Case
from bemwave.errors import InputError
from bemwave.running import plan
from bemwave.running.survey import survey

BALL = {
    "name": "ball", "form": "sphere", "radius": 0.65, "centre_depth": 1.6, "panel_size": 0.4,
    "attitude": "forced", "forced": {"mode": "heave", "amplitude": 0.2, "period": 2.0},
}  # fmt: skip
BUOY = {
    "name": "buoy", "form": "cylinder", "radius": 0.3, "draught": 0.3, "position": [1.0, 0.6],
    "heading": 30.0, "attitude": "follow",
}  # fmt: skip


def case(route: str, bodies: list[dict[str, Any]], **tables: Any) -> Case:
    given: dict[str, Any] = {
        "water": {"depth": "deep"},
        "waves": [{"kind": "regular", "height": 0.1, "period": 2.0, "heading": 20.0}],
        "surface": {"size": [5.0, 4.0], "spacing": 0.4, "absorber": 4.0, "route": route},
        "body": bodies,
        "gauge": [{"name": "under", "position": BUOY["position"]}],
        "handoff": [{"name": "box", "box": {"size": [3.0, 2.0], "bottom": -0.5, "top": 0.2}}],
        "run": {"duration": 6.0, "ramp": 2.0, "record_every": 0.5},
    }
    given["handoff"][0] |= {"start": 5.0, "every": 0.25}
    return Case(**{**given, **tables})


@pytest.fixture(scope="module", params=["panels", "grid"])
def runs(request, tmp_path_factory: pytest.TempPathFactory) -> tuple[Path, Path]:
    """The same water without the buoy and with it."""
    folder = tmp_path_factory.mktemp(request.param)
    for name, bodies in (("without", [BALL]), ("with", [BUOY, BALL])):
        bemwave.run(case(request.param, bodies), folder / name)
    return folder / "without", folder / "with"


def values(path: Path, *names: str) -> dict[str, np.ndarray]:
    with netCDF4.Dataset(path) as file:
        return {name: np.ma.filled(file[name][:], np.nan) for name in names or file.variables}


@pytest.mark.parametrize("name", ["history.nc", "gauges.nc", "energy.nc", "handoff/box.nc"])
def test_nothing_else_knows_of_it(runs, name):
    without, beside = (values(folder / name) for folder in runs)
    assert without.keys() == beside.keys()
    for key, array in without.items():
        np.testing.assert_array_equal(beside[key], array, err_msg=key)


def test_records_of_other_bodies_are_the_same_to_the_bit(runs):
    without, beside = (values(folder / "bodies.nc") for folder in runs)
    assert list(without["body"]) == ["ball"]
    assert list(beside["body"]) == ["ball", "buoy"]
    for key in ("motion", "velocity", "force", "force_radiated", "force_scattered"):
        assert np.isfinite(without[key]).all()
        np.testing.assert_array_equal(beside[key][:, :1], without[key])


def test_it_follows_the_whole_water_under_it(runs):
    # the buoy is a tenth of the waves' length across: elevation at its middle, and differences of
    # it over its width, are its own to (k r)^2/8 and a little more for the slope, about 1 %
    run = bemwave.open_run(runs[1])
    kept = values(runs[1] / "bodies.nc", "motion", "velocity", "force")
    motion = kept["motion"][:, 1]
    assert np.isnan(kept["force"][:, 1]).all()
    assert np.isfinite(kept["velocity"]).all()
    under = values(runs[1] / "gauges.nc", "elevation", "incident_elevation", "time")
    level, incident = under["elevation"][:, 0], under["incident_elevation"][:, 0]
    largest = np.abs(level).max()
    assert motion[:, 2] == pytest.approx(level, abs=0.015 * largest)
    # more than the incident waves alone: the ball's are a good part
    assert np.abs(level - incident).max() > 0.2 * largest
    turn, reach = math.radians(BUOY["heading"]), 0.15
    ahead = np.array([math.cos(turn), math.sin(turn)])
    aside = np.array([-math.sin(turn), math.cos(turn)])
    records = np.searchsorted(under["time"], run.times)
    for mode, axis, sign in ((3, aside, 1.0), (4, ahead, -1.0)):
        places = np.array(BUOY["position"]) + np.outer([reach, -reach], axis)
        levels = run.elevation(places[:, 0], places[:, 1], run.times)
        slope = np.degrees(sign * (levels[:, 0] - levels[:, 1]) / (2.0 * reach))
        assert motion[records, mode] == pytest.approx(slope, abs=0.05 * np.abs(slope).max())


def test_in_frames_it_goes_with_the_water(tmp_path):
    frames = {"formats": ["ply"], "fps": 1, "start": 1.0, "end": 3.0}
    asked = case("panels", [BUOY], frames=frames, handoff=[])
    run = bemwave.run(asked, tmp_path / "run")  # the sea is all there is to solve
    motion = values(run.folder.bodies, "motion", "time")
    start = survey(asked).riders[0]
    for number in (1, 2, 3):
        drawn = pyvista.read(run.folder.frames / f"body_buoy_{number:05d}.ply").points
        gone = np.ptp(drawn, axis=0)
        assert gone[2] > 0.3
        row = int(np.argmin(np.abs(motion["time"] - number)))
        keel = drawn[drawn[:, 2] < drawn[:, 2].min() + 0.02].mean(axis=0)
        heave = motion["motion"][row, 0, 2]
        assert keel[2] == pytest.approx(heave - start.hydrostatics.draught, abs=0.01)


def test_the_plan_says_so_and_the_route_does_not_mind():
    # a buoy of .6 m on a grid of .4 m: as a solved body it would be refused there
    assert "rides the surface, makes no waves" in plan(case("grid", [BUOY, BALL]))
    with pytest.raises(InputError, match="waterplane of buoy"):
        plan(case("grid", [BUOY | {"attitude": "fixed"}, BALL]))


def test_what_lies_under_water_cannot_ride_it():
    with pytest.raises(InputError, match="wholly under water"):
        plan(case("panels", [{key: BALL[key] for key in list(BALL)[:5]} | {"attitude": "follow"}]))
