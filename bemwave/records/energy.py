"""energy.nc: the energy of the solved field over time, and what comes in and goes out."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import numpy.typing as npt

from bemwave import __version__
from bemwave.handoff.netcdf import Layout, SeriesFile, Variable, read_times, reading

Array = npt.NDArray[np.float64]

_SERIES = {
    "energy": ("J", "energy of the solved field"),
    "power_in": ("W", "power put in by hulls, moving walls and pressure patches"),
    "power_absorbed": ("W", "power taken by the absorber"),
}


class EnergyFile:
    """Writes energy.nc at `times` (n,) s; `keep` records of an interrupted run are kept."""

    def __init__(self, path: Path, times: npt.ArrayLike, keep: int | None = None) -> None:
        layout = Layout(
            dimensions={},
            fixed=[],
            series=[Variable(n, ("time",), units, text) for n, (units, text) in _SERIES.items()],
            attributes={
                "title": "Energy of the solved part of the water, incident waves left out",
                "source": f"bemwave {__version__}, linear potential theory",
            },
            times=np.asarray(times, dtype=np.float64),
        )
        self._file = SeriesFile(path, layout, keep)

    def append(self, time: float, energy: float, power_in: float, power_absorbed: float) -> None:
        """Add a record: J, W, W."""
        values = {"energy": energy, "power_in": power_in, "power_absorbed": power_absorbed}
        self._file.append(time, values)

    @property
    def count(self) -> int:
        """Number of records given so far."""
        return self._file.count

    def flush(self) -> None:
        """Put every record given so far on the disk."""
        self._file.flush()


def read_energy(path: Path) -> tuple[Array, Array, Array, Array]:
    """Times [s], energy [J], power put in and power absorbed [W], (n,) each."""
    with reading(path) as file:
        times = read_times(file)
        energy, power_in, absorbed = (
            np.asarray(file[name][: len(times)], dtype=np.float64) for name in _SERIES
        )
    return times, energy, power_in, absorbed
