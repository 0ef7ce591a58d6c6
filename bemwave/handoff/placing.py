"""The axes a hand-off file speaks in: the box's own, or the near-field solver's."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np

from bemwave.geometry.pose import up_rotation
from bemwave.handoff.box import Array, turn


@dataclass(frozen=True)
class Axes:
    """Axes at a place on earth.

    Attributes
    ----------
    origin : m, on earth.
    heading : rad, of the first horizontal axis from earth's x.
    up : the axis that points up; "y" turns (x, y, z) into (x, z, -y), "x" into (z, y, -x).
    time_zero : s of the run at which the file's clock starts.
    """

    origin: tuple[float, float, float] = (0.0, 0.0, 0.0)
    heading: float = 0.0
    up: Literal["x", "y", "z"] = "z"
    time_zero: float = 0.0

    def points(self, earth: Array) -> Array:
        """Coordinates in these axes of points on earth, (..., 3), m."""
        return self.vectors(earth - np.asarray(self.origin))

    def vectors(self, earth: Array) -> Array:
        """Components along these axes of vectors on earth, (..., 3)."""
        plan = earth[..., :2] @ turn(self.heading)
        turned: Array = np.concatenate([plan, earth[..., 2:]], axis=-1) @ up_rotation(self.up)
        return turned

    def earth_points(self, points: Array) -> Array:
        """Coordinates on earth of points in these axes, (..., 3), m."""
        level = points @ up_rotation(self.up).T
        plan = level[..., :2] @ turn(self.heading).T
        turned: Array = np.concatenate([plan, level[..., 2:]], axis=-1)
        turned += np.asarray(self.origin)
        return turned

    def moved(
        self,
        origin: tuple[float, float, float],
        heading: float,
        up: Literal["x", "y", "z"],
        time_zero: float,
    ) -> Axes:
        """Further axes, `origin` and `heading` (degrees) of which are given in these axes."""
        place = self.earth_points(np.asarray(origin, dtype=np.float64))
        return Axes(
            (float(place[0]), float(place[1]), float(place[2])),
            self.heading + math.radians(heading),
            up,
            time_zero,
        )


EARTH = Axes()
