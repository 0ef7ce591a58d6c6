"""Groundwork of route "grid": maps between a gridded surface and a hull, against closed forms."""

import math

import numpy as np
import pytest

from bemwave.flow.grid import GridFlow
from bemwave.flow.sheet import Sheet
from bemwave.geometry.forms import sphere
from bemwave.geometry.hull import place_hull

SPACING, NODES = 1 / 6, 96


@pytest.fixture(scope="module")
def flow():
    """A hemisphere of radius 1, its centre off the nodes."""
    hull = place_hull("ball", sphere(1.0, 0.0, 0.1), position=(-0.27 * SPACING, -0.31 * SPACING))
    corner = -NODES * SPACING / 2
    return GridFlow(Sheet(corner, corner, SPACING, (NODES, NODES)), [hull])


@pytest.mark.slow
@pytest.mark.parametrize("waves", [3, 6])
def test_a_wave_on_the_surface_reaches_the_hull(flow, waves):
    # exp(kz) cos(kx) is harmonic: its flux through panels and its potential at nodes
    e, k = flow.elements, 2 * math.pi * waves / (NODES * SPACING)
    potential = np.cos(k * flow.sheet.xy[:, :1])
    x, z = e.hull_table[:, 24], e.hull_table[:, 26]
    normal = e.hull_table[:, 9:12]
    slope = np.column_stack([-np.sin(k * x), 0 * x, np.cos(k * x)]) * k * np.exp(k * z)[:, None]
    flux = flow._coupling.flux(potential)[:, 0]
    # at the middle of a panel instead of over it: (k panel)^2/24 apart
    assert np.abs(flux - (slope * normal).sum(axis=1)).max() < 4e-3 * k
    found = flow._coupling.potential(potential)[:, 0]
    expected = np.exp(k * e.points[:, 2]) * np.cos(k * e.points[:, 0])
    assert np.abs(found - expected).max() < 2e-3


@pytest.mark.slow
def test_a_hull_that_jumps_up_draws_the_surface_down(flow):
    # at high frequency the surface stays at phi = 0 and a heaving hemisphere is a doublet:
    # phi = -z/(2 r^3), so w = -1/(2 r^3) on z = 0 (Lamb, Hydrodynamics, art. 92)
    e = flow.elements
    heave = e.hull_table[:, 11:12]
    found = flow._coupling.rise(heave, flow._hull_response @ heave)[:, 0]
    r = np.linalg.norm(flow.sheet.xy - [-0.27 * SPACING, -0.31 * SPACING], axis=1)
    wet = ~flow.inside
    error = np.abs(found[wet] + 0.5 / r[wet] ** 3)
    assert error.max() < 0.02 * 0.5
    assert error[r[wet] > 1.2].max() < 0.003 * 0.5


def test_free_waves_are_exact():
    sheet = Sheet(0.0, 0.0, 0.5, (64, 48), depth=3.0)
    open_water = GridFlow(sheet, [])
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
