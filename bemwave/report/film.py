"""The water of a run on a coarse regular grid, over time: what the page's maps and view show."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
import numpy.typing as npt
from scipy.ndimage import distance_transform_edt

from bemwave.handoff.fields import on_surface
from bemwave.records import Run

Array = npt.NDArray[np.float64]
Bools = npt.NDArray[np.bool_]

PLACES = 12_000  # of the grid
FRAMES = 240  # at most, the latest of them
FRAMES_PER_PERIOD = 16  # of the peak: between frames heights are interpolated in a straight line


@dataclass(frozen=True)
class Film:
    """Elevation of the water on a grid.

    Attributes
    ----------
    x : (nx,) m.  y : (ny,) m.  times : (nt,) s.
    total, incident : (nt, ny, nx) m; NaN where there is no water: under hulls, over the edge.
    inside : (ny, nx) whether a place is in the useful water.
    """

    x: Array
    y: Array
    times: Array
    total: Array
    incident: Array
    inside: Bools

    @property
    def scattered(self) -> Array:
        """The solved part (nt, ny, nx), m: what bodies, walls and patches add to the sea."""
        return self.total - self.incident

    @property
    def spacing(self) -> tuple[float, float]:
        """Of the grid along x and y, m."""
        return float(self.x[1] - self.x[0]), float(self.y[1] - self.y[0])

    @cached_property
    def wet(self) -> Bools:
        """Where there is water, (ny, nx)."""
        return np.asarray(np.isfinite(self.total[0]))

    @cached_property
    def peak(self) -> float:
        """Largest size of the elevation, m; never 0, so that it can be a scale."""
        return float(np.nanmax(np.abs(self.total), initial=0.0)) or 1.0

    def after(self, time: float) -> Film:
        """The frames from a time on."""
        kept = self.times >= time
        return replace(
            self, times=self.times[kept], total=self.total[kept], incident=self.incident[kept]
        )

    def filled(self, field: Array) -> Array:
        """A field (..., ny, nx) with the nearest water's values where there is no water."""
        if not self.wet.any():
            return np.zeros_like(field)
        nearest = distance_transform_edt(~self.wet, return_distances=False, return_indices=True)
        return np.asarray(field[..., nearest[0], nearest[1]])


def film_of(run: Run, times: Array) -> Film:
    """Sample a run at times inside its record."""
    x, y = _grid(run)
    plan = np.stack(np.meshgrid(x, y), axis=-1)
    surface = run.case.surface
    inside = np.array([[surface.contains(*place) for place in row] for row in plan])
    places = plan[inside]
    total, incident = np.full((2, len(times), *inside.shape), np.nan)
    total[:, inside] = run.elevation(places[:, 0], places[:, 1], times)
    incident[:, inside] = run.sea.at(on_surface(places)).elevation(times)
    return Film(x, y, times, total, incident, inside)


def frame_times(records: Array, peak_period: float) -> Array:
    """Times of the frames: enough in a period of the peak, the latest of them.

    Some of the records, or all and times between, where these follow the waves well enough for
    the run to fill in: at a quarter period it errs by 2 % ((w dt)^4/384).
    """
    if len(records) < 2:
        return records
    interval = float(records[-1] - records[0]) / (len(records) - 1)
    stride = math.ceil(len(records) / FRAMES)
    if math.isfinite(peak_period):
        wanted = peak_period / FRAMES_PER_PERIOD
        stride = max(1, int(wanted / interval))
        if wanted < interval <= 0.25 * peak_period:
            parts = math.ceil(interval / wanted)
            records = np.linspace(records[0], records[-1], parts * (len(records) - 1) + 1)
    return np.asarray(records[::-1][::stride][:FRAMES][::-1])


def _grid(run: Run) -> tuple[Array, Array]:
    """Lines of a grid over the recorded water, about square and `PLACES` in all."""
    surface, region = run.case.surface, run.case.run.history_region
    centre = surface.centre if region is None else region.centre
    size = surface.extent if region is None else region.size
    side = math.sqrt(size[0] * size[1] / PLACES)
    lines = [
        middle + length * np.linspace(-0.5, 0.5, max(8, round(length / side) + 1))
        for middle, length in zip(centre, size, strict=True)
    ]
    return lines[0], lines[1]
