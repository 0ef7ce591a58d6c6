"""A body that rides the surface goes with the nearest plane of the waves under it."""

from __future__ import annotations

import math

import numpy as np
import pytest

from bemwave.case import Case
from bemwave.geometry.forms import box
from bemwave.geometry.hull import place_hull
from bemwave.running import run
from bemwave.running.riding import Rider
from bemwave.waves import make_sea
from tests.restart.cases import arrays_of

LENGTH, BEAM = 4.0, 2.0
WATER = {"depth": 30.0, "density": 1025.0, "gravity": 9.80665}


def barge(position=(3.0, -2.0), heading=0.5, height=0.0):
    mesh = box(LENGTH, BEAM, 0.5, 1.0)
    return place_hull(
        "barge", mesh, position=position, heading=heading, centre_of_mass=[0.3, 0.1, height]
    )


@pytest.mark.parametrize(("period", "near"), [(8.0, 2e-3), (3.0, 2e-3), (2.0, 1.5e-2)])
@pytest.mark.parametrize("along", [True, False])
def test_the_nearest_plane_in_a_regular_wave(period, near, along, state_at, flow_of):
    # least squares over a rectangle, a wave along one side L, q = kL/2: the mean of cos is
    # sin(q)/q, the slope of the plane nearest to sin(kx) is 3 k (sin q - q cos q)/q^3 (calculus);
    # waves as short as the shortest (6.2 m) vary over the triangles that stand for the waterplane
    hull = barge()
    heading = math.degrees(0.5) + (0.0 if along else 90.0)
    sea = make_sea("regular", height=1.0, period=period, heading=heading, **WATER)
    k = float(sea.wavenumber[0])
    q = 0.5 * k * (LENGTH if along else BEAM)
    mean = 0.5 * math.sin(q) / q
    slope = 0.5 * 3.0 * k * (math.sin(q) - q * math.cos(q)) / q**3
    direction = np.array([math.cos(sea.heading[0]), math.sin(sea.heading[0])])
    off = k * float(direction @ [3.0, -2.0])
    for time in (0.0, 0.3 * period):
        phase = off - 2.0 * math.pi * time / period
        tilt = -slope * math.sin(phase)  # of the surface, along the wave
        heave = mean * math.cos(phase) + tilt * (0.3 if along else 0.1)  # at the centre of mass
        turn = [0.0, -tilt] if along else [tilt, 0.0]
        # the sea once as what comes in, once as what is solved
        still = make_sea("regular", height=1e-9, period=period, **WATER)
        for rider in (Rider(hull, sea, None), Rider(hull, still, flow_of(sea))):
            found = rider.motion(state_at(time))
            assert found[2:5] == pytest.approx([heave, *turn], rel=near, abs=1e-4)
            assert found[5] == 0.0


def test_long_waves_take_it_along(state_at):
    # its waterplane goes with the water, round a circle in deep water (Airy 1845), wherever the
    # centre of mass is
    sea = make_sea("regular", height=1.0, period=12.0, **(WATER | {"depth": math.inf}))
    rider = Rider(barge((0.0, 0.0), 0.0, height=-0.4), sea, None)
    k = float(sea.wavenumber[0])
    for time in (0.0, 3.0, 5.0):
        angle = 2.0 * math.pi * time / 12.0
        surge, _, heave, _, pitch, _ = rider.motion(state_at(time))
        # its bow goes down on the wave's face: pitch is minus the slope, k/2 sin(wt)
        assert pitch == pytest.approx(-0.5 * k * math.sin(angle), abs=1e-4)
        assert heave + 0.3 * pitch == pytest.approx(0.5 * math.cos(angle), abs=1e-3)
        assert surge + 0.4 * pitch == pytest.approx(0.5 * math.sin(angle), abs=1e-3)


@pytest.mark.parametrize("height", [0.0, 0.5])
def test_velocity_is_the_rate_of_the_motion(height, state_at, flow_of):
    sea = make_sea("jonswap", height=1.0, period=5.0, spreading=10.0, **WATER)
    rider = Rider(barge(height=height), sea, flow_of(sea))
    step = 1e-4
    later, before = (rider.motion(state_at(7.0 + s)) for s in (step, -step))
    rate = (later - before) / (2.0 * step)
    assert rider.velocity(state_at(7.0)) == pytest.approx(rate, abs=1e-6)


def test_where_nothing_else_is_it_rides_a_hump(tmp_path):
    buoy = {"name": "buoy", "form": "cylinder", "radius": 0.2, "draught": 0.2}
    case = Case(
        water={"depth": 1.0},
        surface={"size": [4.0, 3.0], "spacing": 0.4, "absorber": 2.0},
        hump=[{"height": 0.1, "width": 0.8}],
        body=[buoy | {"attitude": "follow"}],
        gauge=[{"position": [0.0, 0.0]}],
        run={"duration": 0.5},
    )
    run(case, tmp_path / "run")
    bodies, gauges = (arrays_of(tmp_path / "run" / f"{name}.nc") for name in ("bodies", "gauges"))
    assert bodies["motion"][:, 0, 2] == pytest.approx(gauges["elevation"][:, 0], abs=5e-3)
    assert gauges["elevation"][:, 0].min() < 0.08 < gauges["elevation"][:, 0].max()
    assert np.isnan(bodies["force"]).all()
