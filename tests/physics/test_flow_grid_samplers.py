"""What the samplers of a gridded surface and its hulls find, against potentials in closed form.

States are set by hand: potentials and fluxes are the closed form's own. Plane waves (Airy), the
heaving half dipole and multipoles of Laplace's equation: Lamb (1932), Hydrodynamics, 6th ed.,
art. 227, 229 and 92, 81.
"""

import math

import numpy as np
import pytest
from scipy.spatial import Delaunay

from bemwave.errors import InputError
from bemwave.flow.elements import split
from bemwave.flow.grid_samplers import GridSamplers
from bemwave.flow.sheet import Sheet
from bemwave.flow.state import SurfaceState
from bemwave.geometry.forms import sphere
from bemwave.geometry.hull import place_hull
from bemwave.geometry.surface_mesh import SurfaceMesh

DENSITY = 1025.0
RADIUS = 6.0
NOTHING = SurfaceMesh(np.zeros((0, 3)), np.zeros((0, 3), int), np.zeros(0, int), ("hull", "water"))


def elements_of(mesh):
    return split(mesh, True, (), math.inf)


def floating_sphere(spacing, at=(0.0, 0.0), centre_depth=0.0):
    """A sphere's wetted part and triangles over its waterplane, facing down."""
    hull = place_hull("ball", sphere(RADIUS, centre_depth, spacing), position=at)
    if not hull.waterlines:
        return SurfaceMesh(hull.mesh.points, hull.mesh.triangles, hull.mesh.part, ("ball", "water"))
    (loop,) = hull.waterlines
    rim, count = hull.mesh.points[loop], len(hull.mesh.points)
    steps = spacing * np.arange(-40, 41)
    lattice = np.stack(np.meshgrid(steps, steps), axis=-1).reshape(-1, 2) + np.array(at)
    polar = np.hypot(*(rim[:, :2] - at).T)
    lattice = lattice[np.hypot(*(lattice - at).T) < polar.min() - 0.6 * spacing]
    plan = np.concatenate([rim[:, :2], lattice])
    lid = Delaunay(plan).simplices
    (ax, ay), (bx, by), (cx, cy) = np.moveaxis(plan[lid], 0, -1)
    up = (bx - ax) * (cy - ay) > (by - ay) * (cx - ax)
    lid[up] = lid[up][:, ::-1]
    number = np.concatenate([loop, count + np.arange(len(lattice))])
    part = np.repeat([0, 1], [len(hull.mesh.triangles), len(lid)])
    return SurfaceMesh(
        np.concatenate([hull.mesh.points, np.column_stack([lattice, np.zeros(len(lattice))])]),
        np.concatenate([hull.mesh.triangles, number[lid]]),
        part,
        ("ball", "water"),
    )


class Wave:
    """cos(kx x + ky y) cosh k(z + h) / cosh kh."""

    def __init__(self, kx, ky, depth):
        self.kx, self.ky, self.k, self.depth = kx, ky, math.hypot(kx, ky), depth

    def potential(self, at):
        return np.cos(self.kx * at[:, 0] + self.ky * at[:, 1]) * self._profile(at[:, 2], 1.0)

    def velocity(self, at):
        angle = self.kx * at[:, 0] + self.ky * at[:, 1]
        level = self._profile(at[:, 2], 1.0)
        rise = self.k * np.cos(angle) * self._profile(at[:, 2], -1.0)
        return np.column_stack(
            [-self.kx * np.sin(angle) * level, -self.ky * np.sin(angle) * level, rise]
        )

    def _profile(self, z, sign):
        if math.isinf(self.depth):
            return np.exp(self.k * z)
        up = np.exp(self.k * z) * (1.0 + sign * np.exp(-2.0 * self.k * (z + self.depth)))
        return up / (1.0 + np.exp(-2.0 * self.k * self.depth))


class HalfDipole:
    """z / r^3 about the origin: zero on still water, singular inside the hull."""

    def potential(self, at):
        return at[:, 2] / np.maximum(np.linalg.norm(at, axis=1), 1e-9) ** 3

    def velocity(self, at):
        r = np.linalg.norm(at, axis=1)[:, None]
        along = -3.0 * at[:, 2:] * at / r**5
        along[:, 2:] += 1.0 / r**3
        return along

    def potential_on_water(self, at):
        return np.zeros(len(at))

    def flux_on_water(self, at):
        return smooth_inside(at, 0.0, 1.5) / RADIUS**3


class Quadrupole:
    """x y / r^5 about a point on the hull's axis, under still water: not zero on it."""

    down = 0.5
    centre = np.array([0.0, 0.0, -down * RADIUS])

    def potential(self, at):
        x = at - self.centre
        return RADIUS**4 * x[:, 0] * x[:, 1] / np.linalg.norm(x, axis=1) ** 5

    def velocity(self, at):
        x, r = at - self.centre, np.linalg.norm(at - self.centre, axis=1)[:, None]
        cross = np.column_stack([x[:, 1], x[:, 0], np.zeros(len(x))])
        return RADIUS**4 * (cross / r**5 - 5.0 * x[:, :1] * x[:, 1:2] * x / r**7)

    def potential_on_water(self, at):
        return at[:, 0] * at[:, 1] * smooth_inside(at, self.down**2, 2.5) / RADIUS

    def flux_on_water(self, at):
        return (
            -5.0 * self.down * at[:, 0] * at[:, 1] * smooth_inside(at, self.down**2, 3.5)
        ) / RADIUS**2


def smooth_inside(at, b, power):
    """(q + b)^-power, q the squared distance from the axis in radii; a cubic in q inside 1."""
    q = np.sum(at[:, :2] ** 2, axis=1) / RADIUS**2
    t, term, inside = (q - 1.0) / (1.0 + b), 1.0, 0.0
    for n in range(4):
        inside = inside + term
        term = term * -(power + n) / (n + 1) * t
    outside = (np.maximum(q, 1.0) + b) ** -power
    return np.where(q > 1.0, outside, inside * (1.0 + b) ** -power)


def around(count, nearest, farthest):
    """Points about the origin, `nearest` to `farthest` radii from it."""
    rng = np.random.default_rng(3)
    way = rng.standard_normal((count, 3))
    way[:, 2] = -np.abs(way[:, 2])
    way /= np.linalg.norm(way, axis=1)[:, None]
    return RADIUS * rng.uniform(nearest, farthest, count)[:, None] * way


def off(found, exact):
    """Largest error relative to the local size of a vector."""
    error = np.linalg.norm(found - exact, axis=1) / np.linalg.norm(exact, axis=1)
    return error.max()


def exact_state(samplers, field):
    """The state that is `field`; through waterplanes as it says, or as it is."""
    sheet, e = samplers.sheet, samplers.elements
    at = np.column_stack([sheet.xy, np.zeros(sheet.size)])
    on_water = getattr(field, "potential_on_water", field.potential)
    flux = getattr(field, "flux_on_water", lambda at: field.velocity(at)[:, 2])
    phi, w = on_water(at), flux(at)
    on_hull = np.append(on_water(e.points[: e.free]), field.potential(e.points[e.free :]))
    into = np.sum(field.velocity(e.hull_table[:, 24:27]) * e.hull_table[:, 9:12], axis=1)
    # the rates are the values themselves: pressure is then -density times potential
    return SurfaceState(0.0, phi, phi, phi, w, w, on_hull, on_hull, into, into)


@pytest.mark.parametrize("depth", [math.inf, 30.0, 5.0])
@pytest.mark.parametrize("nodes", [6, 12, 40])
def test_plane_waves_at_all_depths(nodes, depth):
    sheet = Sheet(-40.0, 10.0, 1.0, (240, 120), depth)
    samplers = GridSamplers(sheet, elements_of(NOTHING), density=DENSITY)
    k = 2.0 * math.pi / 120
    wave = Wave(k * round(96 / nodes), k * round(72 / nodes), depth)
    state = exact_state(samplers, wave)
    rng = np.random.default_rng(0)
    z = -np.concatenate([rng.uniform(0.0, min(4.0, depth), 800), np.geomspace(0.1, 150.0, 800)])
    z = z[-z <= depth]
    points = np.column_stack([rng.uniform([-40.0, 10.0], [200.0, 130.0], (len(z), 2)), z])
    sampler = samplers.sampler(points)
    error = np.linalg.norm(sampler.velocity(state) - wave.velocity(points), axis=1).max() / wave.k
    # measured: at most 1.9e-4 of the amplitude at the surface
    assert error < 4e-4
    error = np.abs(sampler.pressure(state) / -DENSITY - wave.potential(points)).max()
    # measured: 1.7e-4
    assert error < 4e-4


@pytest.mark.parametrize("depth", [math.inf, 30.0])
def test_surface_of_a_plane_wave(depth):
    sheet = Sheet(0.0, 0.0, 2.0, (120, 60), depth)
    samplers = GridSamplers(sheet, elements_of(NOTHING))
    k = 2.0 * math.pi / 120
    wave = Wave(8 * k, 6 * k, depth)
    state = exact_state(samplers, wave)
    xy = np.random.default_rng(0).uniform(0.0, 100.0, (500, 2))
    surface, at = samplers.surface_sampler(xy), np.column_stack([xy, np.zeros(500)])
    step = 1e-3 * np.array([0.0, 0.0, 1.0])
    slope = (wave.velocity(at) - wave.velocity(at - step)) / 1e-3
    assert np.abs(surface.elevation(state) - wave.potential(at)).max() < 1e-4
    assert np.abs(surface.velocity(state) - wave.velocity(at)).max() < 1e-4 * wave.k
    assert np.abs(surface.velocity_slope(state) - slope).max() < 1e-3 * wave.k**2
    assert np.array_equal(surface.elevation_rate(state), surface.velocity(state)[:, 2])
    assert np.array_equal(surface.elevation_acceleration(state), surface.elevation_rate(state))


@pytest.fixture(scope="module")
def ball():
    sheet = Sheet(-240.0, -240.0, 1.0, (480, 480))
    return GridSamplers(sheet, elements_of(floating_sphere(1.0)), density=DENSITY)


@pytest.mark.parametrize(
    ("nearest", "farthest", "limit"), [(1.1, 1.5, 8e-3), (1.5, 3.0, 2e-3), (3.0, 20.0, 2e-3)]
)
def test_a_hull_that_moves_with_the_wave_is_not_there(ball, nearest, farthest, limit):
    wave = Wave(2.0 * math.pi / 24, 0.0, math.inf)
    state = exact_state(ball, wave)
    points = around(600, nearest, farthest)
    sampler = ball.sampler(points)
    error = np.linalg.norm(sampler.velocity(state) - wave.velocity(points), axis=1).max() / wave.k
    # measured: 3.6e-3, 7.6e-4, 3e-4, with 324 panels one spacing large
    assert error < limit
    error = np.abs(sampler.pressure(state) / -DENSITY - wave.potential(points)).max()
    # measured: 1.7e-3, 1e-3, 3e-4
    assert error < limit


@pytest.mark.parametrize(
    ("nearest", "farthest", "limit"), [(1.1, 1.5, 1e-2), (1.5, 3.0, 4e-3), (3.0, 20.0, 3e-3)]
)
def test_half_dipole_in_a_hull(ball, nearest, farthest, limit):
    field = HalfDipole()
    state = exact_state(ball, field)
    points = around(600, nearest, farthest)
    # measured: 7.8e-3, 2.3e-3, 1.5e-3: the dipole of flat panels is that much weaker
    assert off(ball.sampler(points).velocity(state), field.velocity(points)) < limit


@pytest.mark.parametrize("z", [0.0, -0.1, -0.3, -0.6, -0.9, -1.2, -2.0])
def test_half_dipole_up_to_still_water(ball, z):
    field = HalfDipole()
    state = exact_state(ball, field)
    turn = np.linspace(0.0, 2.0 * np.pi, 60)
    reach = RADIUS * np.array([1.1, 1.2, 1.3, 1.45, 1.6, 2.0, 4.0])[:, None]
    points = np.stack([reach * np.cos(turn), reach * np.sin(turn), z + 0.0 * reach * turn], axis=-1)
    points = points.reshape(-1, 3)
    # measured: at most 5.7e-3, at z = -.8 spacings, .6 spacings from the hull
    assert off(ball.sampler(points).velocity(state), field.velocity(points)) < 1e-2


@pytest.mark.parametrize(("panel", "limit"), [(1.0, 0.08), (0.5, 0.02)])
def test_field_of_surface_and_hull_together(ball, panel, limit):
    field = Quadrupole()
    samplers = GridSamplers(ball.sheet, elements_of(floating_sphere(panel)), density=DENSITY)
    state = exact_state(samplers, field)
    points = around(600, 1.15, 3.0)
    error = np.linalg.norm(
        samplers.sampler(points).velocity(state) - field.velocity(points), axis=1
    )
    size = RADIUS**4 / np.linalg.norm(points - field.centre, axis=1) ** 4
    # measured: 5.5 % and 1.3 %, a singularity half a radius inside: second order of the panels
    assert (error / size).max() < limit


def test_a_point_above_still_water_is_refused(ball):
    with pytest.raises(InputError, match=r"z = 0\.5"):
        ball.sampler(np.array([[0.0, 0.0, 0.5]]))
