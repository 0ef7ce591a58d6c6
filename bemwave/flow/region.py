"""A surface recorded in a region only: it can be drawn, but the water under it is not known."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from bemwave.errors import InputError
from bemwave.flow.sheet import Sheet
from bemwave.flow.state import SurfaceState

Array = npt.NDArray[np.float64]


class RegionSamplers:
    """Elevation of a recorded rectangle of grid nodes.

    Parameters
    ----------
    places : (n, 2 or 3) the nodes, along y first [m].
    """

    def __init__(self, places: Array) -> None:
        x, y = np.unique(places[:, 0]), np.unique(places[:, 1])
        self._sheet = Sheet(x[0], y[0], float(x[1] - x[0]), (len(x), len(y)))

    def surface_sampler(self, xy: Array) -> RegionSurface:
        """A sampler of the elevation at places xy (n, 2).

        Raises
        ------
        InputError : if a place is outside the region.
        """
        beyond = (xy < self._sheet.xy[0]) | (xy > self._sheet.xy[-1])
        if beyond.any():
            x, y = xy[beyond.any(axis=1)][0]
            raise InputError(
                f"the surface was asked for at ({x:g}, {y:g}), outside [run] history_region; "
                "expected a place inside it: only there was the surface recorded"
            )
        return RegionSurface(self._sheet, xy)

    def sampler(self, points: Array) -> RegionSurface:
        """Refused.

        Raises
        ------
        InputError
        """
        raise InputError(
            "velocities were asked for of a run with [run] history_region; expected a record of "
            "the whole surface, from which the water under it follows: run the case without it"
        )


class RegionSurface:
    """The elevation at fixed places."""

    def __init__(self, sheet: Sheet, xy: Array) -> None:
        self._at = sheet.interpolation(xy, periodic=False)

    def elevation(self, state: SurfaceState) -> Array:
        """(n,) [m]."""
        return np.asarray(self._at @ state.elevation)
