"""Time series of a run for the page: gauges, bodies, hand-offs, each cut to what is there."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from bemwave.handoff.netcdf import read_times, reading
from bemwave.records import Run
from bemwave.records.series import FORCES, in_radians

Array = npt.NDArray[np.float64]

INSTANTS = 60  # of a hand-off's fields that are read: a large file would take too long


@dataclass(frozen=True)
class Gauge:
    """One gauge: times (n,) s; elevation, incident, gap (n,) m; NaN where there is none."""

    name: str
    place: tuple[float, float]
    times: Array
    elevation: Array
    incident: Array
    gap: Array


@dataclass(frozen=True)
class Bodies:
    """Motions and loads.

    Attributes
    ----------
    names : of the bodies.
    times : (n,) s.
    motion : (n, bodies, 6) m and degrees.
    forces : by name in bodies.nc, (n, bodies, 6) N and N m.
    """

    names: tuple[str, ...]
    times: Array
    motion: Array
    forces: dict[str, Array]

    def motion_at(self, name: str, times: Array) -> Array | None:
        """Six motions of a body at times (k,), m and rad, (k, 6); None for an unknown body."""
        if name not in self.names or not len(self.times):
            return None
        own = in_radians(self.motion[:, self.names.index(name)])
        return np.column_stack([np.interp(times, self.times, own[:, mode]) for mode in range(6)])


@dataclass(frozen=True)
class Delivery:
    """One hand-off file.

    Attributes
    ----------
    name : of the hand-off.
    times : (n,) s.
    points, columns : counts.
    balance : net_flux, volume_rate, largest_face_flux and level_drift, (n,) each; None for a
        list of points.
    seen : (k,) times at which fields were read.
    fastest, pressure : (k,) largest speed, m/s, and dynamic pressure in size, Pa.
    lowest, highest : (k,) of the surface, m.
    attributes : the file's own, as text.
    """

    name: str
    times: Array
    points: int
    columns: int
    balance: dict[str, Array] | None
    seen: Array
    fastest: Array
    pressure: Array
    lowest: Array
    highest: Array
    attributes: dict[str, str]


def gauges_of(run: Run) -> list[Gauge]:
    """The gauges of a run, in the order of its file; none if it has no such file."""
    if not run.folder.gauges.exists():
        return []
    with reading(run.folder.gauges) as file:
        times = read_times(file)
        wanted = ("elevation", "incident_elevation", "gap")
        series = [_read(file, name, len(times)) for name in wanted]
        x, y = np.asarray(file["x"][:]), np.asarray(file["y"][:])
        names = [str(name) for name in file["name"][:]]
    return [
        Gauge(name, (float(x[k]), float(y[k])), times, *(values[:, k] for values in series))
        for k, name in enumerate(names)
    ]


def bodies_of(run: Run) -> Bodies | None:
    """Motions and loads of a run; None if it has no such file."""
    if not run.folder.bodies.exists():
        return None
    with reading(run.folder.bodies) as file:
        times = read_times(file)
        names = tuple(str(name) for name in file["body"][:])
        forces = {name: _read(file, name, len(times)) for name in FORCES}
        return Bodies(names, times, _read(file, "motion", len(times)), forces)


def deliveries_of(run: Run) -> Iterator[Delivery]:
    """The hand-offs of a run that have a file yet."""
    for entry in run.case.handoff:
        path = run.folder.handoff / f"{entry.name}.nc"
        if path.exists():
            yield _delivery(entry.name, path)


def _delivery(name: str, path: Path) -> Delivery:
    with reading(path) as file:
        times = read_times(file)
        instants = np.unique(np.linspace(0, max(len(times) - 1, 0), INSTANTS).astype(int))
        instants = instants[: len(times)]
        rows = [_extremes(file, int(k)) for k in instants]
        fastest, pressure, lowest, highest = np.reshape(rows, (-1, 4)).T
        terms = ("net_flux", "volume_rate", "largest_face_flux", "level_drift")
        balance = {term: _read(file, term, len(times)) for term in terms if term in file.variables}
        return Delivery(
            name,
            times,
            len(file.dimensions["point"]),
            len(file.dimensions["column"]),
            balance or None,
            times[instants],
            fastest,
            pressure,
            lowest,
            highest,
            {key: str(file.getncattr(key)) for key in file.ncattrs()},
        )


def _extremes(file: Any, instant: int) -> tuple[float, float, float, float]:
    """Largest speed and pressure, lowest and highest surface at one instant."""
    u, v, w, p, level = (_filled(file[n][instant]) for n in ("u", "v", "w", "p", "elevation"))
    speed = np.sqrt(u**2 + v**2 + w**2)
    return _most(speed), _most(np.abs(p)), -_most(-level), _most(level)


def _most(values: Array) -> float:
    known = values[np.isfinite(values)]
    return float(known.max()) if known.size else np.nan


def _read(file: Any, name: str, count: int) -> Array:
    return _filled(file[name][:count])


def _filled(values: object) -> Array:
    return np.asarray(np.ma.filled(np.ma.asarray(values, dtype=np.float64), np.nan))
