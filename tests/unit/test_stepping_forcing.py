"""What drives the solved field: each rate is the slope of its value, and each value what it says.

Slopes by central differences, whose error is h^2/6 of the third derivative.
"""

import math

import numpy as np
import pytest

from bemwave.stepping.forcing import MovingParts, Oscillation, PressurePatch, Ramp, ScatteredSea
from bemwave.waves import make_sea

H = 1e-4
TIMES = np.array([0.3, 1.1, 2.7, 3.9, 4.6, 9.0])


def slope(value, times=TIMES):
    return (value(times + H) - value(times - H)) / (2.0 * H)


@pytest.mark.parametrize("length", [4.0, 0.0])
def test_ramp_and_its_derivatives(length):
    ramp = Ramp(length)
    np.testing.assert_allclose(ramp.rate(TIMES), slope(ramp.value), atol=1e-7)
    np.testing.assert_allclose(ramp.curvature(TIMES), slope(ramp.rate), atol=1e-7)
    assert np.all(ramp.value(np.array([-2.0, -0.1])) == 0.0)
    assert np.all(ramp.value(np.array([length, length + 5.0])) == 1.0)


def test_ramp_rises_smoothly_to_its_half_and_its_whole():
    ramp = Ramp(8.0)
    assert ramp.value(np.array([4.0]))[0] == pytest.approx(0.5)
    assert np.all(np.diff(ramp.value(np.linspace(0.0, 8.0, 50))) > 0.0)


@pytest.mark.parametrize("ramp", [Ramp(0.0), Ramp(4.0)])
def test_oscillation_and_its_derivatives(ramp):
    motion = Oscillation(0.7, 2.1, ramp)
    np.testing.assert_allclose(motion.velocity(TIMES), slope(motion.displacement), atol=1e-7)
    np.testing.assert_allclose(motion.acceleration(TIMES), slope(motion.velocity), atol=1e-7)
    late = np.array([4.0, 20.0])
    np.testing.assert_allclose(motion.displacement(late), 0.7 * np.sin(2.1 * late), atol=1e-14)


def test_moving_parts_add_up_over_their_shapes():
    shapes = np.array([[1.0, 0.5], [0.0, 2.0], [-1.0, 0.0]])
    motions = [Oscillation(0.3, 1.0, Ramp(2.0)), Oscillation(0.1, 3.0, Ramp(0.0))]
    moving = MovingParts(shapes, motions)
    wanted = sum(np.outer(s, m.velocity(TIMES)) for s, m in zip(shapes.T, motions, strict=True))
    np.testing.assert_allclose(moving.flux(TIMES), wanted, atol=1e-15)
    np.testing.assert_allclose(moving.rate(TIMES), slope(moving.flux), atol=1e-6)


@pytest.fixture(scope="module")
def scattered():
    """Three triangles with one point each, in a regular wave, and the points and normals."""
    sea = make_sea(
        kind="regular", height=0.4, period=3.0, heading=25.0, depth=5.0, density=1000.0, gravity=9.8
    )
    points = np.array([[0.0, 0.0, -0.5], [1.0, 2.0, -1.5], [-3.0, 0.5, 0.0]])
    normals = np.array([[1.0, 0.0, 0.0], [0.0, 0.6, -0.8], [0.0, 0.0, 1.0]])
    made = ScatteredSea(sea.at(points), normals, np.array([1.0]), Ramp(4.0))
    return made, sea, points, normals


def test_scattered_flux_is_minus_the_sea_s_after_the_ramp(scattered):
    made, sea, points, normals = scattered
    late = np.array([4.0, 6.3])
    through = np.einsum("tnc,nc->nt", sea.velocity(points, late), normals)
    np.testing.assert_allclose(made.flux(late), -through, atol=1e-13)
    assert np.all(made.flux(np.array([0.0])) == 0.0)


def test_scattered_flux_and_its_rate(scattered):
    made = scattered[0]
    np.testing.assert_allclose(made.rate(TIMES), slope(made.flux), atol=1e-6)


def test_a_patch_travels_with_its_speed():
    patch = PressurePatch(0.1, 0.5, (1.0, -2.0), (3.0, 0.5))
    centre = np.array([[1.0 + 3.0 * 2.0, -2.0 + 0.5 * 2.0]])
    assert patch.value(centre, 2.0)[0] == pytest.approx(0.1)
    beside = centre + np.array([0.0, 0.5])  # one width off
    assert patch.value(beside, 2.0)[0] == pytest.approx(0.1 * math.exp(-0.5))
    xy = np.array([[1.2, -2.1], [2.0, -1.5], [1.0, -2.0]])
    for time in (0.0, 0.2):
        found = (patch.value(xy, time + H) - patch.value(xy, time - H)) / (2.0 * H)
        np.testing.assert_allclose(patch.rate(xy, time), found, atol=1e-6)
