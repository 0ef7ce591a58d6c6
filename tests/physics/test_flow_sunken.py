"""Bodies wholly under water: their mean potential is not seen by curls and is set apart."""

import math

import numpy as np
import pytest

from bemwave.flow.grid import body_elements
from bemwave.flow.images import make_images
from bemwave.flow.panels import PanelFlow, forms
from bemwave.flow.samplers import PanelSamplers
from bemwave.flow.state import SurfaceState
from bemwave.geometry.boundary import boundary_mesh
from bemwave.geometry.forms import sphere
from bemwave.geometry.hull import place_hull
from bemwave.geometry.outline import Rectangle
from bemwave.geometry.water_surface import structured_water
from bemwave.geometry.waterplane import closed_bodies


@pytest.mark.parametrize(("axis", "factor"), [(0, 1.5), (2, 3.0)])
def test_added_mass_of_a_sphere_under_still_water_at_high_frequency(axis, factor):
    # 1/2 (1 - factor (a/2f)^3) of the displaced mass, f = 2a: the doublet and its first image of
    # opposite sign (Lamb, Hydrodynamics, art. 138, for a wall; from memory, sign changed here);
    # the next image changes it by (a/2f)^6, 2e-4
    elements = body_elements(closed_bodies([place_hull("ball", sphere(1.0, 2.0, 0.2))]))
    energy, given = forms(elements, make_images(math.inf, True))
    normal = elements.hull_table[:, 9 + axis]
    potential = -np.linalg.solve(energy, given @ normal)
    mass = normal @ (elements.shares(elements.hull, elements.hull_table) @ potential)
    assert mass / (4 / 3 * math.pi) == pytest.approx(0.5 * (1 - factor / 64), rel=4e-3)


@pytest.mark.parametrize("closed", [False, True])
def test_potential_on_a_sunken_body_continues_the_one_in_the_water(closed):
    """A wave passing a body that lets it through: on the body the potential is the wave's own."""
    depth, k = 3.0, 1.2
    ball = place_hull("ball", sphere(0.6, 1.6, 0.2))
    half = 4.0
    walls = ("x_min", "x_max", "y_min", "y_max") if closed else ()
    water = structured_water(Rectangle(-half, half, -half, half), 0.4)
    mesh = boundary_mesh(water, [ball], walls, depth)
    flow = PanelFlow(mesh, depth, closed=closed)
    e = flow.elements
    # a standing wave of the tank, uniform in y; in open water it only has to be local
    k = math.pi * 2 / (2 * half) if closed else k
    place = e.points[: e.free]
    shape = np.cos(k * (place[:, 0] + half)) if closed else np.exp(-0.5 * (place**2).sum(axis=1))
    still = np.zeros(len(e.hull))
    without = PanelFlow(boundary_mesh(water, [], walls, depth), depth, closed=closed)
    surface = without.surface_flux(shape, np.zeros(len(without.elements.hull)))
    hull = without.hull_potential(shape, np.zeros(len(without.elements.hull)))
    none = np.zeros(len(without.elements.hull))
    state = SurfaceState(
        0.0, shape, shape, shape, surface, surface, hull, hull, none, none
    )  # fmt: skip
    samplers = PanelSamplers(without.mesh, depth, closed=closed, density=1.0)
    panels = np.flatnonzero(mesh.part[e.hull_triangles] == mesh.part_names.index("ball"))
    through = samplers.sampler(e.hull_table[panels, 24:27]).velocity(state)
    flux = still.copy()
    flux[panels] = (through * e.hull_table[panels, 9:12]).sum(axis=1)
    nodes = np.unique(e.hull[panels])
    found = flow.hull_potential(shape, flux)[nodes - e.free]
    expected = -samplers.sampler(e.points[nodes]).pressure(state)
    assert np.abs(found - expected).max() < 0.01 * np.abs(shape).max()
