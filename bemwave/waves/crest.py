"""Velocity and pressure between still water and a crest: three rules.

Linear theory ends at z = 0. For points above it, 0 < z <= elevation,

linear   f(z) = f(0) + z df/dz(0);
cut      f(z) = f(0);
wheeler  every point of the column, below z = 0 too, takes the velocity at
         h (z - elevation)/(h + elevation), deep water z - elevation (Wheeler 1970, J. Petroleum
         Technology 22, 359-367).

The dynamic pressure there is rho g elevation by every rule, and unmapped below z = 0. Where
z > elevation a point is dry, whatever the rule. The functions serve any field, the solved one
too; `SeaUnderCrests` is the incident part in closed form.
"""

from __future__ import annotations

from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemwave.errors import InputError
from bemwave.waves.sea import Sea

Array = NDArray[np.float64]
CrestRule = Literal["linear", "wheeler", "cut"]


def is_wet(z: ArrayLike, elevation: ArrayLike) -> NDArray[np.bool_]:
    """Whether points at z (m) lie under a surface of the given elevation; they broadcast."""
    wet: NDArray[np.bool_] = np.asarray(z, dtype=float) <= np.asarray(elevation, dtype=float)
    return wet


def stretched_z(z: ArrayLike, elevation: ArrayLike, depth: float) -> Array:
    """Height (m) at which Wheeler's rule evaluates a point at z under the given elevation."""
    surface = np.asarray(elevation, dtype=float)
    stretched: Array = (np.asarray(z, dtype=float) - surface) / (1 + surface / depth)
    return stretched


def extrapolated(velocity: Array, slope: Array, z: ArrayLike) -> Array:
    """Linear rule: velocity + z slope for z > 0.

    Parameters
    ----------
    velocity : array (..., n, 3)
        At the points, for z > 0 at z = 0; m/s.
    slope : array (..., n, 3)
        d(velocity)/dz at z = 0; 1/s.
    z : array (n,)
        m.
    """
    height: Array = np.maximum(np.asarray(z, dtype=float), 0.0)
    return velocity + height[..., None] * slope


def pressure_under_crest(
    pressure: Array, z: ArrayLike, elevation: ArrayLike, density: float, gravity: float
) -> Array:
    """Dynamic pressure (Pa): rho g elevation for z > 0, unchanged below; they broadcast."""
    static = density * gravity * np.asarray(elevation, dtype=float)
    result: Array = np.where(np.asarray(z, dtype=float) > 0, static, pressure)
    return result


class SeaUnderCrests:
    """Incident velocity and pressure at fixed points by a crest rule.

    Parameters
    ----------
    sea : Sea
    points : array (n, 3)
        Earth coordinates in metres, above or below still water.
    rule : "linear", "wheeler" or "cut"

    Raises
    ------
    InputError
        If the rule is none of the three.
    """

    def __init__(self, sea: Sea, points: ArrayLike, rule: CrestRule = "linear") -> None:
        if rule not in ("linear", "wheeler", "cut"):
            raise InputError(
                f"the crest rule was given as {rule!r}; expected linear, wheeler or cut"
            )
        self._sea, self._rule, self._depth = sea, rule, sea.depth
        self._points = np.array(points, dtype=float).reshape(-1, 3)
        self._at = sea.at(self._points)
        self._above = np.flatnonzero(self._points[:, 2] > 0)
        self._at_above = sea.at(self._points[self._above])

    def elevation(self, t: ArrayLike) -> Array:
        """Incident elevation in metres, (*t.shape, n)."""
        return self._at.elevation(t)

    def pressure(self, t: ArrayLike) -> Array:
        """Incident dynamic pressure in Pa, (*t.shape, n); rho g elevation above z = 0."""
        return self._at.pressure(t)

    def velocity(self, t: ArrayLike, elevation: ArrayLike | None = None) -> Array:
        """Incident velocity in m/s, (*t.shape, n, 3); values at dry points mean nothing.

        Parameters
        ----------
        t : float or array
            Seconds.
        elevation : array (*t.shape, n), optional
            Of the whole surface over each point, for Wheeler's rule; by default the incident one.
        """
        if self._rule == "wheeler":
            surface = self.elevation(t) if elevation is None else elevation
            return self._stretched_velocity(np.asarray(t, dtype=float), np.asarray(surface))
        velocity = self._at.velocity(t)
        if self._rule == "linear" and self._above.size:
            z = self._points[self._above, 2]
            slope = self._at_above.velocity_slope(t)
            velocity[..., self._above, :] = extrapolated(velocity[..., self._above, :], slope, z)
        return velocity

    def _stretched_velocity(self, t: Array, elevation: Array) -> Array:
        """Velocity with the points of every instant moved to their stretched heights."""
        velocity = np.empty((*t.shape, len(self._points), 3))
        for instant in np.ndindex(t.shape):
            points = self._points.copy()
            points[:, 2] = stretched_z(points[:, 2], elevation[instant], self._depth)
            velocity[instant] = self._sea.velocity(points, t[instant])
        return velocity
