"""Loads, stiffness and motions of a body against statics and rigid-body kinematics.

Archimedes' law and the closed forms of a box: Newman (1977), Marine Hydrodynamics, sect. 6.16.
The hull is a box 4 x 2 x 0.8 off the origin, turned by half a radian, its centre of mass off its
middle, so that no axis is like another.
"""

import math

import numpy as np
import pytest

from bemwave.bodies.loads import BodyLoads
from bemwave.bodies.modes import MODES, centre_on_earth, displacement, mode_shapes, stiffness
from bemwave.flow.elements import split
from bemwave.geometry import forms
from bemwave.geometry.boundary import boundary_mesh
from bemwave.geometry.hull import place_hull
from bemwave.geometry.patterns import grid_triangles
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.geometry.water_surface import fitted_water
from bemwave.waves import Sea, make_sea

LENGTH, BEAM, DRAUGHT = 4.0, 2.0, 0.8
DENSITY, G = 1025.0, 9.81
CENTRE = (0.3, -0.1, 0.25)  # of mass, body axes


@pytest.fixture(scope="module")
def hull():
    mesh = forms.box(LENGTH, BEAM, DRAUGHT, 0.5)
    return place_hull("barge", mesh, position=(1.0, 2.0), heading=0.5, centre_of_mass=CENTRE)


@pytest.fixture(scope="module")
def elements(hull):
    """Of the hull in open water, which here is one strip of cells round it."""
    waterline = hull.mesh.points[hull.waterlines[0]]
    count, middle = len(waterline), waterline.mean(axis=0)
    points = np.concatenate([waterline, middle + 1.5 * (waterline - middle)])
    cells = grid_triangles(1, count)  # on two rows that end where they begin
    row, column = np.divmod(cells, count + 1)
    water = SurfaceMesh.of_one_part(points, row * count + column % count, "water")
    water = fitted_water(water, hull.polygons(), "the test's water")
    return split(boundary_mesh(water, [hull]), False, (), math.inf)


@pytest.fixture(scope="module")
def panels(elements):
    return np.arange(len(elements.hull))


def on_body(hull, vector):
    """Components along the body's axes of a vector on earth."""
    return hull.place.rotation.T @ vector


def test_box_stiffness(hull):
    found = stiffness(hull, DENSITY, G) / (DENSITY * G)
    area, volume = LENGTH * BEAM, LENGTH * BEAM * DRAUGHT
    x, y = -CENTRE[0], -CENTRE[1]  # of the middle, from the centre of mass
    wanted = np.zeros((6, 6))
    wanted[2, 2:5] = area, area * y, -area * x
    down = -0.5 * DRAUGHT - CENTRE[2]
    wanted[3, 3] = LENGTH * BEAM**3 / 12 + area * y**2 + volume * down
    wanted[4, 4] = BEAM * LENGTH**3 / 12 + area * x**2 + volume * down
    wanted[3, 4] = wanted[4, 3] = -area * x * y
    wanted[3, 2], wanted[4, 2] = wanted[2, 3], wanted[2, 4]
    wanted[3, 5], wanted[4, 5] = -volume * x, -volume * y
    np.testing.assert_allclose(found, wanted, atol=1e-12)


def test_shapes_are_velocities_along_the_normal(elements, panels, hull):
    """Against where a small motion takes the panels' centroids."""
    shapes = mode_shapes(elements, panels, hull)
    centroid, normal = elements.hull_table[:, 24:27], elements.hull_table[:, 9:12]
    for mode in range(6):
        motion = np.zeros(6)
        motion[mode] = 1e-6
        there, back = (displacement(hull, sign * motion)(centroid) for sign in (1, -1))
        moved = (there - back) / 2e-6
        np.testing.assert_allclose(
            shapes[:, mode], (moved * normal).sum(axis=1), atol=1e-9, err_msg=MODES[mode]
        )


def test_motions_turn_about_the_centre_of_mass(hull):
    centre = centre_on_earth(hull)[None, :]
    turned = displacement(hull, np.array([0.0, 0.0, 0.0, 0.2, -0.3, 0.4]))
    np.testing.assert_allclose(turned(centre), centre, atol=1e-12)
    shifted = displacement(hull, np.array([0.5, -0.2, 0.1, 0.2, -0.3, 0.4]))
    moved = (shifted(centre) - centre)[0]
    np.testing.assert_allclose(on_body(hull, moved), [0.5, -0.2, 0.1], atol=1e-12)


def test_positive_roll_lifts_port_and_positive_pitch_sinks_the_bow(hull):
    axes, centre = hull.place.rotation, centre_on_earth(hull)
    bow, port = centre + axes[:, 0], centre + axes[:, 1]
    roll = displacement(hull, np.array([0, 0, 0, 0.1, 0, 0]))
    pitch = displacement(hull, np.array([0, 0, 0, 0, 0.1, 0]))
    yaw = displacement(hull, np.array([0, 0, 0, 0, 0, 0.1]))
    assert (roll(port[None])[0] - port)[2] > 0.09
    assert (pitch(bow[None])[0] - bow)[2] < -0.09
    assert on_body(hull, yaw(bow[None])[0] - bow)[1] > 0.09


@pytest.fixture(scope="module")
def loads(elements, panels, hull):
    return BodyLoads(elements, panels, hull, Sea.still(math.inf, DENSITY, G))


def solved(loads, elements, rate):
    """Load of a potential whose rate (nodes,) is given at all nodes."""
    return loads.solved(rate[: elements.nodes])


def test_hydrostatic_pressure_carries_the_displaced_water(loads, elements, hull):
    """Archimedes: -rho phi_t = -rho g z lifts by the weight of the water, at its middle."""
    z = elements.points[: elements.nodes, 2]
    found = solved(loads, elements, G * z)
    weight = DENSITY * G * LENGTH * BEAM * DRAUGHT
    middle = np.array([0.0, 0.0, -0.5 * DRAUGHT]) - CENTRE
    wanted = np.concatenate([[0.0, 0.0, weight], np.cross(middle, [0.0, 0.0, weight])])
    np.testing.assert_allclose(found, wanted, atol=1e-9 * weight)


def test_a_pressure_gradient_drives_the_body_as_it_would_the_water(loads, elements, hull):
    """Water that gains speed by a all over, phi_t = a.x: rho V a, as on the water displaced.

    Vertical load and the moments about level axes have a share of the waterplane, open on top.
    """
    gain = np.array([0.7, -0.4, 0.0])
    found = solved(loads, elements, elements.points[: elements.nodes] @ gain)
    force = DENSITY * LENGTH * BEAM * DRAUGHT * on_body(hull, gain)
    np.testing.assert_allclose(found[:2], force[:2], rtol=1e-9)
    middle = np.array([0.0, 0.0, -0.5 * DRAUGHT]) - CENTRE
    yaw = middle[0] * force[1] - middle[1] * force[0]
    assert found[5] == pytest.approx(yaw, rel=1e-9)


def test_the_load_of_very_long_waves_is_that_of_a_risen_sea(elements, panels, hull):
    """A crest of waves 4 km long lifts as if the sea stood higher: stiffness times height."""
    sea = make_sea(
        kind="regular", height=0.2, period=50.0, heading=30.0, depth=math.inf, density=DENSITY,
        gravity=G,
    )  # fmt: skip
    found = BodyLoads(elements, panels, hull, sea).incident(np.array([0.0]))[0]
    wanted = 0.1 * stiffness(hull, DENSITY, G)[:, 2]
    np.testing.assert_allclose(found[2:5], wanted[2:5], rtol=0.01)
