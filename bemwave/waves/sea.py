"""Sea: incident waves in closed form, a sum of plane waves.

elevation = sum a cos(k.x - w t + phase),
potential = sum (a g/w) cosh k(z+h)/cosh kh sin(k.x - w t + phase),
pressure  = -rho d(potential)/dt  (Dean & Dalrymple 1991, chapter 3).
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemwave.errors import InputError
from bemwave.waves.at_points import SeaAtPoints
from bemwave.waves.dispersion import (
    SEA_WATER_DENSITY,
    STANDARD_GRAVITY,
    wavenumber_of_frequency,
)

Array = NDArray[np.float64]

# Angles are held as multiples of 2^-41 degree (8e-15 rad), so that a file in degrees gives them
# back bit for bit: a conversion there and back errs by far less than half of such a step.
_ANGLE_STEP = 2.0**-41


@dataclass(frozen=True, eq=False)
class Sea:
    """Incident waves: plane waves that add up; none = still water.

    Attributes
    ----------
    frequency, heading, amplitude, phase, wavenumber : arrays (n,)
        rad/s, rad (direction of travel, counter-clockwise from +x), m, rad, 1/m.
    depth, density, gravity : float
        m (`math.inf` for deep water), kg/m^3, m/s^2.
    share : float
        Share of the spectrum's energy inside the band kept, before the rescaling to the height
        asked for (1 where nothing was cut).

    Examples
    --------
    >>> sea = Sea.of([0.8], [0.0], [1.0], [0.0], depth=20.0)
    >>> float(sea.elevation(0.0, 0.0, 0.0))
    1.0
    """

    frequency: Array
    heading: Array
    amplitude: Array
    phase: Array
    wavenumber: Array
    depth: float
    density: float = SEA_WATER_DENSITY
    gravity: float = STANDARD_GRAVITY
    share: float = 1.0

    def __post_init__(self) -> None:
        for name in ("frequency", "heading", "amplitude", "phase", "wavenumber"):
            array = np.array(getattr(self, name), dtype=float)
            if name in ("heading", "phase"):
                array = np.radians(degrees_of(array))
            array.setflags(write=False)
            object.__setattr__(self, name, array)
            if array.shape != (self.count,):
                raise InputError(
                    f"a sea's {name} has shape {array.shape}; expected one value for each of its "
                    f"{self.count} frequencies"
                )

    @classmethod
    def of(
        cls,
        frequency: ArrayLike,
        heading: ArrayLike,
        amplitude: ArrayLike,
        phase: ArrayLike,
        depth: float,
        density: float = SEA_WATER_DENSITY,
        gravity: float = STANDARD_GRAVITY,
        share: float = 1.0,
    ) -> Sea:
        """Sea of given components (radians inside); the wavenumbers follow from the depth."""
        w = np.atleast_1d(np.asarray(frequency, dtype=float))
        k = wavenumber_of_frequency(w, depth, gravity)
        parts = [
            np.broadcast_to(np.asarray(p, dtype=float), w.shape)
            for p in (heading, amplitude, phase)
        ]
        return cls(w, parts[0], parts[1], parts[2], k, depth, density, gravity, share)

    @classmethod
    def still(
        cls,
        depth: float,
        density: float = SEA_WATER_DENSITY,
        gravity: float = STANDARD_GRAVITY,
    ) -> Sea:
        """Still water: no component at all."""
        none = np.empty(0)
        return cls(none, none, none, none, none, depth, density, gravity)

    @property
    def count(self) -> int:
        """Number of components."""
        return int(np.size(self.frequency))

    def at(self, points: ArrayLike, memory: float = 2**30) -> SeaAtPoints:
        """Fields at fixed points (..., 3), for many instants; keeps up to `memory` bytes."""
        return SeaAtPoints(self, points, memory)

    def elevation(self, x: ArrayLike, y: ArrayLike, t: ArrayLike) -> Array:
        """Surface elevation in m: the shape of `t`, then that of `x` and `y` broadcast."""
        x, y = np.asarray(x, dtype=float), np.asarray(y, dtype=float)
        return self.at(np.stack(np.broadcast_arrays(x, y, 0.0), axis=-1), 0).elevation(t)

    def velocity(self, points: ArrayLike, t: ArrayLike) -> Array:
        """Velocity in m/s at points (..., 3); for z > 0 that of z = 0. See `SeaAtPoints`."""
        return self.at(points, 0).velocity(t)

    def pressure(self, points: ArrayLike, t: ArrayLike) -> Array:
        """Dynamic pressure in Pa at points (..., 3); rho g elevation for z > 0."""
        return self.at(points, 0).pressure(t)

    def potential(self, points: ArrayLike, t: ArrayLike) -> Array:
        """Velocity potential in m^2/s at points (..., 3); for z > 0 that of z = 0."""
        return self.at(points, 0).potential(t)

    def mirrored(self, axis: Literal["x", "y"], position: float) -> Sea:
        """Image of the sea in the wall x = position (or y = position).

        The sum of a sea and its image has no normal velocity on that wall.
        """
        along = np.cos(self.heading) if axis == "x" else np.sin(self.heading)
        return replace(
            self,
            heading=(math.pi if axis == "x" else 0.0) - self.heading,
            phase=self.phase + 2 * position * self.wavenumber * along,
        )

    def looped(self, length: float) -> Sea:
        """Sea whose frequencies are the nearest multiples of 2 pi/length: it repeats after that."""
        step = 2.0 * math.pi / length
        frequency = step * np.maximum(np.round(self.frequency / step), 1.0)
        water = (self.depth, self.density, self.gravity)
        return Sea.of(frequency, self.heading, self.amplitude, self.phase, *water, self.share)

    def keep(self, chosen: NDArray[np.bool_]) -> Sea:
        """Sea of the chosen components alone, amplitudes as they are."""
        return replace(
            self,
            frequency=self.frequency[chosen],
            heading=self.heading[chosen],
            amplitude=self.amplitude[chosen],
            phase=self.phase[chosen],
            wavenumber=self.wavenumber[chosen],
        )

    def __add__(self, other: Sea) -> Sea:
        for name in ("depth", "density", "gravity"):
            if getattr(self, name) != getattr(other, name):
                raise InputError(
                    f"seas of {name} {getattr(self, name):g} and {getattr(other, name):g} were "
                    "added; expected the same water for both"
                )
        energy = np.array([self.moment(0), other.moment(0)])
        shares = np.array([self.share, other.share])
        share = float(energy @ shares / energy.sum()) if energy.any() else 1.0
        return replace(
            self,
            frequency=np.concatenate([self.frequency, other.frequency]),
            heading=np.concatenate([self.heading, other.heading]),
            amplitude=np.concatenate([self.amplitude, other.amplitude]),
            phase=np.concatenate([self.phase, other.phase]),
            wavenumber=np.concatenate([self.wavenumber, other.wavenumber]),
            share=share,
        )

    def moment(self, order: float) -> float:
        """Moment sum a^2/2 w^order of the components, m^2 (rad/s)^order."""
        return float(np.sum(self.amplitude**2 / 2 * self.frequency**order))

    @property
    def significant_height(self) -> float:
        """Hm0 = 4 sqrt(m0) in metres."""
        return 4 * math.sqrt(self.moment(0))

    @property
    def mean_heading(self) -> float:
        """Heading of the energy-weighted mean direction, rad."""
        return float(np.angle(self._direction()))

    @property
    def spread(self) -> float:
        """Circular spread sqrt(2 (1 - m1)) of the headings, rad (Kuik et al. 1988).

        Here m1 is the length of the energy-weighted mean direction, the a1 of a spreading
        function. Journal of Physical Oceanography 18, 1020-1034.
        """
        return math.sqrt(2 * max(0.0, 1 - abs(self._direction())))

    def _direction(self) -> complex:
        energy = self.amplitude**2
        total = energy.sum()
        return complex(energy @ np.exp(1j * self.heading) / total) if total > 0 else 1 + 0j

    @property
    def repeat_time(self) -> float:
        """Seconds after which the sea may repeat: 2 pi over the smallest frequency spacing.

        The period itself for a single frequency; infinite for still water.
        """
        distinct = np.unique(self.frequency)
        if distinct.size == 0:
            return math.inf
        spacing = np.diff(distinct).min() if distinct.size > 1 else distinct[0]
        return float(2 * math.pi / spacing)


def degrees_of(angle: Array) -> Array:
    """Angles in degrees within +-360, rounded to the step that survives conversion both ways."""
    degrees: Array = np.fmod(np.round(np.degrees(angle) / _ANGLE_STEP) * _ANGLE_STEP, 360.0)
    return degrees
