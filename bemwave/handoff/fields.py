"""The field at fixed points in two parts: the incident waves, closed form, and the solved rest.

Both parts answer the same questions, so that what is handed out is simply their sum.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Protocol

import numpy as np

from bemwave.flow.state import SurfaceState
from bemwave.handoff.box import Array, Ints

if TYPE_CHECKING:
    from bemwave.waves import Sea

FINEST_LEVEL = 0.15  # spacing of levels over their depth, where that is more than a cell


class PointMaps(Protocol):
    """The solved field at fixed points under still water, linear in the state."""

    def velocity(self, state: SurfaceState) -> Array:
        """Velocity (n, 3), m/s."""

    def pressure(self, state: SurfaceState) -> Array:
        """Dynamic pressure -rho phi_t (n,), Pa."""


class SurfaceMaps(Protocol):
    """The solved field on still water at fixed (x, y); zero outside the water that is solved."""

    def elevation(self, state: SurfaceState) -> Array:
        """Elevation (n,), m."""

    def elevation_rate(self, state: SurfaceState) -> Array:
        """d(elevation)/dt (n,), m/s."""

    def velocity(self, state: SurfaceState) -> Array:
        """Velocity at z = 0 (n, 3), m/s."""

    def velocity_slope(self, state: SurfaceState) -> Array:
        """d(velocity)/dz at z = 0 (n, 3), 1/s."""


class Flow(Protocol):
    """What a route gives to whoever samples its solution."""

    def sampler(self, points: Array) -> PointMaps:
        """Maps at points (n, 3), z <= 0."""

    def surface_sampler(self, plan: Array) -> SurfaceMaps:
        """Maps at (x, y) on still water (n, 2)."""


class Part(Protocol):
    """One part of the field at the places of a hand-off."""

    def velocity(self, state: SurfaceState) -> Array:
        """Velocity (n, 3) at the points under still water, m/s."""

    def pressure(self, state: SurfaceState) -> Array:
        """Dynamic pressure (n,) at the points under still water, Pa."""

    def elevation(self, state: SurfaceState) -> Array:
        """Elevation (m,) of the columns, m."""

    def surface_velocity(self, state: SurfaceState) -> Array:
        """Velocity (c, 3) at z = 0 of the columns that reach above still water, m/s."""

    def velocity_slope(self, state: SurfaceState) -> Array:
        """d(velocity)/dz (c, 3) there, 1/s."""

    def velocity_at_depth(self, state: SurfaceState, z: Array) -> Array:
        """Velocity (n, 3) at every point's (x, y) but at the given levels, m/s."""


class IncidentPart:
    """The sea in closed form.

    Parameters
    ----------
    sea : Sea
    points : (n, 3) all points; those in `under` lie at or under still water.
    under : (u,) indices.
    columns : (m, 2); those in `tall` have points above still water.
    tall : (c,) indices.
    """

    def __init__(self, sea: Sea, points: Array, under: Ints, columns: Array, tall: Ints) -> None:
        self._sea = sea
        self._plan = points[:, :2]
        self._under = sea.at(points[under])
        self._columns = sea.at(on_surface(columns))
        self._tall = sea.at(on_surface(columns[tall]))

    def velocity(self, state: SurfaceState) -> Array:
        """See `Part`."""
        return self._under.velocity(state.time)

    def pressure(self, state: SurfaceState) -> Array:
        """See `Part`."""
        return self._under.pressure(state.time)

    def elevation(self, state: SurfaceState) -> Array:
        """See `Part`."""
        return self._columns.elevation(state.time)

    def surface_velocity(self, state: SurfaceState) -> Array:
        """See `Part`."""
        return self._tall.velocity(state.time)

    def velocity_slope(self, state: SurfaceState) -> Array:
        """See `Part`."""
        return self._tall.velocity_slope(state.time)

    def velocity_at_depth(self, state: SurfaceState, z: Array) -> Array:
        """See `Part`."""
        return self._sea.velocity(np.column_stack([self._plan, z]), state.time)


class SolvedPart:
    """The solved field, through maps that are built once.

    `levels` (k,), from 0 downwards, are those between which `velocity_at_depth` interpolates;
    without them it cannot be asked.
    """

    def __init__(
        self,
        flow: Flow,
        points: Array,
        under: Ints,
        columns: Array,
        tall: Ints,
        column: Ints,
        levels: Array | None = None,
    ) -> None:
        self._under = flow.sampler(points[under])
        self._columns = flow.surface_sampler(columns)
        self._tall = flow.surface_sampler(columns[tall])
        self._column = column
        if levels is not None:
            self._levels = levels
            plan = np.repeat(columns, len(levels) - 1, axis=0)
            deep = np.tile(levels[1:], len(columns))
            self._surface = flow.surface_sampler(columns)
            self._deep = flow.sampler(np.column_stack([plan, deep]))

    def velocity(self, state: SurfaceState) -> Array:
        """See `Part`."""
        return self._under.velocity(state)

    def pressure(self, state: SurfaceState) -> Array:
        """See `Part`."""
        return self._under.pressure(state)

    def elevation(self, state: SurfaceState) -> Array:
        """See `Part`."""
        return self._columns.elevation(state)

    def surface_velocity(self, state: SurfaceState) -> Array:
        """See `Part`."""
        return self._tall.velocity(state)

    def velocity_slope(self, state: SurfaceState) -> Array:
        """See `Part`."""
        return self._tall.velocity_slope(state)

    def velocity_at_depth(self, state: SurfaceState, z: Array) -> Array:
        """See `Part`; a cubic through the four nearest levels.

        Levels a cell apart near the surface, then `FINEST_LEVEL` of the depth: for a wave k the
        error is at most about 3/128 (k spacing)^4 exp(k z), 2e-4 of the surface value at
        k spacing = .3 and below 5e-5 deeper down.
        """
        surface = self._surface.velocity(state)[:, None]
        deep = self._deep.velocity(state).reshape(len(surface), -1, 3)
        profile = np.concatenate([surface, deep], axis=1)
        first, weights = cubic_weights(self._levels, z)
        rows = first[:, None] + np.arange(4)
        near = profile[self._column[:, None], rows]
        velocity: Array = np.einsum("pk,pkd->pd", weights, near)
        return velocity


def on_surface(plan: Array) -> Array:
    """Points (n, 3) on still water at (x, y)."""
    return np.column_stack([plan, np.zeros(len(plan))])


def levels_down_to(lowest: float, cell: float) -> Array:
    """Levels from 0 to `lowest` (< 0), a cell apart at first, then wider with depth, m."""
    levels = [0.0]
    while levels[-1] > lowest or len(levels) < 4:
        levels.append(levels[-1] - max(cell, -FINEST_LEVEL * levels[-1]))
    scale = lowest / levels[-1]
    return scale * np.array(levels)


def cubic_weights(levels: Array, z: Array) -> tuple[Ints, Array]:
    """Lagrange weights of the four falling levels about each z.

    Returns
    -------
    first : (n,) index of the first of the four.
    weights : (n, 4)
    """
    below = np.searchsorted(-levels, -z, side="right")
    first = np.clip(below - 2, 0, len(levels) - 4)
    nodes = levels[first[:, None] + np.arange(4)]
    weights = np.ones((len(z), 4))
    for i in range(4):
        for j in range(4):
            if i != j:
                weights[:, i] *= (z - nodes[:, j]) / (nodes[:, i] - nodes[:, j])
    return first, weights
