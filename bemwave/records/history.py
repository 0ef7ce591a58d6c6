"""history.nc: the solved field over time, enough of it to be sampled again anywhere."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemwave import __version__
from bemwave.flow.state import ARRAYS, SurfaceState, blend
from bemwave.handoff.netcdf import Layout, SeriesFile, Variable, read_times, reading

Array = NDArray[np.float64]

_FIELDS = {
    "elevation": ("node", "m", "elevation of the solved part"),
    "potential": ("node", "m2 s-1", "potential of the solved part at still water"),
    "potential_rate": ("node", "m2 s-2", "its time derivative"),
    "surface_flux": ("node", "m s-1", "vertical velocity of the water at its surface"),
    "surface_flux_rate": ("node", "m s-2", "its time derivative"),
    "hull_potential": ("hull_node", "m2 s-1", "potential of the solved part on hulls and walls"),
    "hull_potential_rate": ("hull_node", "m2 s-2", "its time derivative"),
    "hull_flux": ("hull_panel", "m s-1", "velocity along the normal out of the water"),
    "hull_flux_rate": ("hull_panel", "m s-2", "its time derivative"),
}
# each field and the one that holds its time derivative
_RATES = {
    "elevation": "surface_flux",
    "potential": "potential_rate",
    "surface_flux": "surface_flux_rate",
    "hull_potential": "hull_potential_rate",
    "hull_flux": "hull_flux_rate",
}


class HistoryFile(SeriesFile):
    """Writes history.nc.

    Parameters
    ----------
    path : Path
    times : (n,) s, of all records that will be.
    nodes, hull_nodes, hull_panels : (n, 3) m
        Where the values of a `SurfaceState` belong, in its order; centroids for panels.
    keep : int, optional
        Records of an interrupted run to keep.
    """

    def __init__(
        self,
        path: Path,
        times: ArrayLike,
        nodes: ArrayLike,
        hull_nodes: ArrayLike,
        hull_panels: ArrayLike,
        keep: int | None = None,
    ) -> None:
        places = {"node": nodes, "hull_node": hull_nodes, "hull_panel": hull_panels}
        points = {k: np.asarray(v, dtype=np.float64).reshape(-1, 3) for k, v in places.items()}
        layout = Layout(
            dimensions={name: len(p) for name, p in points.items()},
            fixed=[
                (Variable(f"{name}_{axis}", (name,), "m", f"{axis} of the {name}"), p[:, k])
                for name, p in points.items()
                for k, axis in enumerate("xyz")
            ],
            series=[
                Variable(name, ("time", place), units, text, "f4")
                for name, (place, units, text) in _FIELDS.items()
            ],
            attributes={
                "title": "The solved part of the water, incident waves left out",
                "source": f"bemwave {__version__}, linear potential theory",
            },
            times=np.asarray(times, dtype=np.float64),
        )
        super().__init__(path, layout, keep)

    def add(self, state: SurfaceState) -> None:
        """Add a state."""
        self.append(state.time, {name: getattr(state, name) for name in ARRAYS})


class History:
    """Reads history.nc; between records it interpolates.

    Attributes
    ----------
    times : (n,) s
    """

    def __init__(self, path: Path) -> None:
        self._path = path
        with reading(path) as file:
            self.times: Array = read_times(file)
            self.places: Array = np.column_stack([file["node_x"][:], file["node_y"][:]])
        self.record = lru_cache(maxsize=8)(self._read)

    def _read(self, index: int) -> SurfaceState:
        """State of one record."""
        with reading(self._path) as file:
            fields = {name: np.asarray(file[name][index], dtype=np.float64) for name in ARRAYS}
        return SurfaceState(time=float(self.times[index]), **fields)

    def at(self, time: float) -> SurfaceState:
        """State at a time inside the record, s.

        Fields whose time derivative is recorded follow the cubic that has both at the records on
        either side; the error is (w dt)^4/384 of a wave of frequency w. The others, derivatives
        themselves, follow the cubic through four records.

        Raises
        ------
        ValueError
            If the time is outside the record.
        """
        if not self.times[0] <= time <= self.times[-1]:
            raise ValueError(
                f"time {time:g} s was asked for; the record runs from {self.times[0]:g} to "
                f"{self.times[-1]:g} s"
            )
        exact = np.flatnonzero(self.times == time)
        if len(exact):
            return self.record(int(exact[0]))
        left = int(np.searchsorted(self.times, time)) - 1
        first, weights = cubic_in_time(self.times, time)
        near = [self.record(first + k) for k in range(len(weights))]
        through = blend(near, weights, time)
        return _with_slopes(through, self.record(left), self.record(left + 1))


def _with_slopes(state: SurfaceState, left: SurfaceState, right: SurfaceState) -> SurfaceState:
    """Replace fields whose rates are recorded by Hermite's cubic between two records."""
    span = right.time - left.time
    s = (state.time - left.time) / span
    value = {"left": (1 + 2 * s) * (1 - s) ** 2, "right": s**2 * (3 - 2 * s)}
    slope = {"left": span * s * (1 - s) ** 2, "right": span * s**2 * (s - 1)}
    fields = {name: getattr(state, name) for name in ARRAYS}
    for name, rate in _RATES.items():
        fields[name] = (
            value["left"] * getattr(left, name)
            + value["right"] * getattr(right, name)
            + slope["left"] * getattr(left, rate)
            + slope["right"] * getattr(right, rate)
        )
    return SurfaceState(time=state.time, **fields)


def cubic_in_time(times: Array, time: float) -> tuple[int, Array]:
    """The polynomial through the four records about a time, or through all if there are fewer.

    Returns
    -------
    first : index of the first of them.
    weights : (4,) or fewer
    """
    left = int(np.searchsorted(times, time)) - 1
    first = min(max(left - 1, 0), max(len(times) - 4, 0))
    near = times[first : first + 4]
    weights = np.ones(len(near))
    for i, at in enumerate(near):
        others = np.delete(near, i)
        weights[i] = np.prod((time - others) / (at - others))
    return first, weights
