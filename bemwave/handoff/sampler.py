"""The field of a hand-off at one instant: velocity, pressure, wetness, elevation."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from bemwave.flow.state import SurfaceState
from bemwave.handoff.box import Array, PointSet
from bemwave.handoff.fields import Flow, IncidentPart, Part, SolvedPart, levels_down_to, on_surface
from bemwave.waves import Sea
from bemwave.waves.crest import CrestRule, extrapolated, stretched_z

FieldChoice = Literal["total", "incident", "parts"]


@dataclass(frozen=True)
class Values:
    """Fields at the points and columns of a hand-off, on earth; NaN where a point is dry.

    velocity : (n, 3) m/s.  pressure : (n,) dynamic, Pa.  elevation : (m,) m.
    """

    velocity: Array
    pressure: Array
    elevation: Array


@dataclass(frozen=True)
class Instant:
    """What is handed over at one time.

    Attributes
    ----------
    time : s of the run.
    total : the field asked for.
    incident : the incident part of it, where parts were asked for.
    wet : (n,) fraction of each point's cell under the surface.
    first_order : (n, 3) velocity as linear theory has it up to z = 0, whatever the crest rule;
        zero above. Closure is reckoned from it.
    """

    time: float
    total: Values
    incident: Values | None
    wet: Array
    first_order: Array


class HandoffSampler:
    """Samples the sum of the sea and the solved field at the points of a hand-off.

    Built once; every call costs a few matrix products.

    Parameters
    ----------
    points : PointSet
    sea : Sea
    flow : Flow or None
        None where nothing is solved.
    crest : "linear" | "wheeler" | "cut"
        Velocities above still water: extrapolated f(0) + z df/dz(0); stretched, all points of a
        column taken at h (z - elevation)/(h + elevation) (Wheeler 1970); as at z = 0.
    field : "total" | "incident" | "parts"
    solid : callable, optional
        Tells which points (n, 3) lie inside hulls: never wet, never sampled. Where a column does
        at z = 0 there is no surface and its elevation is NaN.

    Examples
    --------
    >>> sampler = HandoffSampler(free_points([[0, 0, -1]]), sea, flow)   # doctest: +SKIP
    >>> sampler.at(state).total.velocity.shape                           # doctest: +SKIP
    (1, 3)
    """

    def __init__(
        self,
        points: PointSet,
        sea: Sea,
        flow: Flow | None,
        crest: CrestRule = "linear",
        field: FieldChoice = "total",
        solid: Callable[[Array], NDArray[np.bool_]] | None = None,
    ) -> None:
        self._set, self._crest, self._depth = points, crest, sea.depth
        self._weight = sea.density * sea.gravity
        z = points.points[:, 2]
        inside = _nowhere if solid is None else solid
        self._covered = inside(on_surface(points.columns))
        over = (z > 0.0) & self._covered[points.column]
        self._water = water = ~inside(points.points) & ~over
        self._under = np.flatnonzero((z <= 0.0) & water)
        self._above = np.flatnonzero((z > 0.0) & water)
        tall, self._stand = np.unique(points.column[self._above], return_inverse=True)
        places = (points.points, self._under, points.columns, tall)
        self._incident: Part = IncidentPart(sea, *places)
        self._parts: list[Part] = [self._incident]
        if flow is not None and field != "incident":
            levels = self._levels() if crest == "wheeler" else None
            self._parts.append(SolvedPart(flow, *places, points.column, levels))
        self._show_incident = field == "parts"

    def at(self, state: SurfaceState) -> Instant:
        """Sample at the time of a solved state."""
        # under a hull there is no surface: what is water there stays wet and is not stretched
        elevation = np.where(self._covered, 0.0, _total(self._parts, "elevation", state))
        surface = elevation[self._set.column]
        wet = self._wet(surface)
        first_order = self.first_order(state)
        total = self._values(self._parts, state, first_order, surface, wet)
        incident = None
        if self._show_incident:
            part = [self._incident]
            incident = self._values(part, state, self._first_order(part, state), surface, wet)
        return Instant(state.time, total, incident, wet, first_order)

    def elevation(self, state: SurfaceState) -> Array:
        """Elevation of the columns alone, (m,), m; NaN inside waterlines."""
        return np.where(self._covered, np.nan, _total(self._parts, "elevation", state))

    def first_order(self, state: SurfaceState) -> Array:
        """Velocity up to z = 0 alone, (n, 3), m/s; zero above and inside hulls."""
        return self._first_order(self._parts, state)

    def _first_order(self, parts: list[Part], state: SurfaceState) -> Array:
        velocity = np.zeros_like(self._set.points)
        velocity[self._under] = _total(parts, "velocity", state)
        return velocity

    def _wet(self, elevation: Array) -> Array:
        """Fraction of each cell under the surface; a point by itself is in or out."""
        height, z = self._set.height, self._set.points[:, 2]
        cell = np.where(height > 0.0, height, 1.0)
        share = np.clip((elevation - z) / cell + 0.5, 0.0, 1.0)
        point = (z <= elevation).astype(np.float64)
        wet = np.where(height > 0.0, share, point)
        return np.where(self._covered[self._set.column], 1.0, wet) * self._water

    def _values(
        self,
        parts: list[Part],
        state: SurfaceState,
        first_order: Array,
        surface: Array,
        wet: Array,
    ) -> Values:
        """Fields of the sum of `parts` under the surface (n,) that all parts make together."""
        elevation = _total(parts, "elevation", state)
        pressure = np.zeros(len(first_order))
        pressure[self._under] = _total(parts, "pressure", state)
        pressure[self._above] = self._weight * elevation[self._set.column[self._above]]
        if self._crest == "wheeler":
            level = self._stretched(surface)
            velocity = sum(
                (part.velocity_at_depth(state, level) for part in parts), np.zeros_like(first_order)
            )
        else:
            velocity = first_order.copy()
            velocity[self._above] = self._above_still_water(parts, state)
        velocity[wet == 0.0] = np.nan
        pressure[wet == 0.0] = np.nan
        elevation[self._covered] = np.nan
        return Values(velocity, pressure, elevation)

    def _above_still_water(self, parts: list[Part], state: SurfaceState) -> Array:
        velocity = _total(parts, "surface_velocity", state)[self._stand]
        if self._crest == "linear":
            slope = _total(parts, "velocity_slope", state)[self._stand]
            velocity = extrapolated(velocity, slope, self._set.points[self._above, 2])
        return velocity

    def _stretched(self, elevation: Array) -> Array:
        """Level at which Wheeler (1970) takes the velocity of each point."""
        level = stretched_z(self._set.points[:, 2], elevation, self._depth)
        return np.clip(level, -self._depth, 0.0)

    def _levels(self) -> Array:
        """Levels for stretched velocities, from still water to under the lowest of them."""
        z, height = self._set.points[:, 2], self._set.height
        cell = height[height > 0.0].min() if np.any(height > 0.0) else 0.02 * np.ptp(z) + 0.01
        lowest = max(z.min() - max(z.max(), 1.0), -self._depth)
        return levels_down_to(float(lowest), float(cell))


def _nowhere(points: Array) -> NDArray[np.bool_]:
    return np.zeros(len(points), dtype=bool)


def _total(parts: list[Part], quantity: str, state: SurfaceState) -> Array:
    first, *rest = (np.asarray(getattr(part, quantity)(state)) for part in parts)
    return sum(rest, first)
