"""Narrow places: thin hulls, thin parts of them, and tight water between."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np

from bemwave.geometry.hull import Hull
from bemwave.geometry.layout import signed_area
from bemwave.geometry.surface_mesh import BoolArray, FloatArray, IntArray, SurfaceMesh, joined

FACING = math.cos(math.radians(30.0))  # panels whose planes meet at less than this face each other
TAPER = 10.0  # thicknesses along within which a tapering end, not a plate, doubles its own
_SAMPLES = 400  # along a waterline, at least
_ZOOMS, _KEPT = 3, 16  # by sixteen each, onto so many of the widest places


@dataclass(frozen=True)
class Narrow:
    """A narrow place.

    Attributes
    ----------
    size : thickness, or width of the gap, m.
    place : (x, y, z), m.
    names : of the body, or of the two bodies on either side.
    share : of the wetted area that is as narrow as was asked for.
    """

    size: float
    place: tuple[float, float, float]
    names: tuple[str, ...]
    share: float = 0.0


def waterplane_widths(hull: Hull) -> list[Narrow]:
    """Thickness of each waterplane of a hull: the diameter of the largest disc that fits into it.

    Pointed ends do not count, moonpools do.
    """
    polygons = hull.polygons()
    pools = [p for p in polygons if signed_area(p) < 0.0]
    widths = []
    for outer in (p for p in polygons if signed_area(p) > 0.0):
        diameter, (x, y) = largest_disc([outer, *(p for p in pools if _holds(outer, p[0]))])
        widths.append(Narrow(diameter, (x, y, 0.0), (hull.name,)))
    return widths


def largest_disc(loops: Sequence[FloatArray]) -> tuple[float, tuple[float, float]]:
    """Diameter and centre of the largest disc within polygons.

    Of the discs that touch the rim at samples of it, each as large as the rest of the rim allows;
    exact but for where the samples are: too small by at most a few 1e-4 of itself.

    Parameters
    ----------
    loops : (k, 2) each, m: the outer one counter-clockwise, holes clockwise.
    """
    start = np.concatenate(loops)
    edge = np.concatenate([np.roll(loop, -1, axis=0) - loop for loop in loops])
    length = np.hypot(*edge.T)
    start, edge, length = start[length > 0.0], edge[length > 0.0], length[length > 0.0]
    counts = np.ceil(_SAMPLES * length / length.sum()).astype(np.int64)
    owner = np.repeat(np.arange(len(edge)), counts)
    within = np.arange(len(owner)) - np.repeat(np.cumsum(counts) - counts, counts)
    along, step = (within + 0.5) / counts[owner], 1.0 / counts
    for _ in range(_ZOOMS):
        centre, radius = _touching_discs(start, edge, owner, along)
        widest = np.argsort(radius)[-_KEPT:]
        step = step / 16.0
        near = along[widest, None] + step[owner[widest], None] * np.arange(-8.0, 9.0)
        on_segment = (near > 0.0) & (near < 1.0)
        owner = np.broadcast_to(owner[widest, None], near.shape)[on_segment]
        along = near[on_segment]
    x, y = centre[widest[-1]].tolist()
    return 2.0 * float(radius[widest[-1]]), (x, y)


def _touching_discs(
    start: FloatArray, edge: FloatArray, owner: IntArray, along: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Centres (p, 2) and radii (p,) of the largest discs that touch the rim from within.

    start, edge : (s, 2) the rim's segments, what is within on their left; owner, along : (p,)
    segments touched, and where in them.
    """
    inward = np.stack([-edge[:, 1], edge[:, 0]], axis=1) / np.hypot(*edge.T)[:, None]
    touch, normal = start[owner] + along[:, None] * edge[owner], inward[owner]
    apart = start - touch[:, None]
    with np.errstate(divide="ignore", invalid="ignore"):
        # a disc that touches at p with the normal n and goes through q has (q - p)^2/(2 n.(q - p))
        to_corner = np.sum(apart**2, axis=2) / (2.0 * np.einsum("psc,pc->ps", apart, normal))
        # one that touches a line of the normal m, at a distance d from p, has d/(1 - n.m)
        distance = -np.einsum("psc,sc->ps", apart, inward)
        to_line = distance / (1.0 - normal @ inward.T)
        centre = touch[:, None] + to_line[..., None] * normal[:, None]
        foot = np.einsum("psc,sc->ps", centre - start, edge) / np.sum(edge**2, axis=1)
    to_corner[~(to_corner > 0.0)] = np.inf
    to_line[~((to_line > 0.0) & (foot > 0.0) & (foot < 1.0))] = np.inf
    to_line[np.arange(len(owner)), owner] = np.inf
    radius = np.minimum(to_corner, to_line).min(axis=1)
    return touch + radius[:, None] * normal, radius


def thin_member(hull: Hull, under: float, down_to: float = math.inf) -> Narrow | None:
    """The thinnest of a hull's members that are like plates: thin, and for long.

    Thickness is measured from each panel along its normal to the panel that faces it. Ends that
    taper, as bows do, are not taken for plates: there it doubles within ten thicknesses.

    Parameters
    ----------
    under : m; thicker ones do not count.
    down_to : depth of the water that is looked at, m.

    Returns
    -------
    None if there is none; `share` tells how much of the wetted area there is of them.
    """
    mesh = hull.mesh
    thickness, _ = _to_facing(mesh, mesh.normals, np.arange(len(mesh.triangles)))
    thin = np.flatnonzero((thickness < under) & _reaches_above(mesh, down_to))
    thin = thin[_stays_thin(mesh, thickness, thin, under)]
    if not len(thin):
        return None
    at = thin[np.argmin(thickness[thin])]
    share = float(mesh.areas[thin].sum() / mesh.areas.sum())
    return Narrow(float(thickness[at]), _triple(mesh.centroids[at]), (hull.name,), share)


def _to_facing(
    mesh: SurfaceMesh, directions: FloatArray, panels: IntArray
) -> tuple[FloatArray, IntArray]:
    """Distance of panels from the first one met along directions (m, 3), and which that is.

    Infinite if that does not face them, nan if none is met.
    """
    from bemwave.kernels.facing import first_hits

    least = 1e-9 * float(np.ptp(mesh.points, axis=0).max())
    distance, which = first_hits(mesh.centroids[panels], directions[panels], mesh.vertices, least)
    facing = np.sum(mesh.normals[panels] * mesh.normals[which], axis=1) < -FACING
    distance[~facing] = np.inf
    distance[which < 0] = np.nan
    return distance, which


def _stays_thin(
    mesh: SurfaceMesh, thickness: FloatArray, panels: IntArray, under: float
) -> BoolArray:
    """Which of the panels have none near by, on their side, that is twice as thick, or enough."""
    from bemwave.kernels.facing import stays_thin

    longest = np.linalg.norm(mesh.vertices - np.roll(mesh.vertices, 1, axis=1), axis=2).max(axis=1)
    thin = thickness[panels]
    reach = TAPER * thin + 2.0 * longest[panels]
    enough = np.minimum(2.0 * thin, under)
    found = stays_thin(mesh.centroids, mesh.normals, thickness, panels, enough, reach)
    return np.asarray(found)


def narrowest_gap(hulls: Sequence[Hull], down_to: float = math.inf) -> Narrow | None:
    """The narrowest water between bodies, between a body's parts, or in its pools.

    At the surface exactly, between the segments of waterlines; below it from panels along their
    normals to panels that face them, and between points of different hulls, so to the size of
    panels.

    Parameters
    ----------
    hulls : all of them.
    down_to : depth of the water that is looked at, m.

    Returns
    -------
    None if nothing faces anything.
    """
    if not hulls:
        return None
    found = [*_between_waterlines(hulls), *_across_water(hulls, down_to)]
    found += [gap for pair in combinations(hulls, 2) for gap in _between(*pair, down_to)]
    return min(found, key=lambda gap: gap.size, default=None)


def _between_waterlines(hulls: Sequence[Hull]) -> Iterator[Narrow]:
    loops = [(hull, polygon) for hull in hulls for polygon in hull.polygons()]
    for (one, a), (other, b) in combinations(loops, 2):
        pool = min(signed_area(a), signed_area(b)) < 0.0
        if one is other and pool:
            continue  # hull lies between them
        (near, at), (far, there) = _point_to_polygon(a, b), _point_to_polygon(b, a)
        size, (x, y) = (near, at) if near < far else (far, there)
        yield Narrow(size, (float(x), float(y), 0.0), _names(one, other))


def _point_to_polygon(points: FloatArray, polygon: FloatArray) -> tuple[float, FloatArray]:
    """Least distance of points (p, 2) from a polygon's edges, and which point has it."""
    edge = np.roll(polygon, -1, axis=0) - polygon
    offset = points[:, None] - polygon
    square = np.maximum(np.sum(edge**2, axis=1), np.finfo(float).tiny)
    foot = np.clip(np.einsum("psc,sc->ps", offset, edge) / square, 0.0, 1.0)
    apart = offset - foot[..., None] * edge
    distance = np.sqrt(np.sum(apart**2, axis=2).min(axis=1))
    at = int(np.argmin(distance))
    return float(distance[at]), points[at]


def _across_water(hulls: Sequence[Hull], down_to: float) -> Iterator[Narrow]:
    mesh = joined([hull.mesh for hull in hulls])
    panels = np.flatnonzero(_reaches_above(mesh, down_to))
    width, which = _to_facing(mesh, -mesh.normals, panels)
    if np.isfinite(width).any():
        i = int(np.nanargmin(width))
        one, other = (hulls[mesh.part[k]] for k in (panels[i], which[i]))
        yield Narrow(float(width[i]), _triple(mesh.centroids[panels[i]]), _names(one, other))


def _between(one: Hull, other: Hull, down_to: float) -> Iterator[Narrow]:
    from scipy.spatial import KDTree

    a, b = (hull.mesh.points[hull.mesh.points[:, 2] >= -down_to] for hull in (one, other))
    if len(a) and len(b):
        distance = np.asarray(KDTree(a).query(b)[0])
        at = int(np.argmin(distance))
        yield Narrow(float(distance[at]), _triple(b[at]), _names(one, other))


def _reaches_above(mesh: SurfaceMesh, depth: float) -> BoolArray:
    return np.asarray(mesh.vertices[:, :, 2].max(axis=1) > -depth)


def _holds(polygon: FloatArray, point: FloatArray) -> bool:
    """Whether a polygon (k, 2) has a point (2,) within, by the edges a line to its left meets."""
    a, b = polygon - point, np.roll(polygon, -1, axis=0) - point
    a, b = (end[(a[:, 1] > 0.0) != (b[:, 1] > 0.0)] for end in (a, b))
    left = a[:, 0] - a[:, 1] * (b[:, 0] - a[:, 0]) / (b[:, 1] - a[:, 1]) < 0.0
    return bool(left.sum() % 2)


def _names(one: Hull, other: Hull) -> tuple[str, ...]:
    return (one.name,) if one is other else (one.name, other.name)


def _triple(point: FloatArray) -> tuple[float, float, float]:
    x, y, z = point.tolist()
    return x, y, z
