import math

import numpy as np
import pytest

from bemwave.handoff import Box, HandoffSampler, box_points, free_points
from bemwave.handoff.fields import cubic_weights, levels_down_to
from bemwave.waves import Sea, wavenumber

# check-values 2: linear wave theory (Dean & Dalrymple 1991), H = 3, T = 8, h = 20, rho = 1025.
# The crest stands at x = 0 at t = 0.
CREST = Sea.of([2 * math.pi / 8], [0.0], [1.5], [0.0], depth=20.0, gravity=9.81)
STILL = Sea.still(20.0, gravity=9.81)


def two_seas(depth=20.0):
    incident = Sea.of([0.7, 1.1], [0.3, 2.0], [0.5, 0.2], [0.1, 1.0], depth=depth)
    solved = Sea.of([0.7, 0.9], [1.3, -2.0], [0.3, 0.1], [0.7, 2.0], depth=depth)
    return incident, solved


def test_under_still_water_the_sum_of_both_parts_is_handed_over(flow_of, state_at):
    incident, solved = two_seas()
    box = Box((2.0, 1.0), (6.0, 4.0), 0.4, -5.0, 2.0, (1.0, 0.5), 1.0)
    points = box_points(box)
    instant = HandoffSampler(points, incident, flow_of(solved), field="parts").at(state_at(3.7))
    both = incident + solved
    under = (points.points[:, 2] <= 0) & (instant.wet > 0)
    wet = points.points[under]
    np.testing.assert_allclose(instant.total.velocity[under], both.velocity(wet, 3.7), atol=1e-12)
    np.testing.assert_allclose(instant.total.pressure[under], both.pressure(wet, 3.7), atol=1e-8)
    np.testing.assert_allclose(
        instant.total.elevation, both.elevation(*points.columns.T, 3.7), atol=1e-12
    )
    np.testing.assert_allclose(
        instant.incident.velocity[under], incident.velocity(wet, 3.7), atol=1e-12
    )
    np.testing.assert_allclose(
        instant.incident.elevation, incident.elevation(*points.columns.T, 3.7), atol=1e-12
    )


@pytest.mark.parametrize("part", ["incident", "solved"])
@pytest.mark.parametrize(
    ("crest", "z", "u"),
    [
        ("wheeler", 1.5, 1.325785),
        ("linear", 1.5, 1.4508326),
        ("wheeler", 0.75, 1.2692158),
        ("linear", 0.75, 1.3883088),
        ("wheeler", 0.0, 1.2157406),
        ("linear", 0.0, 1.3257850),
        ("cut", 0.75, 1.3257850),
        ("cut", -5.0, 0.9840610),
        ("linear", -10.0, 0.7668151),
    ],
)
def test_crest_rules_reach_the_published_kinematics(part, crest, z, u, flow_of, state_at):
    # check-values 2
    sea, flow = (CREST, None) if part == "incident" else (STILL, flow_of(CREST))
    points = free_points([[0, 0, z], [0, 0, -19.0], [0, 0, -19.5]])
    got = HandoffSampler(points, sea, flow, crest).at(state_at(0.0)).total.velocity[0, 0]
    tolerance = 1e-7 if part == "incident" or crest != "wheeler" else 1e-4
    assert got == pytest.approx(u, abs=1e-7 + tolerance)


def test_pressure_up_a_crest_is_hydrostatic_of_the_elevation(state_at):
    points = free_points([[0, 0, 1.0], [0, 0, -5.0], [0, 0, 0.0]])
    for crest in ("linear", "wheeler", "cut"):
        p = HandoffSampler(points, CREST, None, crest).at(state_at(0.0)).total.pressure
        # check-values 2: rho g elevation, 11195.230 at -5, 15082.875 at 0
        assert p == pytest.approx([15082.875, 11195.230, 15082.875], abs=1e-3)


def test_dry_points_are_nan_and_cells_are_wet_by_their_share(state_at):
    box = Box((0.0, 0.0), (2.0, 2.0), 0.0, -4.0, 3.0, (2.0, 1.0))
    points = box_points(box)
    crest = HandoffSampler(points, CREST, None).at(state_at(0.0))
    eta = CREST.elevation(-1.0, 0.0, 0.0)
    side = points.face == 0
    z = points.points[side, 2]
    np.testing.assert_allclose(crest.wet[side], np.clip(eta - z + 0.5, 0, 1), atol=1e-12)
    dry = crest.wet == 0
    assert dry.any()
    assert np.isnan(crest.total.velocity[dry]).all()
    assert np.isnan(crest.total.pressure[dry]).all()
    assert np.isfinite(crest.total.velocity[~dry]).all()
    trough = HandoffSampler(points, CREST, None).at(state_at(4.0))
    assert np.isnan(trough.total.velocity[side][z == -0.5]).all()  # the trough is 1.5 m deep
    assert np.isfinite(trough.first_order).all()


@pytest.mark.parametrize("crest", ["linear", "wheeler"])
def test_inside_a_hull_nothing_is_wet_and_there_is_no_surface(crest, state_at):
    def solid(points):
        return np.all(np.abs(points[:, :2]) < 1, axis=1) & (np.abs(points[:, 2]) < 2)

    # the last point in the hull's columns is over it, the one before it under it
    points = free_points([[0, 0, -1], [0, 0, -3], [0, 0, 2.5], [5, 0, -1]])
    sampler = HandoffSampler(points, CREST, None, crest, solid=solid)
    instant = sampler.at(state_at(0.0))
    assert instant.wet.tolist() == [0, 1, 0, 1]
    assert np.isnan(instant.total.velocity[[0, 2]]).all()
    assert np.isnan(instant.total.elevation[points.column[0]])
    assert np.isfinite(instant.total.elevation[points.column[3]])


@pytest.mark.parametrize("depth", [20.0, math.inf])
def test_stretched_solved_velocities_are_as_accurate_as_stated(depth, flow_of, state_at):
    w = 2 * math.pi / 4  # k spacing = .06
    solved = Sea.of([w], [0.4], [0.5], [0.0], depth=depth)
    box = Box((0.0, 0.0), (6.0, 6.0), 0.0, -10.0, 1.0, (2.0, 0.25))
    points = box_points(box)
    still = Sea.still(depth)
    got = HandoffSampler(points, still, flow_of(solved), "wheeler").at(state_at(0.3)).total
    want = HandoffSampler(points, solved, None, "wheeler").at(state_at(0.3)).total
    error = np.nanmax(np.abs(got.velocity - want.velocity)) / np.nanmax(np.abs(want.velocity))
    assert error < 1e-4, error
    k = float(wavenumber(4.0, depth))
    assert 0.25 * k < 0.3  # the range of the statement in `velocity_at_depth`


def test_levels_reach_the_lowest_and_cubics_pass_through_them():
    levels = levels_down_to(-25.0, 0.25)
    assert levels[0] == 0.0
    assert levels[-1] == pytest.approx(-25.0)
    assert np.all(np.diff(levels) < 0)
    z = np.linspace(-25, 0, 57)
    first, weights = cubic_weights(levels, z)
    cubic = 1 + z - 0.3 * z**2 + 0.01 * z**3
    nodes = levels[first[:, None] + np.arange(4)]
    interpolated = np.sum(weights * (1 + nodes - 0.3 * nodes**2 + 0.01 * nodes**3), axis=1)
    np.testing.assert_allclose(interpolated, cubic, atol=1e-9)
