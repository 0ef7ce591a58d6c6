"""The water surface as a mesh that rises and falls: where its vertices stand and how they move."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from scipy import sparse

from bemwave.flow.state import SurfaceState
from bemwave.frames.crests import Crests
from bemwave.frames.sheet import Array, Bools, Sheet
from bemwave.frames.shelter import shelter
from bemwave.frames.wave_sum import WaveSum
from bemwave.geometry.surface_mesh import SurfaceMesh
from bemwave.waves import Sea

BLOCK = 8192  # places whose maps are built at a time


class SurfaceMaps(Protocol):
    """The solved field on still water at fixed (x, y)."""

    def elevation(self, state: SurfaceState) -> Array:
        """Elevation (n,), m."""

    def elevation_acceleration(self, state: SurfaceState) -> Array:
        """Its second rate (n,), m/s^2."""

    def velocity(self, state: SurfaceState) -> Array:
        """Velocity at z = 0 (n, 3), m/s."""


class Flow(Protocol):
    """What frames need of a route."""

    def surface_sampler(self, plan: Array) -> SurfaceMaps:
        """Maps at (x, y) on still water (n, 2)."""


@dataclass(frozen=True)
class WaterFrame:
    """The surface at one time.

    Attributes
    ----------
    time : s of the run.
    mesh : SurfaceMesh, vertices where the water has taken them.
    normals : (n, 3) unit, up.
    velocity : (n, 3) of the vertices, m/s.
    water_velocity : (n, 3) of the water at z = 0, m/s.
    elevation : (n,) m.
    steepness : (n,) tangent of the surface's slope.
    downward_acceleration : (n,) of the surface, m/s^2.
    under_hull : (n,)
    """

    time: float
    mesh: SurfaceMesh
    normals: Array
    velocity: Array
    water_velocity: Array
    elevation: Array
    steepness: Array
    downward_acceleration: Array
    under_hull: Bools


class MovingSurface:
    """Moves a sheet with the sum of the sea and the solved field.

    Parameters
    ----------
    sheet : Sheet
    sea : Sea
    flow : Flow or None
        None where nothing is solved.
    short : Sea, optional
        Waves besides that hulls neither scatter nor let through: faded behind them.
    waterlines : sequence of (k, 2) arrays
        Of the hulls that shelter.
    crests : Crests, optional
        The horizontal displacement, if it is to be drawn.
    """

    def __init__(
        self,
        sheet: Sheet,
        sea: Sea,
        flow: Flow | None,
        short: Sea | None = None,
        waterlines: Sequence[Array] = (),
        crests: Crests | None = None,
    ) -> None:
        self.sheet, self._crests = sheet, crests
        shifted = crests is not None
        self._seas: list[tuple[WaveSum, float | Array]] = []
        if sea.count:
            self._seas.append((WaveSum(sea, sheet, shifted), 1.0))
        if short is not None and short.count:
            shade = shelter(_outside(sheet), waterlines, short)
            self._seas.append((WaveSum(short, sheet, shifted), shade))
        self._solved_rows = np.flatnonzero(np.isfinite(sheet.solved_at[:, 0]))
        places = sheet.solved_at[self._solved_rows]
        blocks = range(0, len(places) if flow is not None else 0, BLOCK)
        self._solved = (
            []
            if flow is None
            else [flow.surface_sampler(places[start : start + BLOCK]) for start in blocks]
        )
        self._gather = _gather(sheet.mesh)

    def at(self, state: SurfaceState) -> WaterFrame:
        """Return the surface at the time of a solved state."""
        rows = np.zeros((5 if self._crests is None else 7, len(self.sheet.mesh.points)))
        for waves, shade in self._seas:
            rows += shade * waves.at(state.time)
        shift, rate = rows[5:].T, rows[1:3].T.copy()  # the sea's alone
        if self._solved:
            rows[:5, self._solved_rows] += np.concatenate(
                [_solved_rows(part, state) for part in self._solved], axis=1
            )
        elevation, water_velocity = rows[0], rows[1:4].T
        points, velocity = self.sheet.mesh.points.copy(), water_velocity * [0.0, 0.0, 1.0]
        points[:, 2] = elevation
        if self._crests is not None:
            shift, rate = self._crests.at(state, shift, rate)
            points[:, :2] += shift
            velocity[:, :2] = rate
        mesh = self.sheet.mesh.with_points(points)
        normals = _unit(self._gather @ mesh.area_vectors)
        steepness = np.hypot(normals[:, 0], normals[:, 1]) / np.maximum(normals[:, 2], 1e-6)
        return WaterFrame(
            state.time, mesh, normals, velocity, water_velocity, elevation, steepness, -rows[4],
            self.sheet.under_hull,
        )  # fmt: skip


def _outside(sheet: Sheet) -> Array:
    """The vertices' places (n, 2), those under hulls mirrored out through the waterline."""
    plan = sheet.mesh.points[:, :2].copy()
    under = sheet.under_hull & np.isfinite(sheet.solved_at[:, 0])
    plan[under] = 2.0 * sheet.solved_at[under] - plan[under]
    return plan


def _solved_rows(maps: SurfaceMaps, state: SurfaceState) -> Array:
    """Elevation, velocity and second rate of the elevation, (5, n)."""
    acceleration = maps.elevation_acceleration(state)
    return np.vstack([maps.elevation(state), maps.velocity(state).T, acceleration])


def vertex_normals(mesh: SurfaceMesh) -> Array:
    """Unit normals at the vertices, (n, 3): the triangles' about each, weighted by area."""
    return _unit(_gather(mesh) @ mesh.area_vectors)


def _gather(mesh: SurfaceMesh) -> sparse.csr_matrix:
    """(n, m) sums over the triangles about each vertex."""
    triangle = np.repeat(np.arange(len(mesh.triangles)), 3)
    ones = np.ones(triangle.size)
    shape = (len(mesh.points), len(mesh.triangles))
    return sparse.csr_matrix((ones, (mesh.triangles.ravel(), triangle)), shape=shape)


def _unit(vectors: Array) -> Array:
    size = np.linalg.norm(vectors, axis=1, keepdims=True)
    return np.asarray(vectors / np.where(size > 0.0, size, 1.0))
