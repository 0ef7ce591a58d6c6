"""Displaced crests: what linear theory says, no folds, still at hulls, with velocities to match."""

import numpy as np
import pytest

from bemwave.case import Case
from bemwave.frames import Crests, MovingSurface, SolvedShift, grid_sheet
from bemwave.frames.crests import LEAST_AREA
from bemwave.frames.wave_sum import WaveSum
from bemwave.geometry import forms
from bemwave.geometry.hull import place_hull
from bemwave.geometry.outline import Rectangle
from bemwave.running.frames_output import moving_surface
from bemwave.running.solution import nothing_solved
from bemwave.running.survey import survey
from bemwave.waves import Sea

DEPTH, G = 8.0, 9.80665
K = 2.0 * np.pi / 20.0
W = np.sqrt(G * K * np.tanh(K * DEPTH))


def surface_of(sea, sheet, **keys):
    return MovingSurface(sheet, sea, None, crests=Crests(sheet, (), 1.0, **keys))


def test_a_regular_wave_moves_on_the_ellipses_of_its_particles():
    sea = Sea.of([W], [0.5], [0.4], [0.3], depth=DEPTH)
    sheet = grid_sheet((3.0, 1.0), (40.0, 30.0), 0.5)
    at_rest = sheet.mesh.points
    for time in (0.0, 1.3):
        frame = surface_of(sea, sheet).at(nothing_solved(time))
        moved = frame.mesh.points - at_rest
        angle = at_rest[:, :2] @ (K * np.array([np.cos(0.5), np.sin(0.5)])) - W * time + 0.3
        # Dean & Dalrymple (1991) section 4.2: at z = 0 half axes a and a coth(kh)
        along = -0.4 / np.tanh(K * DEPTH) * np.sin(angle)
        want = np.column_stack([along * np.cos(0.5), along * np.sin(0.5), 0.4 * np.cos(angle)])
        np.testing.assert_allclose(moved, want, atol=1e-8)
        exact = sea.velocity(at_rest, time)
        np.testing.assert_allclose(frame.velocity, exact, atol=1e-8)


def basin(flow_of):
    """A standing wave between walls at x = 0 and 60, y = 0 and 40: the solved part."""
    k = 4.0 * np.pi / 60.0, 2.0 * np.pi / 40.0
    size, angle = np.hypot(*k), np.arctan2(k[1], k[0])
    w = np.sqrt(G * size * np.tanh(size * DEPTH))
    wave = Sea.of([w], [angle], [0.05], [0.0], depth=DEPTH)
    wave = wave + wave.mirrored("x", 0.0)
    return flow_of(wave + wave.mirrored("y", 0.0)), k, size, w


def test_the_solved_part_s_displacement_is_the_gradient_that_theory_gives(flow_of, state_at):
    flow, k, size, w = basin(flow_of)
    places = np.array([[x, y] for x in (6.0, 22.0, 50.0) for y in (5.0, 17.0, 33.0)])
    water = Rectangle(0.0, 60.0, 0.0, 40.0)
    shift = SolvedShift(flow.surface_sampler, water, water.contains, (), 1.0, DEPTH, places)
    for time in (0.0, 0.7):
        got, rate = shift.at(state_at(time))
        # elevation .2 cos cos cos(wt): its potential for D is that over k tanh(kh)
        over = 0.2 / (size * np.tanh(size * DEPTH))
        x, y = k[0] * places[:, 0], k[1] * places[:, 1]
        want = -over * np.column_stack([k[0] * np.sin(x) * np.cos(y), k[1] * np.cos(x) * np.sin(y)])
        np.testing.assert_allclose(got, want * np.cos(w * time), atol=1e-4)
        np.testing.assert_allclose(rate, -w * want * np.sin(w * time), atol=1e-4)
        # which is the water's own velocity
        moving = flow.surface_sampler(places).velocity(state_at(time))[:, :2]
        np.testing.assert_allclose(rate, moving, atol=1e-4)
    assert np.abs(want).max() > 0.1
    outside = SolvedShift(flow.surface_sampler, water, water.contains, (), 1.0, DEPTH, places - 99)
    assert not outside.at(state_at(0.0))[0].any()


def steep_sea():
    rng = np.random.default_rng(4)
    w = np.linspace(1.5, 5.0, 200)
    amplitude = 0.28 * (w[0] / w) ** 2.2
    return Sea.of(w, rng.normal(0.0, 0.5, 200), amplitude, rng.uniform(0, 6.28, 200), depth=DEPTH)


def areas(mesh):
    return mesh.area_vectors[:, 2]


def test_a_surface_too_steep_is_limited_before_it_folds_and_its_velocities_follow():
    sheet = grid_sheet((0.0, 0.0), (40.0, 30.0), 0.25)
    sea, step = steep_sea(), 1e-3
    free = Crests(sheet, (), 1.0)
    before, now, after = (
        MovingSurface(sheet, sea, None, crests=free).at(nothing_solved(2.0 + n * step))
        for n in (-1, 0, 1)
    )
    unlimited = MovingSurface(sheet, sea, None).at(nothing_solved(2.0))
    shift = sheet.mesh.points.copy()
    shift[:, :2] += WaveSum(sea, sheet, True).at(2.0)[5:7].T
    rest = areas(sheet.mesh)
    assert (areas(sheet.mesh.with_points(shift)) / rest).min() < 0.0  # it would have folded
    assert (areas(now.mesh) / rest).min() >= LEAST_AREA - 1e-12
    np.testing.assert_array_equal(now.elevation, unlimited.elevation)
    # where nothing was to be limited, far from folds, the displacement is theory's own
    same = np.abs(now.mesh.points - shift)[:, :2].max(axis=1) < 1e-9
    assert same.mean() > 0.2
    rate = (after.mesh.points - before.mesh.points) / (2.0 * step)
    error = np.sqrt(np.mean((rate - now.velocity) ** 2))
    assert error < 0.02 * np.sqrt(np.mean(rate**2))


def test_at_a_hull_nothing_goes_through_the_waterline():
    hull = place_hull("buoy", forms.cylinder(3.0, 3.0, 0.4))
    lines = hull.polygons()
    sheet = grid_sheet((0.0, 0.0), (24.0, 20.0), 0.25, [hull])
    sea = Sea.of([W], [0.5], [0.4], [0.3], depth=DEPTH)
    frame = MovingSurface(sheet, sea, None, crests=Crests(sheet, lines, 2.0)).at(
        nothing_solved(0.0)
    )
    plan, moved = sheet.mesh.points[:, :2], (frame.mesh.points - sheet.mesh.points)[:, :2]
    radius = np.linalg.norm(plan, axis=1)
    at = np.abs(radius - 3.0) < 0.13
    assert at.sum() > 50
    assert np.abs(moved[at]).max() < 0.01
    assert not moved[sheet.under_hull].any()
    ratio = areas(frame.mesh) / areas(sheet.mesh)
    assert ratio.min() > 0.5  # no triangle is pressed together between hull and open water
    far = radius > 5.2
    angle = plan[far] @ (K * np.array([np.cos(0.5), np.sin(0.5)])) + 0.3
    along = -0.4 / np.tanh(K * DEPTH) * np.sin(angle)
    want = along[:, None] * [np.cos(0.5), np.sin(0.5)]
    np.testing.assert_allclose(moved[far], want, atol=1e-8)


@pytest.mark.usefixtures("needs_gmsh")
def test_a_case_s_frames_are_displaced_with_all_that_is_in_them(flow_of, state_at):
    case = Case(
        water={"depth": DEPTH},
        waves=[{"kind": "jonswap", "height": 0.5, "period": 4.0, "spreading": 10.0,
                "components": 100, "band": [0.7, 1.6]}],
        surface={"size": [24.0, 16.0], "spacing": 1.5, "absorber": 12.0},
        body=[{"name": "buoy", "form": "cylinder", "radius": 2.0, "draught": 2.0}],
        frames={"region": {"size": [24.0, 16.0]}, "spacing": 0.5, "horizontal_displacement": True},
        run={"duration": 4.0},
    )  # fmt: skip
    surveyed = survey(case)
    solved = flow_of(Sea.of([2.0], [1.0], [0.05], [0.0], depth=DEPTH))
    surface = moving_surface(surveyed, case.frames, solved)
    step = 1e-3
    before, now, after = (surface.at(state_at(2.0 + n * step)) for n in (-1, 0, 1))
    rate = (after.mesh.points - before.mesh.points) / (2.0 * step)
    assert np.abs(rate - now.velocity).max() < 0.02 * np.abs(rate).max()
    assert np.abs(now.velocity[:, :2]).max() > 0.2
    x, y = now.mesh.points[~now.under_hull, :2].T
    assert np.hypot(x, y).min() > 1.9  # polygon's sides and the taper's first squares
