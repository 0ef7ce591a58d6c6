"""energy.nc: the energy of the solved field over time, and what comes in and goes out."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np
import numpy.typing as npt
from scipy.integrate import cumulative_simpson, cumulative_trapezoid

from bemwave import __version__
from bemwave.handoff.netcdf import Layout, SeriesFile, Variable, read_times, reading

Array = npt.NDArray[np.float64]

_SERIES = {
    "energy": ("J", "energy of the solved field"),
    "power_in": ("W", "power put in by hulls, moving walls and pressure patches"),
    "power_absorbed": ("W", "power taken by the absorber"),
}


class EnergyFile(SeriesFile):
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
        super().__init__(path, layout, keep)

    def add(self, time: float, energy: float, power_in: float, power_absorbed: float) -> None:
        """Add a record: J, W, W."""
        values = {"energy": energy, "power_in": power_in, "power_absorbed": power_absorbed}
        self.append(time, values)


@dataclass(frozen=True)
class Ledger:
    """The energy of the solved field over time: (n,) each.

    times : s.  energy : J.  power_in, power_absorbed : W.
    """

    times: Array
    energy: Array
    power_in: Array
    power_absorbed: Array

    @property
    def came_in(self) -> Array:
        """What was there at first and was put in since, J."""
        return np.asarray(self.energy[0] + _integral(self.power_in, self.times))

    @property
    def taken(self) -> Array:
        """What the absorber has taken, J."""
        return _integral(self.power_absorbed, self.times)

    @property
    def missing(self) -> Array:
        """What came in and is neither there nor taken, over the largest energy there was."""
        scale = max(np.abs(self.energy).max(), np.abs(self.came_in - self.energy[0]).max())
        lost: Array = (self.came_in - self.energy - self.taken) / (scale or 1.0)
        return lost


def _integral(rate: Array, times: Array) -> Array:
    if len(times) < 3:  # Simpson's rule needs three
        return np.asarray(cumulative_trapezoid(rate, x=times, initial=0))
    return np.asarray(cumulative_simpson(rate, x=times, initial=0.0))


def read_energy(path: Path) -> Ledger:
    """The ledger in energy.nc."""
    with reading(path) as file:
        times = read_times(file)
        energy, power_in, absorbed = (
            np.asarray(file[name][: len(times)], dtype=np.float64) for name in _SERIES
        )
    return Ledger(times, energy, power_in, absorbed)
