"""A flow whose solved part is a sea in closed form, so that every sample has a known answer."""

import numpy as np
import pytest

from bemwave.flow.state import ARRAYS, SurfaceState


class PointsOfASea:
    def __init__(self, sea, points):
        assert np.all(points[:, 2] <= 0)
        self._at = sea.at(points)

    def velocity(self, state):
        return self._at.velocity(state.time)

    def pressure(self, state):
        return self._at.pressure(state.time)


class SurfaceOfASea:
    def __init__(self, sea, plan):
        self._at = sea.at(np.column_stack([plan, np.zeros(len(plan))]))

    def elevation(self, state):
        return self._at.elevation(state.time)

    def elevation_rate(self, state):
        return self._at.elevation_rate(state.time)

    def elevation_acceleration(self, state):
        return self._at.acceleration(state.time)[..., 2]

    def velocity(self, state):
        return self._at.velocity(state.time)

    def velocity_slope(self, state):
        return self._at.velocity_slope(state.time)


class FlowOfASea:
    def __init__(self, sea):
        self._sea = sea

    def sampler(self, points):
        return PointsOfASea(self._sea, points)

    def surface_sampler(self, plan):
        return SurfaceOfASea(self._sea, plan)


@pytest.fixture
def flow_of():
    return FlowOfASea


@pytest.fixture
def state_at():
    none = np.zeros(0)
    return lambda time: SurfaceState(time, **dict.fromkeys(ARRAYS, none))
