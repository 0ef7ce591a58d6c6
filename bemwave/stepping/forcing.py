"""What drives the solved field: given fluxes through hulls and walls, and pressure patches."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Protocol

import numpy as np
import numpy.typing as npt

from bemwave.waves import SeaAtPoints

Array = npt.NDArray[np.float64]


class GivenFlux(Protocol):
    """Velocity through hull and wall triangles along the normal out of the water."""

    def flux(self, times: Array) -> Array:
        """(times,) -> (triangles, times) [m/s]."""

    def rate(self, times: Array) -> Array:
        """Its time derivative [m/s^2]."""


@dataclass(frozen=True)
class Ramp:
    """A start from rest, (1 - cos(pi t / length)) / 2, over `length` seconds; 0: at once."""

    length: float

    def value(self, times: Array) -> Array:
        """(times,) 0 to 1."""
        if self.length == 0.0:
            return (times >= 0.0).astype(float)
        t = np.clip(times / self.length, 0.0, 1.0)
        return np.asarray(0.5 - 0.5 * np.cos(math.pi * t))

    def share(self, time: float) -> float:
        """`value` at one time."""
        return float(self.value(np.array([time]))[0])

    def rate(self, times: Array) -> Array:
        """(times,) [1/s]."""
        if self.length == 0.0:
            return np.zeros_like(times)
        t = np.clip(times / self.length, 0.0, 1.0)
        return np.asarray(0.5 * math.pi / self.length * np.sin(math.pi * t))

    def curvature(self, times: Array) -> Array:
        """(times,) [1/s^2]."""
        if self.length == 0.0:
            return np.zeros_like(times)
        t = times / self.length
        inside = (t >= 0.0) & (t <= 1.0)
        return np.where(inside, 0.5 * (math.pi / self.length) ** 2 * np.cos(math.pi * t), 0.0)


class Motion(Protocol):
    """A displacement in time, with two derivatives."""

    def displacement(self, times: Array) -> Array:
        """(times,) [m or rad]."""

    def velocity(self, times: Array) -> Array:
        """(times,) [m/s or rad/s]."""

    def acceleration(self, times: Array) -> Array:
        """(times,) [m/s^2 or rad/s^2]."""


@dataclass(frozen=True)
class Oscillation:
    """A displacement amplitude sin(frequency t) times a ramp, with two derivatives."""

    amplitude: float
    frequency: float
    ramp: Ramp

    def displacement(self, times: Array) -> Array:
        """(times,) [m or rad]."""
        return np.asarray(self.amplitude * self.ramp.value(times) * np.sin(self.frequency * times))

    def velocity(self, times: Array) -> Array:
        """(times,) [m/s or rad/s]."""
        w, r = self.frequency, self.ramp
        sine, cosine = np.sin(w * times), np.cos(w * times)
        return np.asarray(self.amplitude * (r.rate(times) * sine + w * r.value(times) * cosine))

    def acceleration(self, times: Array) -> Array:
        """(times,) [m/s^2 or rad/s^2]."""
        w, r = self.frequency, self.ramp
        sine, cosine = np.sin(w * times), np.cos(w * times)
        slow = r.curvature(times) - w**2 * r.value(times)
        return np.asarray(self.amplitude * (slow * sine + 2.0 * w * r.rate(times) * cosine))


@dataclass(frozen=True)
class MovingParts:
    """Hulls and walls that move: shapes (triangles, k) of unit velocity times k motions."""

    shapes: Array
    motions: Sequence[Motion]

    def flux(self, times: Array) -> Array:
        """(triangles, times) [m/s]."""
        return np.asarray(self.shapes @ np.array([m.velocity(times) for m in self.motions]))

    def rate(self, times: Array) -> Array:
        """(triangles, times) [m/s^2]."""
        return np.asarray(self.shapes @ np.array([m.acceleration(times) for m in self.motions]))


class ScatteredSea:
    """Minus the incident sea's flux through the hulls, ramped: what they scatter.

    Parameters
    ----------
    sea : the incident sea at the points of a rule, (triangles x points) in row.
    normals : (triangles, 3) out of the water.
    weights : (points,) the rule's weights, of sum 1.
    """

    def __init__(self, sea: SeaAtPoints, normals: Array, weights: Array, ramp: Ramp) -> None:
        self._sea, self._normals, self._weights, self._ramp = sea, normals, weights, ramp

    def _through(self, vectors: Array) -> Array:
        shaped = vectors.reshape(len(vectors), len(self._normals), len(self._weights), 3)
        return np.asarray(np.einsum("ntqc,tc,q->tn", shaped, self._normals, self._weights))

    def flux(self, times: Array) -> Array:
        """(triangles, times) [m/s]."""
        return -self._through(self._sea.velocity(times)) * self._ramp.value(times)

    def rate(self, times: Array) -> Array:
        """(triangles, times) [m/s^2]."""
        steady = self._through(self._sea.acceleration(times)) * self._ramp.value(times)
        return -(steady + self._through(self._sea.velocity(times)) * self._ramp.rate(times))


@dataclass(frozen=True)
class PressurePatch:
    """A travelling Gaussian patch: head(x, t) = head exp(-r^2 / (2 width^2)), metres of water."""

    head: float
    width: float
    centre: tuple[float, float]
    velocity: tuple[float, float]

    def value(self, xy: Array, time: float) -> Array:
        """(n,) [m]."""
        offset = xy - self.centre - np.multiply(self.velocity, time)
        return np.asarray(self.head * np.exp(-0.5 * (offset**2).sum(axis=1) / self.width**2))

    def rate(self, xy: Array, time: float) -> Array:
        """(n,) time derivative at fixed places [m/s]."""
        offset = xy - self.centre - np.multiply(self.velocity, time)
        return np.asarray(offset @ np.array(self.velocity) / self.width**2 * self.value(xy, time))
