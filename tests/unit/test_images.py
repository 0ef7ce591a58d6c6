"""Images: water over a bed against its exact Green's function, walls against what mirrors do."""

import math

import numpy as np
import pytest
from scipy.special import k0

from bemwave.flow.images import Mirror, make_images


def potential(images, x, source):
    """G at points x (..., 3) of a source and its images."""
    distance = np.linalg.norm(x[..., None, :] - (images.signs * source + images.shifts), axis=-1)
    return (images.weights / distance).sum(axis=-1) / (4 * np.pi)


def slope(images, x, source, axis):
    """d(G)/d(axis) at points x, by the formula for 1/r."""
    away = x[..., None, :] - (images.signs * source + images.shifts)
    distance = np.linalg.norm(away, axis=-1)
    return -(images.weights * away[..., axis] / distance**3).sum(axis=-1) / (4 * np.pi)


def exact_half_space_over_bed(r, z, source_z, depth):
    """G that is zero on z = 0 and has no flux through the bed, by separation of variables.

    1/(pi h) sum over n of sin(k z) sin(k z') K0(k r), k = (n + 1/2) pi/h: the modes of depth that
    satisfy both conditions, and the radial solution that decays (as in Carslaw & Jaeger 1959,
    Conduction of Heat in Solids, art. 14.14, from memory).
    """
    k = (np.arange(3000) + 0.5) * np.pi / depth
    modes = np.sin(k * z[..., None]) * np.sin(k * source_z)
    return (modes * k0(k * r[..., None])).sum(axis=-1) / (np.pi * depth)


@pytest.mark.parametrize("depth", [1.0, 20.0])
@pytest.mark.parametrize("source_z", [-0.03, -0.4, -0.8, -1.0])
def test_open_water_over_a_bed(depth, source_z):
    images = make_images(depth, half_space=True)
    r, z = np.meshgrid(np.geomspace(0.02, 100.0, 60), np.linspace(-1.0, 0.0, 11))
    x = np.stack([r, np.zeros_like(r), z], axis=-1) * depth
    source = np.array([0.0, 0.0, source_z]) * depth
    exact = exact_half_space_over_bed(depth * r, depth * z, depth * source_z, depth)
    error = np.abs(potential(images, x, source) - exact).max() * depth
    # measured: 1.0e-8; flow.images claims 2e-8 of 1/depth
    assert error < 2e-8


def test_open_water_without_a_bed():
    images = make_images(math.inf, half_space=True)
    x = np.array([[0.3, -2.0, 0.0], [5.0, 1.0, 0.0]])
    assert np.abs(potential(images, x, np.array([0.1, 0.2, -0.7]))).max() < 1e-16


def test_free_space_has_no_images():
    images = make_images(math.inf, half_space=False)
    assert np.array_equal(images.signs, np.ones((1, 3)))
    assert not images.shifts.any()


def test_no_flux_through_the_bed_of_closed_water():
    images = make_images(3.0, half_space=False)
    x = np.array([[0.3, -2.0, -3.0], [5.0, 1.0, -3.0]])
    assert np.abs(slope(images, x, np.array([0.1, 0.2, -0.7]), 2)).max() < 1e-16


@pytest.mark.parametrize("half_space", [True, False])
@pytest.mark.parametrize("axis", ["x", "y"])
def test_no_flux_through_a_single_mirror(axis, half_space):
    images = make_images(3.0, half_space, (Mirror(axis, 1.5),))
    x = np.array([[1.5, 1.5, -2.0], [1.5, 1.5, -0.1]])
    flux = slope(images, x, np.array([0.1, 0.2, -0.7]), "xy".index(axis))
    assert np.abs(flux).max() < 1e-16


def test_channel_of_two_mirrors_is_periodic():
    """Images of a channel x = 0 to 2: sources at +-x' + 4 m, cut off symmetrically."""
    images = make_images(math.inf, True, (Mirror("x", 2.0), Mirror("x", 0.0)), span=2.0)
    source = np.array([0.3, 0.0, -0.5])
    places = np.sort((images.signs * source + images.shifts)[images.weights > 0, 0])
    expected = np.sort(np.concatenate([4.0 * np.arange(-6, 7) + s for s in (0.3, -0.3)]))
    np.testing.assert_allclose(places, expected, atol=1e-14)
    on_wall = np.array([[0.0, 0.4, -0.2], [2.0, 0.4, -0.2]])
    flux = slope(images, on_wall, source, 0)
    scale = slope(make_images(math.inf, True), on_wall, source, 0)
    # measured: 0 and 2e-5: what the images cut off at one end would give
    assert np.abs(flux / scale).max() < 1e-4


def test_first_image_is_the_source_itself():
    walls = (Mirror("x", 0.0), Mirror("x", 2.0), Mirror("y", 1.0))
    for half_space in (True, False):
        images = make_images(2.0, half_space, walls, span=2.0)
        assert images.signs[0].tolist() == [1.0, 1.0, 1.0]
        assert images.shifts[0].tolist() == [0.0, 0.0, 0.0]
        assert images.weights[0] == 1.0


def test_every_image_has_its_inverse():
    """The symmetric single layer needs it: S x + b is undone by S x - S b, of equal weight."""
    images = make_images(2.0, True, (Mirror("x", 0.0), Mirror("y", 1.0)))
    maps = {
        (*sign, *np.round(shift, 9)): weight
        for sign, shift, weight in zip(images.signs, images.shifts, images.weights, strict=True)
    }
    for sign, shift, weight in zip(images.signs, images.shifts, images.weights, strict=True):
        assert maps[(*sign, *np.round(-sign * shift, 9))] == weight


def test_curls_on_a_mirrored_sheet():
    """n x grad of a mirrored function on a mirrored triangle, worked out from its corners."""
    images = make_images(3.0, True, (Mirror("x", 0.5),))
    triangle = np.array([[0.1, 0.0, -1.0], [1.2, 0.3, -0.7], [0.4, 1.1, -1.5]])
    values = np.array([0.3, -1.0, 2.0])

    def curl(corners, values):
        edges = np.roll(corners, -2, axis=0) - np.roll(corners, -1, axis=0)
        normal = np.cross(corners[1] - corners[0], corners[2] - corners[0])
        return -(values @ edges) / np.linalg.norm(normal)

    plain = curl(triangle, values)
    for sign, shift, weight, factor in zip(
        images.signs, images.shifts, images.weights, images.curl_weights, strict=True
    ):
        order = [0, 1, 2] if np.prod(sign) > 0 else [0, 2, 1]
        mirrored = (triangle * sign + shift)[order]
        np.testing.assert_allclose(
            factor * plain, weight * curl(mirrored, values[order]), atol=1e-14
        )


def test_tails_of_a_lattice_of_images():
    """Against derivatives of 1/r summed over a thousand times as many cells outside the cut-off."""
    walls = (Mirror("x", 0.0), Mirror("x", 1.0), Mirror("y", -0.6), Mirror("y", 0.0))
    beyond = make_images(0.8, False, walls, span=1.0).beyond
    assert beyond.centre.tolist() == [0.0, -0.6, -0.8]
    m, n = np.meshgrid(np.arange(-400, 401), np.arange(-600, 601), indexing="ij")
    outside = (abs(m) > 6) | (abs(n) > 6)
    x, y = 2.0 * m[outside], 1.2 * n[outside]
    r = np.hypot(x, y)
    second = np.array([3 * x**2 / r**5 - 1 / r**3, 3 * y**2 / r**5 - 1 / r**3]).sum(axis=1)
    # measured: 2.5 %, of which 1.6 % are the cells farther away still; 1.5 % for the fourth
    np.testing.assert_allclose(beyond.second[:2], 8 / (8 * np.pi) * second, rtol=0.05)
    xxyy = (105 * x**2 * y**2 / r**9 - 15 * (x**2 + y**2) / r**7 + 3 / r**5).sum()
    xxxx, yyyy = ((105 * s**4 / r**9 - 90 * s**2 / r**7 + 9 / r**5).sum() for s in (x, y))
    fourth = 8 / (4 * np.pi) * np.array([-xxyy - yyyy, -xxxx - xxyy, xxyy])
    np.testing.assert_allclose(beyond.fourth, fourth, rtol=0.05)
