"""The water surface as a mesh that rises and falls: where its vertices stand and how they move."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Literal, Protocol

import numpy as np
from numpy.typing import NDArray

from bemwave.errors import NotYetError
from bemwave.flow.state import SurfaceState
from bemwave.geometry.hull import Hull
from bemwave.geometry.inside import inside
from bemwave.geometry.patterns import grid_triangles
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.waves import Sea

Array = NDArray[np.float64]
Bools = NDArray[np.bool_]

SKIRT_CELLS = 3  # how far the surface goes on under a hull
BLOCK = 8192  # places whose maps are built at a time


class SurfaceMaps(Protocol):
    """The solved field on still water at fixed (x, y)."""

    def elevation(self, state: SurfaceState) -> Array:
        """Elevation (n,), m."""

    def velocity(self, state: SurfaceState) -> Array:
        """Velocity at z = 0 (n, 3), m/s."""


class Flow(Protocol):
    """What frames need of a route."""

    def surface_sampler(self, plan: Array) -> SurfaceMaps:
        """Maps at (x, y) on still water (n, 2)."""


@dataclass(frozen=True)
class Sheet:
    """The surface at rest: what is drawn.

    mesh : SurfaceMesh, on z = 0, normals up.
    under_hull : (n,) vertices that lie inside a waterline.
    solved_at : (n, 2) where each vertex takes its solved part; NaN where it has none.
    """

    mesh: SurfaceMesh
    under_hull: Bools
    solved_at: Array


@dataclass(frozen=True)
class WaterFrame:
    """The surface at one time.

    Attributes
    ----------
    time : s of the run.
    mesh : SurfaceMesh, vertices raised by the elevation.
    normals : (n, 3) unit, up.
    velocity : (n, 3) of the water at z = 0, m/s; its z is the vertex's own.
    elevation : (n,) m.
    under_hull : (n,)
    """

    time: float
    mesh: SurfaceMesh
    normals: Array
    velocity: Array
    elevation: Array
    under_hull: Bools


class MovingSurface:
    """Moves a sheet with the sum of the sea and the solved field.

    Parameters
    ----------
    sheet : Sheet
    sea : Sea
    flow : Flow or None
        None where nothing is solved.
    """

    def __init__(self, sheet: Sheet, sea: Sea, flow: Flow | None) -> None:
        self._sheet = sheet
        self._incident = sea.at(sheet.mesh.points)
        self._solved_rows = np.flatnonzero(np.isfinite(sheet.solved_at[:, 0]))
        places = sheet.solved_at[self._solved_rows]
        blocks = range(0, len(places) if flow is not None else 0, BLOCK)
        self._solved = (
            []
            if flow is None
            else [flow.surface_sampler(places[start : start + BLOCK]) for start in blocks]
        )

    def at(self, state: SurfaceState) -> WaterFrame:
        """Return the surface at the time of a solved state."""
        elevation = self._incident.elevation(state.time)
        velocity = self._incident.velocity(state.time)
        if self._solved:
            rows = self._solved_rows
            elevation[rows] += np.concatenate([part.elevation(state) for part in self._solved])
            velocity[rows] += np.concatenate([part.velocity(state) for part in self._solved])
        points = self._sheet.mesh.points + elevation[:, None] * [0.0, 0.0, 1.0]
        mesh = self._sheet.mesh.with_points(points)
        return WaterFrame(
            state.time, mesh, vertex_normals(mesh), velocity, elevation, self._sheet.under_hull
        )


def vertex_normals(mesh: SurfaceMesh) -> Array:
    """Unit normals at the vertices, (n, 3): the triangles' about each, weighted by area."""
    normals = np.zeros_like(mesh.points)
    for corner in range(3):
        np.add.at(normals, mesh.triangles[:, corner], mesh.area_vectors)
    size = np.linalg.norm(normals, axis=1, keepdims=True)
    unit: Array = normals / np.where(size > 0.0, size, 1.0)
    return unit


def solver_sheet(water: SurfaceMesh, waterline: Literal["skirt", "cut"]) -> Sheet:
    """Make a sheet of the solver's own water panels: its waterlines are holes."""
    if waterline == "skirt":
        raise NotYetError(
            'not yet: [frames] waterline = "skirt" without a region; give [frames] region and '
            'spacing, or write waterline = "cut"'
        )
    plan = water.points[:, :2].copy()
    return Sheet(water, np.zeros(len(plan), dtype=bool), plan)


def grid_sheet(
    centre: tuple[float, float],
    size: tuple[float, float],
    spacing: float,
    waterline: Literal["skirt", "cut"],
    hulls: Sequence[Hull] = (),
    solved_in: Callable[[Array], Bools] | None = None,
) -> Sheet:
    """Make a sheet of squares over a region.

    Parameters
    ----------
    centre, size : m
    spacing : m, largest side of the squares.
    waterline : "skirt" | "cut"
        How far the sheet goes on under hulls: `SKIRT_CELLS` squares, or only the squares that a
        waterline crosses. A vertex inside takes the solved part of the nearest waterline point.
    hulls : sequence of Hull
    solved_in : callable, optional
        Tells which (x, y) (n, 2) lie in the water that is solved; the others carry the sea alone.
    """
    nx, ny = (max(1, math.ceil(side / spacing - 1e-9)) for side in size)
    x = centre[0] + np.linspace(-0.5, 0.5, nx + 1) * size[0]
    y = centre[1] + np.linspace(-0.5, 0.5, ny + 1) * size[1]
    plan = np.stack([g.ravel() for g in np.meshgrid(x, y)], axis=1)
    points = np.column_stack([plan, np.zeros(len(plan))])
    mesh = SurfaceMesh.of_one_part(points, grid_triangles(ny, nx), "water")
    under, distance, solved_at = _under_hulls(plan, hulls)
    if solved_in is not None:
        solved_at[~solved_in(plan)] = np.nan
    reach = SKIRT_CELLS * spacing if waterline == "skirt" else 0.0
    seen = ~under | (distance < reach)
    shown = np.asarray(seen[mesh.triangles].any(axis=1))
    used = np.zeros(len(plan), dtype=bool)
    used[mesh.triangles[shown]] = True
    return Sheet(mesh.keep(shown), under[used], solved_at[used])


def _under_hulls(plan: Array, hulls: Sequence[Hull]) -> tuple[Bools, Array, Array]:
    """Which places lie inside waterlines, how far in, m, and their nearest waterline points."""
    under, distance = np.zeros(len(plan), dtype=bool), np.zeros(len(plan))
    nearest = plan.copy()
    points = np.column_stack([plan, np.zeros(len(plan))])
    for hull in hulls:
        within = np.flatnonzero(inside(hull.mesh, points))
        if len(within):
            under[within] = True
            nearest[within] = _nearest(plan[within], hull.polygons())
            distance[within] = np.linalg.norm(nearest[within] - plan[within], axis=1)
    return under, distance, nearest


def _nearest(plan: Array, loops: Sequence[Array]) -> Array:
    """Points of closed lines nearest to each place, (n, 2)."""
    starts = np.concatenate(loops)
    along = np.concatenate([np.roll(loop, -1, axis=0) - loop for loop in loops])
    length = np.maximum(np.sum(along**2, axis=1), 1e-300)
    found = np.empty_like(plan)
    for row, place in enumerate(plan):
        share = np.clip(np.sum((place - starts) * along, axis=1) / length, 0.0, 1.0)
        on_line = starts + share[:, None] * along
        found[row] = on_line[np.argmin(np.sum((on_line - place) ** 2, axis=1))]
    return found
