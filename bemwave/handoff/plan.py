"""Integrals over a box's plan: the solved water, and the waterplanes of bodies in it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from bemwave.geometry.hull import Hull
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.handoff.box import Array, Box


@dataclass(frozen=True)
class Waterplane:
    """The waterplane of a body; none for one under water.

    loops : closed lines of points (n, 2) on earth, m, counter-clockwise; holes clockwise.
    reference : (x, y) on earth of the point the body moves about, m.
    heading : rad, of the body's x axis.
    """

    loops: Sequence[Array]
    reference: tuple[float, float]
    heading: float = 0.0

    @classmethod
    def of(cls, hull: Hull) -> Waterplane:
        """The waterplane of a hull, about its centre of mass."""
        x, y = hull.place(hull.centre_of_mass)[:2]
        return cls(hull.polygons(), (float(x), float(y)), hull.heading)


def water_quadrature(box: Box, water: SurfaceMesh) -> tuple[Array, Array]:
    """Points and weights, m2, that integrate linear functions on triangles over the box's plan.

    Each triangle is clipped by the box; a linear function's integral over a polygon is its area
    times the value at its centroid, so the rule is exact for the solver's own elements.
    """
    return _clipped(box, water.vertices[:, :, :2])


def grid_quadrature(box: Box, spacing: float, hulls: Sequence[Hull]) -> tuple[Array, Array]:
    """Points and weights, m2, over the water in a box's plan, for fields that go on under hulls.

    Two points each way by Gauss in cells no larger than the spacing, (k spacing)^4/4320 of a wave;
    waterplanes are taken off again.
    """
    axes = []
    for side in box.size:
        count = max(1, int(np.ceil(side / spacing)))
        middle = (np.arange(count) + 0.5) / count - 0.5
        offset = 0.5 / (count * np.sqrt(3.0))
        axes.append(side * np.sort(np.concatenate([middle - offset, middle + offset])))
    places = np.stack([g.ravel() for g in np.meshgrid(*axes, indexing="ij")], axis=1)
    points = [box.to_earth(places)]
    weights = [np.full(len(places), box.area / len(places))]
    for hull in hulls:
        taken, area = waterplane_quadrature(box, Waterplane.of(hull))
        points.append(taken)
        weights.append(-area)
    return np.concatenate(points), np.concatenate(weights)


def waterplane_quadrature(box: Box, waterplane: Waterplane) -> tuple[Array, Array]:
    """Points and weights, m2, over the part of a waterplane inside the box's plan.

    Triangles from the middle of each loop to its edges, with their signs, cover it whatever its
    shape; each is quartered twice for smooth integrands.
    """
    fans = [np.empty((0, 3, 2))]
    for loop in waterplane.loops:
        middle = np.broadcast_to(loop.mean(axis=0), loop.shape)
        fans.append(np.stack([middle, loop, np.roll(loop, -1, axis=0)], axis=1))
    return _clipped(box, _quartered(_quartered(np.concatenate(fans))))


def _quartered(triangles: Array) -> Array:
    a, b, c = triangles[:, 0], triangles[:, 1], triangles[:, 2]
    ab, bc, ca = 0.5 * (a + b), 0.5 * (b + c), 0.5 * (c + a)
    parts = [(a, ab, ca), (ab, b, bc), (ca, bc, c), (ab, bc, ca)]
    return np.concatenate([np.stack(part, axis=1) for part in parts])


def _clipped(box: Box, triangles: Array) -> tuple[Array, Array]:
    """Centroids on earth and signed areas of triangles (m, 3, 2) clipped to the box."""
    half = 0.5 * np.asarray(box.size)
    local = box.to_box(triangles)
    low, high = local.min(axis=1), local.max(axis=1)
    whole = np.all((low >= -half) & (high <= half), axis=1)
    cut = ~whole & np.all((low < half) & (high > -half), axis=1)
    pieces = [_clip(triangle, half) for triangle in local[cut]]
    polygons = [*local[whole], *(piece for piece in pieces if len(piece) > 2)]
    measured = [_centroid(polygon) for polygon in polygons]
    centroids = np.array([c for c, _ in measured]).reshape(-1, 2)
    areas = np.array([a for _, a in measured])
    return box.to_earth(centroids), areas


def _clip(polygon: Array, half: Array) -> Array:
    """Clip a convex polygon to |x| <= half_x, |y| <= half_y (Sutherland & Hodgman 1974)."""
    for axis in (0, 1):
        for sign in (-1.0, 1.0):
            kept = []
            inside = half[axis] - sign * polygon[:, axis]
            for i in range(len(polygon)):
                j = (i + 1) % len(polygon)
                if inside[i] >= 0.0:
                    kept.append(polygon[i])
                if inside[i] * inside[j] < 0.0:
                    share = inside[i] / (inside[i] - inside[j])
                    kept.append(polygon[i] + share * (polygon[j] - polygon[i]))
            polygon = np.array(kept).reshape(-1, 2)
    return polygon


def _centroid(polygon: Array) -> tuple[Array, float]:
    """Centroid and signed area of a plane polygon, reckoned from its first corner."""
    corner = polygon[0]
    a, b = polygon[1:-1] - corner, polygon[2:] - corner
    areas = 0.5 * (a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0])
    total = float(areas.sum())
    if total == 0.0:
        return corner, 0.0
    return corner + (areas[:, None] * (a + b)).sum(axis=0) / (3.0 * total), total
