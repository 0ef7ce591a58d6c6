"""A standing wave solved in a tank of mirrors, sampled everywhere, against linear wave theory.

phi = cos(k x) cosh k(z + h) / cosh kh on z = 0 and below, Lamb, Hydrodynamics, art. 228.
"""

from dataclasses import dataclass
from functools import cache

import numpy as np
import pytest

from bemwave.flow.images import Mirror
from bemwave.flow.panels import PanelFlow
from bemwave.flow.samplers import PanelSamplers
from bemwave.flow.state import SurfaceState
from bemwave.geometry.outline import Rectangle
from bemwave.geometry.water_surface import water_surface
from bemwave.kernels.panels import SEVEN

WAVELENGTH, DEPTH, WIDTH = 2.0, 1.0, 0.5
K = 2 * np.pi / WAVELENGTH
DENSITY = 1000.0


def load(elements, function):
    """(free,) int over F of function(x, y) hat_i, by Dunavant's rule of seven points."""
    result = np.zeros(len(elements.points))
    corners = elements.points[elements.water]
    for rule in SEVEN:
        at = np.einsum("j,mjc->mc", rule[:3], corners)
        value = elements.water_table[:, 28] * rule[3] * function(at[:, 0], at[:, 1])
        for j in range(3):
            np.add.at(result, elements.water[:, j], value * rule[j])
    return result[: elements.free]


@dataclass
class Solved:
    samplers: PanelSamplers
    state: SurfaceState


@cache
def solve(unknowns, structured):
    """Half a wavelength of the standing wave, `unknowns` nodes a wavelength."""
    # equilateral triangles of edge a have 2/sqrt(3) nodes in a^2
    spacing = WAVELENGTH / unknowns * (1.0 if structured else np.sqrt(2 / np.sqrt(3)))
    outline = Rectangle(0.0, WAVELENGTH / 2, 0.0, WIDTH)
    water = water_surface(outline, spacing, structured=structured)
    walls = (Mirror("x", 0.0), Mirror("x", WAVELENGTH / 2), Mirror("y", 0.0), Mirror("y", WIDTH))
    flow = PanelFlow(water, DEPTH, closed=True, mirrors=walls)
    none = np.zeros(0)
    phi = flow.solve_mass(load(flow.elements, lambda x, y: np.cos(K * x)))
    flux = flow.surface_flux(phi, none)
    # rates are given the values themselves: pressure is then -density times potential
    state = SurfaceState(0.0, phi, phi, phi, flux, flux, none, none, none, none)
    samplers = PanelSamplers(water, DEPTH, closed=True, mirrors=walls, density=DENSITY)
    return Solved(samplers, state)


def velocity(points):
    x, z = points[:, 0], points[:, 2]
    up, down = (f(K * (z + DEPTH)) / np.cosh(K * DEPTH) for f in (np.cosh, np.sinh))
    return K * np.column_stack([-np.sin(K * x) * up, np.zeros_like(x), np.cos(K * x) * down])


def potential(points):
    up = np.cosh(K * (points[:, 2] + DEPTH)) / np.cosh(K * DEPTH)
    return np.cos(K * points[:, 0]) * up


def places(count=300):
    """Random places, denser near the surface, at walls and on the bed too."""
    points = np.random.default_rng(1).random((count, 3)) ** [1, 1, 2]
    points = points * [WAVELENGTH / 2, WIDTH, -DEPTH]
    points[:4, 2] = -DEPTH
    points[4:8, 0] = 0.0
    return points


@pytest.fixture(
    params=[(12, True), (24, True), (12, False), (24, False)],
    ids=["12 structured", "24 structured", "12 unstructured", "24 unstructured"],
)  # fmt: skip
def case(request):
    unknowns, structured = request.param
    if not structured:
        request.getfixturevalue("needs_gmsh")
    return solve(unknowns, structured), 0.01 if unknowns == 12 else 0.003


def off(found, exact):
    """Largest error over the largest value of the wave, which is K or 1."""
    return np.linalg.norm(found - exact, axis=-1).max() / K


def test_velocity_below_the_surface(case):
    solved, limit = case
    points = places()
    error = off(solved.samplers.sampler(points).velocity(solved.state), velocity(points))
    # measured over 2500 places: .97, .29, .54, .19 %
    assert error < limit


def test_pressure_below_the_surface(case):
    solved, limit = case
    points = places()
    found = solved.samplers.sampler(points).pressure(solved.state)
    # measured: .57, .18, .39, .13 %
    assert np.abs(found / -DENSITY - potential(points)).max() < limit


def test_velocity_at_the_surface(case):
    solved, limit = case
    points = places() * [1.0, 1.0, 0.0]
    at_surface = solved.samplers.surface_sampler(points[:, :2])
    # measured: .97, .22, .45, .21 %, the same by either sampler
    assert off(at_surface.velocity(solved.state), velocity(points)) < 2 * limit
    assert off(solved.samplers.sampler(points).velocity(solved.state), velocity(points)) < 2 * limit


def test_elevation_is_recovered_between_nodes(case):
    """The initial data is the best linear fit of a cosine; its means over hats are the cosine's."""
    solved, limit = case
    points = places() * [1.0, 1.0, 0.0]
    found = solved.samplers.surface_sampler(points[:, :2]).elevation(solved.state)
    # measured: .1, .005, .05, .005 %
    assert np.abs(found - potential(points)).max() < 0.2 * limit


def test_slope_of_velocity_at_the_surface(case):
    """d(velocity)/dz, used by the linear crest rule: a derivative, one order less accurate."""
    solved, _ = case
    points = places() * [1.0, 1.0, 0.0]
    found = solved.samplers.surface_sampler(points[:, :2]).velocity_slope(solved.state)
    x = points[:, 0]
    exact = K * K * np.column_stack(
        [-np.sin(K * x) * np.tanh(K * DEPTH), np.zeros_like(x), np.cos(K * x)]
    )  # fmt: skip
    # measured: 2.3, 1.1, 1.2, .8 %; no limit is laid down for it
    assert off(found, exact) / K < 0.03
