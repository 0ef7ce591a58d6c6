"""bodies.nc and gauges.nc: what bodies and gauges did over time."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemwave import __version__
from bemwave.handoff.netcdf import Layout, SeriesFile, Variable
from bemwave.handoff.writer import CAUTION

MODES = ("surge", "sway", "heave", "roll", "pitch", "yaw")
FORCES = {
    "force": "of the water in all",
    "force_incident": "of the incident waves on the body as if it were not there",
    "force_scattered": "of the waves that the body throws back",
    "force_radiated": "of the waves that the body's motion makes",
    "force_restoring": "of the water's weight as the body leaves its place at rest",
}
RIDING = (
    'bodies with attitude = "follow" ride the surface and make no waves: heave, roll and pitch '
    "follow the plane nearest to it, surge and sway the water of the incident waves alone"
)
_SOURCE = f"bemwave {__version__}, linear potential theory"


class BodiesFile(SeriesFile):
    """Writes bodies.nc.

    Parameters
    ----------
    path : Path
    times : (n,) s, of all records that will be.
    names : sequence of str
        Of the bodies, those last that ride the surface.
    keep : int, optional
        Records of an interrupted run to keep.
    """

    def __init__(
        self, path: Path, times: ArrayLike, names: Sequence[str], keep: int | None = None
    ) -> None:
        dimensions = ("time", "body", "mode")
        about = "surge, sway, heave along and roll, pitch, yaw about the body's axes"
        series = [
            Variable(
                "motion",
                dimensions,
                "m",
                f"displacement from the mean position: {about}",
                attributes={"comment": f"m; degrees for roll, pitch and yaw; {RIDING}"},
            ),
            Variable(
                "velocity",
                dimensions,
                "m s-1",
                f"velocity: {about}",
                attributes={"comment": "m s-1; degrees s-1 for roll, pitch and yaw"},
            ),
        ]
        series += [
            Variable(
                name,
                dimensions,
                "N",
                f"pressure load about the centre of mass, body axes, {what}; weight and buoyancy "
                "at rest left out",
                attributes={"comment": "N; N m for roll, pitch and yaw; none of riding bodies"},
            )
            for name, what in FORCES.items()
        ]
        layout = Layout(
            dimensions={"body": len(names), "mode": len(MODES)},
            fixed=[
                (Variable("body", ("body",), "1", "name of the body", "str"), names_of(names)),
                (Variable("mode", ("mode",), "1", "name of the motion", "str"), names_of(MODES)),
            ],
            series=series,
            attributes={
                "title": "Motions of the bodies and loads on them",
                "source": _SOURCE,
                "caution": CAUTION,
            },
            times=np.asarray(times, dtype=np.float64),
        )
        self._count = len(names)
        super().__init__(path, layout, keep)

    def add(
        self,
        time: float,
        motion: ArrayLike,
        velocity: ArrayLike,
        forces: Mapping[str, ArrayLike],
    ) -> None:
        """Add a record.

        Parameters
        ----------
        time : s
        motion, velocity : (bodies, 6); m, rad and m/s, rad/s.
        forces : (bodies, 6) each, N and N m, by the names in `FORCES`; NaN where one is missing.
        """
        unknown = set(forces) - set(FORCES)
        if unknown:
            raise ValueError(f"forces {sorted(unknown)} given; known are {sorted(FORCES)}")
        none = np.full((self._count, len(MODES)), np.nan)
        values: dict[str, Any] = {name: forces.get(name, none) for name in FORCES}
        values |= {"motion": in_degrees(motion), "velocity": in_degrees(velocity)}
        self.append(time, values)


class GaugesFile(SeriesFile):
    """Writes gauges.nc.

    Parameters
    ----------
    path : Path
    times : (n,) s, of all records that will be.
    names : sequence of str
    positions : (gauges, 2) m, on earth.
    decks : (gauges,) m, level over still water to which the gap is told; NaN where none is.
    keep : int, optional
        Records of an interrupted run to keep.
    """

    def __init__(
        self,
        path: Path,
        times: ArrayLike,
        names: Sequence[str],
        positions: ArrayLike,
        decks: ArrayLike,
        keep: int | None = None,
    ) -> None:
        place = np.asarray(positions, dtype=np.float64).reshape(-1, 2)
        self._decks = np.asarray(decks, dtype=np.float64)
        dimensions = ("time", "gauge")
        layout = Layout(
            dimensions={"gauge": len(names)},
            fixed=[
                (Variable("name", ("gauge",), "1", "name of the gauge", "str"), names_of(names)),
                (Variable("x", ("gauge",), "m", "x of the gauge"), place[:, 0]),
                (Variable("y", ("gauge",), "m", "y of the gauge"), place[:, 1]),
            ],
            series=[
                Variable(name, dimensions, "m", text)
                for name, text in (
                    ("elevation", "elevation above still water"),
                    ("incident_elevation", "elevation of the incident waves alone"),
                    ("gap", "gap between the surface and the deck"),
                )
            ],
            attributes={"title": "Wave gauges", "source": _SOURCE, "caution": CAUTION},
            times=np.asarray(times, dtype=np.float64),
        )
        super().__init__(path, layout, keep)

    def add(self, time: float, elevation: ArrayLike, incident_elevation: ArrayLike) -> None:
        """Add a record: (gauges,) m; NaN on or inside a waterline."""
        total = np.asarray(elevation, dtype=np.float64)
        values = {
            "elevation": total,
            "incident_elevation": incident_elevation,
            "gap": self._decks - total,
        }
        self.append(time, values)


def in_degrees(modes: ArrayLike) -> NDArray[np.float64]:
    """Turn the angles of (..., 6) from radians to degrees."""
    scale = np.array([1.0, 1.0, 1.0, *[180.0 / np.pi] * 3])
    turned: NDArray[np.float64] = np.asarray(modes, dtype=np.float64) * scale
    return turned


def in_radians(modes: ArrayLike) -> NDArray[np.float64]:
    """Turn the angles of (..., 6) from degrees to radians."""
    return np.asarray(modes, dtype=np.float64) / in_degrees(np.ones(len(MODES)))


def names_of(names: Sequence[str]) -> NDArray[np.object_]:
    """Names as netCDF takes them."""
    return np.array(list(names), dtype=object)
