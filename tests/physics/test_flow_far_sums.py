"""Sums over many panels far away, against a fast multipole library (fmm3dpy)."""

import numpy as np
import pytest

from bemwave.geometry.forms import sphere
from bemwave.kernels import panels as kernel
from bemwave.kernels.points import potential_at, velocity_at

SIGNS, SHIFTS, WEIGHT = np.ones((1, 3)), np.zeros((1, 3)), np.ones(1)


@pytest.fixture(scope="module")
def scene():
    """A submerged sphere of uneven sources, packed; points two radii and more from its centre."""
    mesh = sphere(1.0, 3.0, 0.12)
    rng = np.random.default_rng(5)
    table = kernel.pack(mesh.vertices)
    strength = 1.0 + rng.random(len(table))
    turn = rng.normal(size=(200, 3))
    turn /= np.linalg.norm(turn, axis=1)[:, None]
    points = [0.0, 0.0, -3.0] + turn * rng.uniform(2.0, 12.0, size=(200, 1))
    return mesh, table, strength, points


def by_multipoles(table, strength, points):
    """Potential and gradient of the sources as seven charges a triangle (Dunavant's rule)."""
    import fmm3dpy

    corners = table[:, :9].reshape(-1, 3, 3)
    places = np.einsum("qj,mjc->qmc", kernel.SEVEN[:, :3], corners).reshape(-1, 3)
    charges = np.outer(kernel.SEVEN[:, 3], strength * table[:, 28]).ravel()
    out = fmm3dpy.lfmm3d(
        eps=1e-9, sources=places.T.copy(), charges=charges, targets=points.T.copy(), pgt=2
    )
    # its scale of the kernel, 1/r or 1/(4 pi r), asked of the library itself
    one = fmm3dpy.l3ddir(
        sources=np.zeros((3, 1)), charges=np.ones(1), targets=np.array([[1.0], [0.0], [0.0]]), pgt=1
    )
    return out.pottarg / one.pottarg[0], out.gradtarg.T / one.pottarg[0]


def test_uniform_sources(scene):
    mesh, table, strength, points = scene
    potential, gradient = by_multipoles(table, strength, points)
    nodes = len(mesh.points)
    curls = np.zeros((len(table), 3, 3))
    around = (mesh.triangles, nodes, SIGNS, SHIFTS, WEIGHT)
    single, _ = potential_at(points, table, *around)
    velocity, _ = velocity_at(points, table, mesh.triangles, curls, *around[1:])
    error = np.abs(4 * np.pi * single @ strength / potential - 1.0).max()
    off = 4 * np.pi * velocity @ strength - gradient
    slope_error = (np.linalg.norm(off, axis=1) / np.linalg.norm(gradient, axis=1)).max()
    # measured: 2e-8 and 2e-7
    assert error < 1e-4
    assert slope_error < 1e-4


def test_single_layer_far_apart(scene):
    """Between the sphere and a patch of panels 4 radii away: their means over the panels."""
    _, table, strength, _ = scene
    patch = table[:50, :9].reshape(-1, 3, 3) * 0.5 + [4.0, 1.0, -2.0]
    target = kernel.pack(patch)
    layer = kernel.single_layer(target, table, SIGNS, SHIFTS, WEIGHT[:, None])[0] @ strength
    places = np.einsum("qj,mjc->mqc", kernel.SEVEN[:, :3], patch)
    potential, _ = by_multipoles(table, strength, places.reshape(-1, 3))
    exact = potential.reshape(len(patch), -1) @ kernel.SEVEN[:, 3] * target[:, 28] / (4 * np.pi)
    error = np.abs(layer / exact - 1.0).max()
    # measured: 3e-8
    assert error < 1e-4
