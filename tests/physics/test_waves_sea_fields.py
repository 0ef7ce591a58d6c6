"""A sea at points: against the closed form written out, and as a potential flow."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from bemwave.errors import InputError
from bemwave.waves import Sea, at_points, make_sea

QUANTITIES = ("elevation", "elevation_rate", "potential", "pressure", "velocity", "acceleration",
              "velocity_slope")  # fmt: skip


def some_sea(depth, count=40, seed=5):
    rng = np.random.default_rng(seed)
    return Sea.of(
        rng.uniform(0.3, 3.0, count),
        rng.uniform(-np.pi, np.pi, count),
        rng.uniform(0.0, 0.3, count),
        rng.uniform(-np.pi, np.pi, count),
        depth=depth,
        density=1010.0,
        gravity=9.7,
    )


def some_points(count=30, lowest=-20.0):
    rng = np.random.default_rng(11)
    points = rng.uniform(-300.0, 300.0, (count, 3))
    points[:, 2] = rng.uniform(lowest, 0.0, count)
    points[:3, 2] = 0.0
    return points


def direct_sum(sea, point, t):
    """All fields at one point and time, term by term with the textbook's hyperbolic functions."""
    x, y, z = point
    out = dict.fromkeys(QUANTITIES, 0.0)
    for w, b, a, ph, k in zip(
        sea.frequency, sea.heading, sea.amplitude, sea.phase, sea.wavenumber, strict=True
    ):
        east, north = math.cos(b), math.sin(b)
        psi = k * (x * east + y * north) - w * t + ph
        c, s = math.cos(psi), math.sin(psi)
        if math.isinf(sea.depth):
            cosh = sinh = math.exp(k * z)
            tanh = 1.0
        else:
            cosh = math.cosh(k * (z + sea.depth)) / math.cosh(k * sea.depth)
            sinh = math.sinh(k * (z + sea.depth)) / math.cosh(k * sea.depth)
            tanh = math.tanh(k * sea.depth)
        g = sea.gravity
        unit = np.array([east * cosh * c, north * cosh * c, sinh * s])
        rate = np.array([east * cosh * s, north * cosh * s, -sinh * c])
        slope = np.array([east * tanh * c, north * tanh * c, s])
        out["elevation"] += a * c
        out["elevation_rate"] += a * w * s
        out["potential"] += a * g / w * cosh * s
        out["pressure"] += a * sea.density * g * cosh * c
        out["velocity"] = out["velocity"] + a * g * k / w * unit
        out["acceleration"] = out["acceleration"] + a * g * k * rate
        out["velocity_slope"] = out["velocity_slope"] + a * g * k**2 / w * slope
    return out


@pytest.mark.parametrize("depth", [20.0, math.inf])
def test_fields_equal_the_direct_sum(depth):
    sea, points, times = some_sea(depth), some_points(), np.array([0.0, 7.3, 451.0])
    at = sea.at(points)
    for name in QUANTITIES:
        found = getattr(at, name)(times)
        expected = np.array([[direct_sum(sea, p, t)[name] for p in points] for t in times])
        assert found.shape == expected.shape
        assert np.abs(found - expected).max() <= 1e-12 * np.abs(expected).max(), name


def test_shapes():
    sea = some_sea(20.0)
    grid = np.zeros((4, 5, 3))
    assert sea.velocity(grid, 1.0).shape == (4, 5, 3)
    assert sea.velocity(grid, [1.0, 2.0]).shape == (2, 4, 5, 3)
    assert sea.pressure(grid[0], 1.0).shape == (5,)
    assert sea.potential(grid[0], [[1.0, 2.0, 3.0]]).shape == (1, 3, 5)
    assert sea.elevation(0.0, 0.0, 0.0).shape == ()
    assert sea.elevation(np.zeros((4, 1)), np.zeros(5), [0.0, 1.0]).shape == (2, 4, 5)
    with pytest.raises(InputError, match=r"shape \(4,\) were given to a sea; expected \(\.\.\., 3"):
        sea.at(np.zeros(4))


def test_blocks_and_memory_change_nothing(monkeypatch):
    """Small blocks, no store, and a point alone give the same as all at once."""
    sea, points, times = some_sea(20.0), some_points(), np.linspace(0.0, 50.0, 23)
    whole = {name: getattr(sea.at(points), name)(times) for name in QUANTITIES}
    monkeypatch.setattr(at_points, "BLOCK_BYTES", 16 * 40 * 7)
    for memory in (0, 2**30):
        at = sea.at(points, memory)
        for name in QUANTITIES:
            for _ in range(2):
                found = getattr(at, name)(times)
                scale = np.abs(whole[name]).max()
                assert np.abs(found - whole[name]).max() <= 1e-13 * scale, name


def test_still_water_works_everywhere():
    still = Sea.still(20.0)
    at = still.at(some_points())
    for name in QUANTITIES:
        assert not getattr(at, name)([0.0, 1.0]).any()
    assert still.significant_height == 0.0
    assert still.repeat_time == math.inf
    assert still.mirrored("x", 3.0).count == 0
    assert still.keep(np.zeros(0, dtype=bool)).count == 0
    sea = make_sea("regular", depth=20.0, height=1.0, period=6.0)
    assert (still + sea).elevation(0.0, 0.0, 0.0) == pytest.approx(0.5)
    assert (sea + still).count == 1


def test_vertical_velocity_at_still_water_is_the_rate_of_the_surface():
    for depth in (3.0, 20.0, math.inf):
        at = some_sea(depth).at(some_points() * [1, 1, 0])
        times = np.linspace(0.0, 9.0, 7)
        rate, w = at.elevation_rate(times), at.velocity(times)[..., 2]
        assert np.abs(w - rate).max() <= 1e-13 * np.abs(rate).max()


def test_no_flow_through_the_bed():
    at = some_sea(20.0).at(some_points() * [1, 1, 0] - [0, 0, 20.0])
    assert np.abs(at.velocity(3.0)[:, 2]).max() == 0.0


def test_no_overflow_in_very_deep_or_very_shallow_water():
    short = Sea.of([12.0], [0.0], [0.01], [0.0], depth=9000.0)
    fields = short.velocity([[0.0, 0.0, -8999.0], [0.0, 0.0, 0.0]], 0.0)
    assert fields[:, 0] == pytest.approx([0.0, 0.12], rel=1e-12)
    long = Sea.of([1e-3], [0.0], [0.01], [0.0], depth=1e-3)
    # shallow water: u = a sqrt(g/h) at every depth
    u = long.velocity([[0.0, 0.0, -1e-3], [0.0, 0.0, 0.0]], 0.0)[:, 0]
    assert u == pytest.approx(0.01 * math.sqrt(9.80665 / 1e-3), rel=1e-6)


waves = st.tuples(
    st.floats(0.3, 2.5), st.floats(-3.1, 3.1), st.floats(0.05, 1.0), st.floats(-3.1, 3.1)
)


@settings(max_examples=40, deadline=None)
@given(
    st.lists(waves, min_size=1, max_size=4),
    st.sampled_from([4.0, 25.0, math.inf]),
    st.floats(-100.0, 100.0),
    st.floats(0.15, 0.9),
    st.floats(0.0, 100.0),
)
def test_a_potential_flow(components, depth, x, fraction, t):
    """Velocity is the gradient of the potential, the flow has no divergence, p = -rho phi_t."""
    sea = Sea.of(*np.array(components).T, depth=depth)
    point = np.array([x, 0.3 * x, -fraction * min(depth, 10.0)])
    step = 1e-3
    stencil = point + step * np.concatenate([np.eye(3), -np.eye(3)])
    potential, velocity = sea.potential(stencil, t), sea.velocity(stencil, t)
    gradient = (potential[:3] - potential[3:]) / (2 * step)
    centre = sea.velocity(point, t)
    size = float(np.sum(sea.amplitude * 9.80665 * sea.wavenumber / sea.frequency))
    k = float(sea.wavenumber.max())
    tolerance = size * (k * step) ** 2 + 1e-9 * size / k  # truncation; rounding of the quotient
    assert np.abs(gradient - centre).max() <= tolerance
    divergence = np.trace(velocity[:3] - velocity[3:]) / (2 * step)
    assert abs(divergence) <= k * tolerance + 1e-9 * size
    before, after = sea.potential(point, np.array([t - step, t + step]))
    pressure_size = 1025.0 * 9.80665 * float(sea.amplitude.sum())
    rate = -1025.0 * (after - before) / (2 * step)
    assert abs(rate - sea.pressure(point, t)) <= pressure_size * 3e-6
    turn = sea.at(point).acceleration(t) * 2 * step
    difference = np.diff(sea.velocity(point, np.array([t - step, t + step])), axis=0)[0]
    assert np.abs(turn - difference).max() <= 2 * step * 2.5 * size * 3e-6


@pytest.mark.parametrize(("axis", "normal"), [("x", 0), ("y", 1)])
@pytest.mark.parametrize("depth", [20.0, math.inf])
def test_a_mirrored_sea_makes_a_wall(axis, normal, depth):
    sea, wall = some_sea(depth), 37.5
    points = some_points()
    points[:, normal] = wall
    times = np.linspace(0.0, 60.0, 7)
    image = sea.mirrored(axis, wall)
    velocity = (sea + image).velocity(points, times)
    assert np.abs(velocity[..., normal]).max() < 1e-12 * np.abs(velocity).max()
    # along the wall both are the same
    assert np.allclose(image.elevation(*points.T[:2], times), sea.elevation(*points.T[:2], times),
                       rtol=0, atol=1e-12)  # fmt: skip
    # away from it the image is the sea seen in the mirror
    other = points.copy()
    points[:, normal] += 12.0
    other[:, normal] -= 12.0
    assert np.allclose(image.pressure(points, 5.0), sea.pressure(other, 5.0), rtol=0, atol=1e-7)


def test_seas_of_different_water_do_not_add():
    with pytest.raises(InputError, match="seas of depth 20 and 30 were added"):
        Sea.still(20.0) + Sea.still(30.0)


def test_a_sea_needs_one_value_for_each_frequency():
    two, one = np.ones(2), np.ones(1)
    with pytest.raises(InputError, match=r"heading has shape \(1,\); expected one value for each"):
        Sea(two, one, two, two, two, 20.0)
