"""The water surface at rest: what is drawn of it, as a mesh."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from bemwave.errors import InputError, NotYetError
from bemwave.geometry.hull import Hull
from bemwave.geometry.inside import inside
from bemwave.geometry.outline import Rectangle
from bemwave.geometry.patterns import grid_triangles
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.geometry.water_surface import water_surface

Array = NDArray[np.float64]
Bools = NDArray[np.bool_]
Ints = NDArray[np.int64]

SKIRT_CELLS = 3  # how far the surface goes on under a hull
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


def solver_sheet(water: SurfaceMesh, waterline: Literal["skirt", "cut"]) -> Sheet:
    """Make a sheet of the solver's own water panels: its waterlines are holes."""
    if waterline == "skirt":
        raise NotYetError(
            'not yet: [frames] waterline = "skirt" without a region; give [frames] region and '
            'spacing, or write waterline = "cut"'
        )
    plan = water.points[:, :2].copy()
    return Sheet(water, np.zeros(len(plan), dtype=bool), plan)


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
    low, high = np.array(centre) - np.array(size) / 2, np.array(centre) + np.array(size) / 2
    region = Rectangle(low[0], high[0], low[1], high[1])
    seen = [hull for hull in hulls if _reaches_into(hull, region)]
    mesh = water_surface(region, spacing, seen, spacing)
    plan = mesh.points[:, :2].copy()
    if solved_in is not None:
        plan[~solved_in(plan)] = np.nan
    return Sheet(mesh, np.zeros(len(plan), dtype=bool), plan)


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
