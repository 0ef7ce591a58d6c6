"""Bodies that ride the surface and make no waves.

They are not in the solved boundary. The plane nearest to the elevation over the waterplane, by
least squares, gives heave, roll and pitch; surge and sway are how far the incident waves move the
water there, what solved waves add left out; there is no yaw.
"""

from __future__ import annotations

from typing import Protocol

import numpy as np
import numpy.typing as npt

from bemwave.bodies.modes import centre_on_earth
from bemwave.flow.state import SurfaceState
from bemwave.geometry.hull import Hull
from bemwave.handoff.box import Box
from bemwave.handoff.fields import SurfaceMaps, on_surface
from bemwave.handoff.plan import Waterplane, waterplane_quadrature
from bemwave.waves import Sea

Array = npt.NDArray[np.float64]


class Surface(Protocol):
    """What a rider needs of a route's samplers."""

    def surface_sampler(self, plan: Array) -> SurfaceMaps:
        """Maps at (x, y) on still water (n, 2)."""


class Rider:
    """A body that rides the surface: motions about its centre of mass, along its axes.

    Parameters
    ----------
    hull : at rest, with a waterplane.
    sea : the incident sea.
    flow : samplers of the solved field; None where nothing is solved.
    """

    def __init__(self, hull: Hull, sea: Sea, flow: Surface | None) -> None:
        places, weight = waterplane_quadrature(_around(hull), Waterplane.of(hull))
        self._axes = hull.place.rotation[:2, :2]
        self._height = float(hull.centre_of_mass[2])
        arm = (places - centre_on_earth(hull)[:2]) @ self._axes
        # elevation = heave + roll y - pitch x
        basis = np.column_stack([np.ones(len(arm)), arm[:, 1], -arm[:, 0]])
        tested = (weight[:, None] * basis).T
        self._plane = np.linalg.solve(tested @ basis, tested)
        self._mean = weight / weight.sum()
        self._incident = sea.at(on_surface(places))
        self._solved = None if flow is None else flow.surface_sampler(places)

    def motion(self, state: SurfaceState) -> Array:
        """Displacement from the place at rest, (6,) [m, rad]."""
        solved = 0.0 if self._solved is None else self._solved.elevation(state)
        moved = self._incident.displacement(state.time)
        return self._six(moved[:, 2] + solved, moved)

    def velocity(self, state: SurfaceState) -> Array:
        """Velocity, (6,) [m/s, rad/s]."""
        solved = 0.0 if self._solved is None else self._solved.elevation_rate(state)
        moving = self._incident.velocity(state.time)
        return self._six(moving[:, 2] + solved, moving)

    def _six(self, level: Array, along: Array) -> Array:
        """Six motions from the water's own at the waterplane, upward (n,) and along it (n, 2)."""
        six = np.zeros(6)
        six[2:5] = self._plane @ level
        six[:2] = (self._mean @ along[:, :2]) @ self._axes
        # it turns about its centre of mass: that moves so that the waterplane goes with the water
        six[:2] += self._height * np.array([six[4], -six[3]])
        return six


def _around(hull: Hull) -> Box:
    """A box round the whole waterplane."""
    plan = np.concatenate(hull.polygons())
    low, high = plan.min(axis=0), plan.max(axis=0)
    x, y = (0.5 * (low + high)).tolist()
    length, width = (1.1 * (high - low)).tolist()
    return Box((x, y), (length, width), 0.0, -1.0, 1.0, (length, 1.0))
