"""The water surface at rest: what is drawn of it, as a mesh."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from bemwave.case.output import Frames as Entry
from bemwave.errors import InputError
from bemwave.geometry.hull import Hull
from bemwave.geometry.inside import inside
from bemwave.geometry.outline import Rectangle
from bemwave.geometry.patterns import grid_triangles
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.geometry.topology import attached
from bemwave.geometry.water_surface import water_surface
from bemwave.geometry.waterplane import WATERPLANE, closed_bodies

Array = NDArray[np.float64]
Bools = NDArray[np.bool_]
Ints = NDArray[np.int64]

SKIRT_CELLS = 3  # squares or panels: how far the surface goes on under a hull
BLOCK = 512  # places whose distances are held at a time


@dataclass(frozen=True)
class Squares:
    """How a sheet's vertices stand in a rectangle of squares.

    corner, step : (x, y) of the first point and between points, m.
    count : points along x and y.
    rows : (n,) each vertex's number in the rectangle, x running first.
    """

    corner: tuple[float, float]
    step: tuple[float, float]
    count: tuple[int, int]
    rows: Ints


@dataclass(frozen=True)
class Sheet:
    """The surface at rest: what is drawn.

    mesh : SurfaceMesh, on z = 0, normals up.
    under_hull : (n,) vertices that lie inside a waterline.
    solved_at : (n, 2) where each vertex takes its solved part; NaN where it has none.
    squares : where the vertices stand, if they stand evenly.
    """

    mesh: SurfaceMesh
    under_hull: Bools
    solved_at: Array
    squares: Squares | None = None


def solver_sheet(
    water: SurfaceMesh, waterline: Literal["skirt", "cut"], hulls: Sequence[Hull] = ()
) -> Sheet:
    """Make a sheet of the solver's own water panels; waterlines are holes in it, or have skirts.

    Raises
    ------
    InputError : if a waterline is too narrow for a skirt.
    """
    lines = [polygon for hull in hulls for polygon in hull.polygons()]
    mesh = water
    for skirt in _skirts(hulls) if waterline == "skirt" else ():
        mesh, _ = attached(mesh, skirt, np.ones(len(skirt.points), dtype=bool))
    plan = mesh.points[:, :2].copy()
    under = np.arange(len(plan)) >= len(water.points)
    if under.any():
        plan[under] = nearest_on(lines, plan[under])
    return Sheet(mesh, under, plan)


def _skirts(hulls: Sequence[Hull]) -> list[SurfaceMesh]:
    return [_skirt(hull) for hull in hulls if hull.waterlines]


def _skirt(hull: Hull) -> SurfaceMesh:
    """What of a waterplane is near its waterline, in triangles as large as the edges there."""
    try:
        closed = closed_bodies([hull])
    except InputError as error:
        raise InputError(f'{error}, or write [frames] waterline = "cut"') from None
    plane = closed.keep(closed.in_part(WATERPLANE)).flipped()
    lines, plan = hull.polygons(), plane.points[:, :2]
    edge = np.median(
        [np.linalg.norm(e) for line in lines for e in np.diff(line, axis=0, append=line[:1])]
    )
    distance = np.linalg.norm(nearest_on(lines, plan) - plan, axis=1)
    near = (distance < SKIRT_CELLS * edge)[plane.triangles]
    return plane.keep(np.asarray(near.any(axis=1))).renamed("water")


def cut_sheet(
    centre: tuple[float, float],
    size: tuple[float, float],
    spacing: float,
    hulls: Sequence[Hull] = (),
    solved_in: Callable[[Array], Bools] | None = None,
) -> Sheet:
    """Make a sheet of triangles over a region, cut out at waterlines, whose points it shares.

    The arguments are those of `grid_sheet`.

    Raises
    ------
    InputError : if a waterline crosses the region's edge.
    """
    region = _rectangle(centre, size)
    mesh = water_surface(region, spacing, _within(region, hulls), spacing)
    plan = mesh.points[:, :2].copy()
    if solved_in is not None:
        plan[~solved_in(plan)] = np.nan
    return Sheet(mesh, np.zeros(len(plan), dtype=bool), plan)


def _rectangle(centre: tuple[float, float], size: tuple[float, float]) -> Rectangle:
    (x, y), (across, up) = centre, size
    return Rectangle(x - across / 2, x + across / 2, y - up / 2, y + up / 2)


def _within(region: Rectangle, hulls: Sequence[Hull]) -> list[Hull]:
    return [hull for hull in hulls if _reaches_into(hull, region)]


def refuse_waterlines(entry: Entry, hulls: Sequence[Hull]) -> None:
    """Raise InputError for waterlines that cannot be drawn as [frames] asks."""
    if entry.region is None and entry.waterline == "skirt":
        _skirts(hulls)
    if entry.region is not None and entry.waterline == "cut":
        _within(_rectangle(entry.region.centre, entry.region.size), hulls)


def _reaches_into(hull: Hull, region: Rectangle) -> bool:
    within = [region.contains(polygon) for polygon in hull.polygons()]
    if not any(part.any() for part in within):
        return False
    if not all(part.all() for part in within):
        raise InputError(
            f'[frames] region cuts through the waterline of "{hull.name}"; with waterline = "cut" '
            'it was expected wholly inside or outside: move the region, or write "skirt"'
        )
    return True


def grid_sheet(
    centre: tuple[float, float],
    size: tuple[float, float],
    spacing: float,
    hulls: Sequence[Hull] = (),
    solved_in: Callable[[Array], Bools] | None = None,
) -> Sheet:
    """Make a sheet of squares over a region, which goes on under hulls as a skirt.

    Parameters
    ----------
    centre, size : m
    spacing : m, largest side of the squares.
    hulls : sequence of Hull
        Vertices up to `SKIRT_CELLS` squares inside a waterline stay; each takes the solved part of
        the nearest waterline point.
    solved_in : callable, optional
        Tells which (x, y) (n, 2) lie in the water that is solved; the others carry the sea alone.
    """
    nx, ny = (max(1, math.ceil(side / spacing - 1e-9)) for side in size)
    x = centre[0] + np.linspace(-0.5, 0.5, nx + 1) * size[0]
    y = centre[1] + np.linspace(-0.5, 0.5, ny + 1) * size[1]
    plan = np.stack([g.ravel() for g in np.meshgrid(x, y)], axis=1)
    points = np.column_stack([plan, np.zeros(len(plan))])
    mesh = SurfaceMesh.of_one_part(points, grid_triangles(ny, nx), "water")
    under, solved_at = under_hulls(plan, hulls)
    distance = np.linalg.norm(solved_at - plan, axis=1)
    if solved_in is not None:
        solved_at[~solved_in(solved_at)] = np.nan
    seen = ~under | (distance < SKIRT_CELLS * spacing)
    shown = np.asarray(seen[mesh.triangles].any(axis=1))
    used = np.zeros(len(plan), dtype=bool)
    used[mesh.triangles[shown]] = True
    step = (float(size[0] / nx), float(size[1] / ny))
    squares = Squares((float(x[0]), float(y[0])), step, (nx + 1, ny + 1), np.flatnonzero(used))
    return Sheet(mesh.keep(shown), under[used], solved_at[used], squares)


def under_hulls(plan: Array, hulls: Sequence[Hull]) -> tuple[Bools, Array]:
    """Which places (n, 2) lie inside waterlines; the places (n, 2), those moved to the nearest."""
    under, moved = np.zeros(len(plan), dtype=bool), plan.copy()
    points = np.column_stack([plan, np.zeros(len(plan))])
    for hull in hulls:
        within = np.flatnonzero(inside(hull.mesh, points))
        if len(within) and hull.waterlines:
            under[within] = True
            moved[within] = nearest_on(hull.polygons(), plan[within])
    return under, moved


def nearest_on(loops: Sequence[Array], plan: Array) -> Array:
    """Points of closed lines nearest to each place, (n, 2)."""
    starts = np.concatenate(loops)
    along = np.concatenate([np.roll(loop, -1, axis=0) - loop for loop in loops])
    length = np.maximum(np.sum(along**2, axis=1), 1e-300)
    found = np.empty_like(plan)
    for start in range(0, len(plan), BLOCK):
        places = plan[start : start + BLOCK, None]
        share = np.clip(np.sum((places - starts) * along, axis=2) / length, 0.0, 1.0)
        on_line = starts + share[..., None] * along
        closest = np.argmin(np.sum((on_line - places) ** 2, axis=2), axis=1)
        found[start : start + BLOCK] = on_line[np.arange(len(closest)), closest]
    return found
