"""Route "grid": the flow map of a gridded surface with a hull in it, against closed forms."""

import math

import numpy as np
import pytest

from bemwave.flow.grid import GridFlow
from bemwave.flow.sheet import Sheet
from bemwave.geometry.forms import sphere
from bemwave.geometry.hull import place_hull
from bemwave.geometry.waterplane import closed_bodies

SPACING, NODES = 1 / 6, 96
CENTRE = np.array([-0.27, -0.31]) * SPACING  # off the nodes


@pytest.fixture(scope="module")
def flow():
    """A hemisphere of radius 1."""
    hull = place_hull("ball", sphere(1.0, 0.0, 0.15), position=tuple(CENTRE))
    corner = -NODES * SPACING / 2
    sheet = Sheet(corner, corner, SPACING, (NODES, NODES))
    return GridFlow(sheet, closed_bodies([hull]), [hull.polygons()])


@pytest.mark.parametrize("waves", [3, 6])
def test_a_wave_runs_through_a_hull_that_gives_way(flow, waves):
    # exp(kz) cos(kx) is harmonic everywhere: given its own flux, the hull must not be felt
    e, k = flow.elements, 2 * math.pi * waves / (NODES * SPACING)
    potential = np.cos(k * flow.sheet.xy[:, :1])
    x, z = e.hull_table[:, 24], e.hull_table[:, 26]
    slope = k * np.exp(k * z) * np.array([-np.sin(k * x), 0 * x, np.cos(k * x)])
    flux = np.einsum("cm,mc->m", slope, e.hull_table[:, 9:12])[:, None]
    found = flow.hull_potential(potential, flux)[:, 0]
    expected = np.exp(k * e.points[:, 2]) * np.cos(k * e.points[:, 0])
    assert np.abs(found - expected).max() < (0.15 * k) ** 2 / 6  # linear on panels of .15
    rise = flow.surface_flux(potential, flux)[:, 0]
    wet = ~flow.continuation.inside
    error = (rise - k * potential[:, 0])[wet] / k
    assert np.abs(error).max() < 0.2  # beside the waterline, in the maximum norm
    assert np.sqrt(np.mean(error**2)) < 0.005


def test_a_hull_that_jumps_up_draws_the_surface_down(flow):
    # at high frequency the surface stays at phi = 0 and a heaving hemisphere is a doublet:
    # phi = -z/(2 r^3), so w = -1/(2 r^3) on z = 0 (Lamb, Hydrodynamics, art. 92); its added mass
    # is half the displaced one
    e = flow.elements
    heave = e.hull_table[:, 11:12]
    still = np.zeros((flow.sheet.size, 1))
    r = np.linalg.norm(flow.sheet.xy - CENTRE, axis=1)
    away = (r > 1.6) & (r < 6.0)
    found = flow.surface_flux(still, heave)[:, 0]
    assert np.abs(found + 0.5 / r**3)[away].max() < 0.003  # of .12 there
    potential = flow.hull_potential(still, heave)[:, 0]
    mass = (potential[e.hull].mean(axis=1) * e.hull_table[:, 11] * e.hull_table[:, 28]).sum()
    assert abs(mass) == pytest.approx(math.pi / 3, rel=0.005)


def test_the_flow_is_symmetric_and_no_mode_grows(flow):
    # kinetic energy is a quadratic form: symmetric, and positive but for the mean of the grid
    draw = np.random.default_rng(3)
    none = np.zeros((len(flow.elements.hull), 6))
    fields = flow.continuation(draw.standard_normal((flow.sheet.size, 6)))
    energy = fields.T @ (flow.mass @ flow.surface_flux(fields, none))
    assert np.abs(energy - energy.T).max() < 1e-10 * np.abs(energy).max()
    assert np.linalg.eigvalsh(energy).min() > 0.0


def test_free_waves_are_exact():
    sheet = Sheet(0.0, 0.0, 0.5, (64, 48), depth=3.0)
    open_water = GridFlow(sheet)
    kx, ky = 2 * math.pi * 3 / 32.0, 2 * math.pi * 2 / 24.0
    k = math.hypot(kx, ky)
    wave = np.cos(sheet.xy @ [kx, ky])[:, None]
    found = open_water.surface_flux(wave, np.zeros((0, 1)))
    assert np.abs(found - k * math.tanh(k * 3.0) * wave).max() < 1e-12
    # a step: phi+ - 2 phi + phi- = -g dt^2 flux = -2 (1 - cos w dt) phi
    step, gravity = 0.3, 9.81
    turn = step * math.sqrt(gravity * k * math.tanh(k * 3.0))
    mean = open_water.march(gravity, step).flux(wave, np.zeros((0, 1)))
    assert np.abs(gravity * step**2 * mean - 2 * (1 - math.cos(turn)) * wave).max() < 1e-12
