"""The solved part of the water at one instant, incident waves left out."""

from __future__ import annotations

from dataclasses import dataclass, fields, replace

import numpy as np
import numpy.typing as npt

Array = npt.NDArray[np.float64]


@dataclass(frozen=True)
class SurfaceState:
    """What a route's samplers need to know of the solved part.

    Attributes
    ----------
    time : s.
    elevation, potential : (n,) at the water's nodes [m], [m^2/s].
    potential_rate : (n,) time derivative of the potential at z = 0 [m^2/s^2].
    surface_flux, surface_flux_rate : (n,) vertical velocity of the water at its surface [m/s],
        and its time derivative [m/s^2].
    hull_potential, hull_potential_rate : (b,) at hull and wall nodes [m^2/s], [m^2/s^2].
    hull_flux, hull_flux_rate : (t,) velocity along the outward normal on hull and wall
        triangles [m/s], and its time derivative [m/s^2].
    """

    time: float
    elevation: Array
    potential: Array
    potential_rate: Array
    surface_flux: Array
    surface_flux_rate: Array
    hull_potential: Array
    hull_potential_rate: Array
    hull_flux: Array
    hull_flux_rate: Array

    def at(self, nodes: npt.NDArray[np.int64]) -> SurfaceState:
        """The same at some of the water's nodes."""
        surface = ("elevation", "potential", "potential_rate", "surface_flux", "surface_flux_rate")
        return replace(self, **{name: getattr(self, name)[nodes] for name in surface})


ARRAYS = tuple(f.name for f in fields(SurfaceState) if f.name != "time")


def blend(states: list[SurfaceState], weights: Array, time: float) -> SurfaceState:
    """The weighted sum of states, as of `time`: interpolation between instants."""
    parts = {
        name: sum(w * getattr(s, name) for w, s in zip(weights, states, strict=True))
        for name in ARRAYS
    }
    return SurfaceState(time=time, **parts)
