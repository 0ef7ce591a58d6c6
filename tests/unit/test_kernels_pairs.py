"""Integrals over pairs of triangles against closed form and against fine quadrature.

The reference integrates the potential of one triangle (itself tested at points) over the other,
cut into small ones towards whatever the two share, by a rule of high order.
"""

import numba
import numpy as np
import pytest

from bemwave.kernels import panels as kernel
from bemwave.kernels.points import potential_at, velocity_at

SIGNS, SHIFTS = np.ones((1, 3)), np.zeros((1, 3))
ONE = np.ones((1, 1))
CORNERS = np.array([[0, 1, 2]])
FINE = kernel._collapsed_rule(24)

A, B, C = [0.0, 0.0, 0.0], [1.0, 0.0, 0.0], [0.3, 0.8, 0.0]
# two triangles, and how near the single and the double layer must come (relative to the whole, and
# to the target's area); measured: 1.5e-3, 3e-4, 8e-4, 9e-6, 4e-6, 4e-8, 5e-6, 4e-8 for the single,
# 0, 1e-4, 6e-4, 4e-6, 5e-8, 1e-10, 4e-8, 2e-12 for the double layer
PAIRS = {
    "a common edge, flat": ([A, B, C], [B, A, [0.6, -0.9, 0.0]], 2e-3, 1e-15),
    "a common edge, folded": ([A, B, C], [B, A, [0.6, -0.1, 0.9]], 5e-4, 2e-4),
    "a common edge, sharp": ([A, B, C], [B, A, [0.5, 0.7, 0.3]], 1e-3, 1e-3),
    "a common corner": ([A, B, C], [B, [1.8, -0.2, 0.1], [1.7, 0.7, -0.2]], 2e-5, 1e-5),
    "one size apart": ([A, B, C], [[1.9, 0.2, 0.1], [2.8, 0.3, 0], [2.0, 1.1, 0.3]], 1e-5, 1e-7),
    "three sizes apart": ([A, B, C], [[3.9, 0.2, 0.1], [4.8, 0.3, 0], [4, 1.1, 0.3]], 1e-7, 1e-9),
    "six sizes apart": ([A, B, C], [[5.9, 0.2, 0.1], [6.8, 0.3, 0], [6, 1.1, 0.3]], 1e-5, 1e-7),
    "far away": ([A, B, C], [[30, 9.2, 4.1], [31, 9.3, 4], [30.2, 10.1, 4.3]], 1e-7, 1e-10),
}


def pair(name):
    return (kernel.pack(np.array([triangle])) for triangle in PAIRS[name][:2])


def quarters(triangle):
    a, b, c = triangle
    ab, bc, ca = 0.5 * (a + b), 0.5 * (b + c), 0.5 * (c + a)
    return [(a, ab, ca), (ab, b, bc), (ca, bc, c), (ab, bc, ca)]


def points_of(target, levels=2):
    """Points and weights of a fine rule on a target: (n, 3), (n,)."""
    parts = [target[0, :9].reshape(3, 3)]
    for _ in range(levels):
        parts = [q for part in parts for q in quarters(part)]
    x = (FINE[:, :3] @ np.array(parts)).reshape(-1, 3)
    return x, np.tile(FINE[:, 3], len(parts)) * target[0, 28] / len(parts)


def fine_single(target, source):
    x, weights = points_of(target)
    single, _ = potential_at(x, source, CORNERS, 3, SIGNS, SHIFTS, ONE[0])
    return weights @ single[:, 0]


def fine_double(target, source):
    x, weights = points_of(target)
    _, double = potential_at(x, source, CORNERS, 3, SIGNS, SHIFTS, ONE[0])
    return -weights @ double


def of_itself(triangle):
    """int int 1/r over a triangle: Eibert & Hansen (1995), IEEE Trans. Antennas Propag. 43:1499.

    -4/3 A^2 sum over the sides a of ln(1 - a/s)/a, s half the circumference.
    """
    sides = np.linalg.norm(np.roll(triangle, -1, axis=0) - triangle, axis=1)
    area = 0.5 * np.linalg.norm(np.cross(triangle[1] - triangle[0], triangle[2] - triangle[0]))
    return -4.0 / 3.0 * area**2 * np.sum(np.log(1.0 - 2.0 * sides / sides.sum()) / sides)


@pytest.mark.parametrize("seed", range(6))
def test_triangle_with_itself(seed):
    triangle = np.random.default_rng(seed).normal(size=(3, 3))
    table = kernel.pack(triangle[None])
    exact = of_itself(triangle) / (4 * np.pi)
    layer = kernel.single_layer_self(table, SIGNS, SHIFTS, ONE)[0, 0, 0]
    assert fine_single(table, table) == pytest.approx(exact, rel=1e-6)  # the reference itself
    # measured: 2.4e-3, always too much, while flat neighbours get too little
    assert layer == pytest.approx(exact, rel=3e-3)


@pytest.mark.parametrize("name", PAIRS)
def test_single_layer_of_a_pair(name):
    target, source = pair(name)
    layer = kernel.single_layer(target, source, SIGNS, SHIFTS, ONE)[0, 0, 0]
    assert layer == pytest.approx(fine_single(target, source), rel=PAIRS[name][2])


@pytest.mark.parametrize("name", PAIRS)
def test_double_layer_of_a_pair(name):
    target, source = pair(name)
    layer = kernel.double_layer(target, source, CORNERS, 3, SIGNS, SHIFTS, ONE[0])[0]
    limit = PAIRS[name][3] * target[0, 28]
    np.testing.assert_allclose(layer, fine_double(target, source), atol=limit)


def closed_surface(seed=1):
    """A dented octahedron, each face cut in four: points (18, 3), corners (32, 3), outward."""
    rng = np.random.default_rng(seed)
    tips = np.vstack([np.eye(3), -np.eye(3)]) * rng.uniform(0.7, 1.4, size=(6, 1))
    faces = [(a, b, c) for a in (0, 3) for b in (1, 4) for c in (2, 5)]
    vertices = []
    for number, (a, b, c) in enumerate(faces):
        even = bin(number).count("1") % 2 == 0
        vertices += quarters(tips[[a, b, c]] if even else tips[[a, c, b]])
    points, corners = np.unique(np.round(np.array(vertices).reshape(-1, 3), 12), axis=0,
                                return_inverse=True)  # fmt: skip
    return points * (1 + 0.1 * rng.normal(size=(len(points), 1))), corners.reshape(-1, 3)


def test_single_layer_is_symmetric_and_positive_definite():
    points, corners = closed_surface()
    table = kernel.pack(points[corners])
    layer = kernel.single_layer_self(table, SIGNS, SHIFTS, ONE)[0]
    assert np.array_equal(layer, layer.T)
    whole = kernel.single_layer(table, table, SIGNS, SHIFTS, ONE)[0]
    # measured: equal here; the order of sums may differ
    np.testing.assert_allclose(whole, layer, atol=1e-14 * layer.max())
    half = kernel.single_layer(table[:9], table[9:], SIGNS, SHIFTS, ONE)[0]
    back = kernel.single_layer(table[9:], table[:9], SIGNS, SHIFTS, ONE)[0]
    np.testing.assert_allclose(half, back.T, atol=1e-14 * layer.max())
    values = np.linalg.eigvalsh(layer)
    assert values[0] > 0.0


def test_uniform_dipoles_on_a_closed_surface():
    """Gauss: their potential is -1 inside and 0 outside, so -1/2 in the mean over a panel."""
    points, corners = closed_surface()
    table = kernel.pack(points[corners])
    layer = kernel.double_layer(table, table, corners, len(points), SIGNS, SHIFTS, ONE[0])
    # measured: 1.3e-5 in the worst panel
    np.testing.assert_allclose(layer.sum(axis=1), -0.5 * table[:, 28], rtol=1e-4)
    inside, outside = np.array([[0.05, 0.1, -0.1]]), np.array([[1.0, 0.9, 0.8]])
    for x, exact in ((inside, 1.0), (outside, 0.0)):
        _, double = potential_at(x, table, corners, len(points), SIGNS, SHIFTS, ONE[0])
        assert double.sum() == pytest.approx(exact, abs=1e-12)


IMAGES = (
    np.array([[1.0, 1, 1], [1, 1, -1], [-1, 1, 1], [-1, 1, -1], [1, -1, 1]]),
    np.array([[0.0, 0, 0], [0, 0, 3.2], [-4.4, 0, 0], [-4.4, 0, 3.2], [0, 2.8, 0]]),
    np.array([1.0, -1.0, 1.0, -1.0, 0.5]),
)


def reflected(points, corners, sign, shift):
    """The image as a mesh of its own: mirrored points, corners turned round."""
    order = corners if np.prod(sign) > 0 else corners[:, ::-1]
    return points * sign + shift, order


def test_images_stand_for_reflected_triangles():
    points, corners = closed_surface()
    table = kernel.pack(points[corners])
    other = kernel.pack(closed_surface(2)[0][corners] + [0.2, 0.1, -3.0])
    x = np.array([[0.1, 0.2, -4.0], [1.5, 0.3, -2.0]])
    nodes = len(points)
    opposite = np.roll(points[corners], -2, axis=1) - np.roll(points[corners], -1, axis=1)
    curls = -opposite / (2 * table[:, 28, None, None])
    found = (
        kernel.single_layer(other, table, *IMAGES[:2], IMAGES[2][:, None])[0],
        kernel.double_layer(other, table, corners, nodes, *IMAGES),
        *potential_at(x, table, corners, nodes, *IMAGES),
        *velocity_at(x, table, corners, curls, nodes, *IMAGES),
    )
    exact = [0.0] * 6
    for sign, shift, weight in zip(*IMAGES, strict=True):
        moved, turned = reflected(points, corners, sign, shift)
        image = kernel.pack(moved[turned])
        edges = np.roll(moved[turned], -2, axis=1) - np.roll(moved[turned], -1, axis=1)
        its_curls = -edges / (2 * image[:, 28, None, None])
        parts = (
            kernel.single_layer(other, image, SIGNS, SHIFTS, ONE)[0],
            kernel.double_layer(other, image, turned, nodes, SIGNS, SHIFTS, ONE[0]),
            *potential_at(x, image, turned, nodes, SIGNS, SHIFTS, ONE[0]),
            *velocity_at(x, image, turned, its_curls, nodes, SIGNS, SHIFTS, ONE[0]),
        )
        exact = [total + weight * part for total, part in zip(exact, parts, strict=True)]
    for one, other_one in zip(found, exact, strict=True):
        # measured: 5e-15
        np.testing.assert_allclose(one, other_one, atol=1e-13 * np.abs(other_one).max())


@pytest.fixture
def threads():
    before = numba.get_num_threads()
    yield numba.set_num_threads
    numba.set_num_threads(before)


@pytest.mark.skipif(numba.config.NUMBA_NUM_THREADS < 2, reason="one core, one thread")
def test_results_do_not_depend_on_the_number_of_threads(threads):
    points, corners = closed_surface()
    table = kernel.pack(points[corners])
    x = np.random.default_rng(0).normal(size=(7, 3))
    curls = np.random.default_rng(1).normal(size=(len(corners), 3, 3))
    nodes = len(points)

    def everything():
        columns = np.column_stack([IMAGES[2], IMAGES[2] ** 2])
        return (
            kernel.single_layer(table[:5], table, *IMAGES[:2], columns),
            kernel.single_layer_self(table, *IMAGES[:2], columns),
            kernel.double_layer(table, table, corners, nodes, *IMAGES),
            *potential_at(x, table, corners, nodes, *IMAGES),
            *velocity_at(x, table, corners, curls, nodes, *IMAGES),
        )

    threads(1)
    alone = everything()
    threads(2)
    for one, two in zip(alone, everything(), strict=True):
        assert np.array_equal(one, two)
