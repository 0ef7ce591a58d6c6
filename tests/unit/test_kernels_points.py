"""Potentials and velocities of single triangles at points, against quadrature by substitution.

The reference integrates over the three triangles between a point's foot on the plane and each
edge, with substitutions that take out the near-singularities: distance along the edge by a sinh
of the foot's distance from it, radius by a sinh of the height (after Johnston & Elliott 2005,
Int. J. Numer. Methods Eng. 62:564). Nothing of it is shared with the closed forms.
"""

import numpy as np
import pytest

from bemwave.kernels import panels as kernel
from bemwave.kernels.points import DISTANT, potential_at, velocity_at

IDENTITY = (np.ones((1, 3)), np.zeros((1, 3)), np.ones(1))
CORNERS = np.array([[0, 1, 2]])
NODES, WEIGHTS = np.polynomial.legendre.leggauss(80)


def integral(integrand, x, triangle):
    """Integral of integrand(y, hats), (..., k), over a triangle seen from the point x."""
    a, b, c = triangle
    normal = np.cross(b - a, c - a)
    normal /= np.linalg.norm(normal)
    height = (x - a) @ normal
    foot = x - height * normal
    scale = max(abs(height), 1e-3 * np.linalg.norm(b - a))
    to_hats = np.linalg.inv(np.column_stack([a, b, c]) - foot[:, None] + normal[:, None])
    total = 0.0
    for p, q in ((a, b), (b, c), (c, a)):
        along = (q - p) / np.linalg.norm(q - p)
        distance = np.cross(p - foot, along) @ normal
        if abs(distance) < 1e-12:
            continue
        nearest = p - ((p - foot) @ along) * along
        start, end = (np.arcsinh((s - foot) @ along / abs(distance)) for s in (p, q))
        t = 0.5 * (start + end) + 0.5 * (end - start) * NODES
        place = nearest + (abs(distance) * np.sinh(t))[:, None] * along - foot
        far = np.linalg.norm(place, axis=1)
        top = np.arcsinh(far / scale)
        u = 0.5 * top[:, None] * (NODES + 1.0)
        radius = scale * np.sinh(u)
        y = (radius / far[:, None])[..., None] * place[:, None] + foot
        # area element: radius d(radius) d(angle), d(angle) = distance d(along) / far^2
        angle = 0.5 * (end - start) * WEIGHTS * distance * np.abs(distance) * np.cosh(t) / far**2
        element = angle[:, None] * radius * scale * np.cosh(u) * 0.5 * top[:, None] * WEIGHTS
        hats = (y - foot + normal) @ to_hats.T
        total = total + np.tensordot(element, integrand(y, hats), axes=2)
    return total


def attraction(x):
    """The gradient of 1/r at x."""

    def field(y, _):
        r = x - y
        return -r / np.linalg.norm(r, axis=-1)[..., None] ** 3

    return field


def triangles():
    return np.random.default_rng(7).normal(size=(5, 3, 3))


def point(kind, triangle, rng):
    a, b, c = triangle
    normal = kernel.pack(triangle[None])[0, 9:12]
    inside = rng.dirichlet(np.ones(3)) @ triangle
    return {
        "far": inside + 4.0 * normal + a,
        "near": inside + 0.05 * normal,
        "very near": inside - 1e-3 * normal,
        "edge-on": 0.3 * a + 0.7 * b + 1e-2 * normal,
        "on the triangle": inside,
        "in its plane": 1.7 * a - 0.5 * b - 0.2 * c,
        "on the line of an edge": 1.6 * a - 0.6 * b,
    }[kind]


KINDS = ("far", "near", "very near", "edge-on", "on the triangle", "in its plane",
         "on the line of an edge")  # fmt: skip


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("number", range(5))
def test_potential_of_a_uniform_triangle(number, kind):
    triangle = triangles()[number]
    x = point(kind, triangle, np.random.default_rng(number))
    exact = integral(lambda y, _: 1.0 / np.linalg.norm(x - y, axis=-1), x, triangle)
    single, _ = potential_at(x[None], kernel.pack(triangle[None]), CORNERS, 3, *IDENTITY)
    # measured: 7e-15
    assert single[0, 0] == pytest.approx(exact / (4 * np.pi), rel=1e-12)


@pytest.mark.parametrize("kind", ["far", "near", "very near", "edge-on"])
@pytest.mark.parametrize("number", range(5))
def test_potential_of_linear_dipoles(number, kind):
    triangle = triangles()[number]
    table = kernel.pack(triangle[None])
    x = point(kind, triangle, np.random.default_rng(number))

    def dipoles(y, hats):
        r = x - y
        return hats * ((r @ table[0, 9:12]) / np.linalg.norm(r, axis=-1) ** 3)[..., None]

    exact = -integral(dipoles, x, triangle) / (4 * np.pi)
    _, double = potential_at(x[None], table, CORNERS, 3, *IDENTITY)
    # measured: 6e-15; the whole is a share of the solid angle, at most 1/2
    np.testing.assert_allclose(double[0], exact, atol=1e-12)


@pytest.mark.parametrize("kind", ["on the triangle", "in its plane", "on the line of an edge"])
def test_dipoles_have_no_effect_in_their_own_plane(kind):
    for number, triangle in enumerate(triangles()):
        x = point(kind, triangle, np.random.default_rng(number))
        _, double = potential_at(x[None], kernel.pack(triangle[None]), CORNERS, 3, *IDENTITY)
        assert np.abs(double).max() < 1e-15


@pytest.mark.parametrize("kind", ["far", "near", "very near", "edge-on"])
@pytest.mark.parametrize("number", range(5))
def test_velocity_of_a_uniform_triangle(number, kind):
    triangle = triangles()[number]
    table = kernel.pack(triangle[None])
    x = point(kind, triangle, np.random.default_rng(number))
    exact = integral(attraction(x), x, triangle) / (4 * np.pi)
    single, _ = velocity_at(x[None], table, CORNERS, np.zeros((1, 3, 3)), 3, *IDENTITY)
    # measured: 2e-13
    size = np.linalg.norm(exact)
    np.testing.assert_allclose(single[0, :, 0], exact, atol=1e-10 * size)


def test_far_away_by_three_points():
    """Beyond DISTANT radii a rule of second degree: what is left falls as the cube of distance."""
    rng = np.random.default_rng(3)
    for _ in range(20):
        triangle = rng.normal(size=(3, 3))
        table = kernel.pack(triangle[None])
        turn = rng.normal(size=3)
        away = 1.001 * DISTANT * table[0, 27] * turn / np.linalg.norm(turn)
        x = table[0, 24:27] + away
        exact = integral(lambda y, hats, x=x: 1.0 / np.linalg.norm(x - y, axis=-1), x, triangle)
        single, _ = potential_at(x[None], table, CORNERS, 3, *IDENTITY)
        # measured: 1.1e-5
        assert single[0, 0] == pytest.approx(exact / (4 * np.pi), rel=2e-5)
        pull = integral(attraction(x), x, triangle) / (4 * np.pi)
        single, _ = velocity_at(x[None], table, CORNERS, np.zeros((1, 3, 3)), 3, *IDENTITY)
        # measured: 5e-5
        assert np.linalg.norm(single[0, :, 0] - pull) < 1e-4 * np.linalg.norm(pull)


@pytest.mark.parametrize("number", range(4))
def test_velocity_of_a_dipole_sheet(number):
    """A hat on a crumpled fan of five triangles, zero on its rim, against the dipoles' own field.

    The gradient of (r.n)/r^3 is n/r^3 - 3 r (r.n)/r^5.
    """
    rng = np.random.default_rng(number)
    turn = 2 * np.pi * np.arange(5) / 5
    rim = np.column_stack([np.cos(turn), np.sin(turn), 0.3 * rng.normal(size=5)])
    points = np.vstack([[0.1, -0.1, 0.2], rim])
    corners = np.array([[0, 1 + k, 1 + (k + 1) % 5] for k in range(5)])
    table = kernel.pack(points[corners])
    opposite = points[corners[:, 2]] - points[corners[:, 1]]
    curls = np.zeros((5, 3, 3))
    curls[:, 0] = -opposite / (2 * table[:, 28, None])
    x = np.array([0.3, 0.2, (0.4, -0.3, 1.5, -6.0)[number]])

    def dipoles(normal):
        def field(y, hats):
            r = x - y
            distance = np.linalg.norm(r, axis=-1)[..., None]
            slope = normal / distance**3 - 3 * r * (r @ normal)[..., None] / distance**5
            return -hats[..., :1] * slope

        return field

    normals = table[:, 9:12]
    exact = sum(integral(dipoles(normals[k]), x, points[corners[k]]) for k in range(5))
    _, double = velocity_at(x[None], table, corners, curls, 6, *IDENTITY)
    size = np.linalg.norm(exact) / (4 * np.pi)
    # measured: 1e-13
    np.testing.assert_allclose(double[0, :, 0], exact / (4 * np.pi), atol=1e-10 * size)
