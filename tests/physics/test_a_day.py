"""A day of model time by the whole program: nothing is lost where nothing takes it, nor made.

Conservation of energy, no other source. A box of 80 m held in a harbour basin (panels), and the
same box let lie in open water after it was heaved for two minutes (grid), coarse both.
"""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import pytest

from bemwave.case import Case
from bemwave.records.energy import read_energy
from bemwave.running import run

DAY = 86400.0  # s
DURATIONS = [
    pytest.param(2000.0, marks=pytest.mark.slow),
    pytest.param(DAY, marks=pytest.mark.long),
]
BOX = {"name": "barge", "form": "box", "length": 80.0, "beam": 40.0, "draught": 12.0}
WATER = {"depth": 30.0}


def energy_of(case: Case, out: Path) -> tuple[npt.NDArray[np.float64], npt.NDArray[np.float64]]:
    """Times and energies of a whole run [s, J]."""
    run(case, out)
    kept = read_energy(out / "energy.nc")
    assert kept.times[-1] == case.run.duration
    return kept.times, kept.energy


def basin(duration: float) -> Case:
    """A mound let go in 400 x 200 m within walls."""
    surface: dict[str, Any] = {"size": [400.0, 200.0], "spacing": 24.0, "fine_spacing": 16.0}
    return Case(
        water=WATER,
        surface=surface | {"edges": "wall"},
        body=[BOX | {"panel_size": 16.0}],
        hump=[{"height": 0.5, "width": 40.0, "centre": [-120.0, -30.0]}],
        run={"duration": duration, "record_every": 400.0},
    )


@pytest.mark.parametrize("duration", DURATIONS)
def test_a_basin_with_a_held_hull_keeps_its_energy(
    duration: float, tmp_path: Path, needs_gmsh: None
) -> None:
    times, energy = energy_of(basin(duration), tmp_path / "run")
    share = energy / energy[0] - 1.0
    line, covariance = np.polyfit(times[1:] / duration, share[1:], 1, cov=True)
    print(f"energy within {np.abs(share).max():.2g}, trend {line[0]:.2g} over the run")
    assert np.abs(share).max() < 0.01
    # no trend: the line through all rises or falls by no more than it scatters
    assert abs(line[0]) < max(4.0 * np.sqrt(covariance[0, 0]), 1e-4)


MOVED = 126.0  # s


def open_water(duration: float, home: Path) -> Case:
    """Heaved for two minutes in waves of 14 s, then at rest until the end."""
    times = np.arange(0.0, duration + 0.5)
    rows = np.zeros((len(times), 7))
    rows[:, 0] = times
    eased = np.sin(np.pi * np.clip(times / MOVED, 0.0, 1.0)) ** 4
    rows[:, 3] = 0.5 * eased * np.sin(2.0 * np.pi * times / 14.0)
    header = "t,surge,sway,heave,roll,pitch,yaw"
    np.savetxt(home / "motions.csv", rows, delimiter=",", header=header, comments="")
    return Case(
        water=WATER,
        surface={"size": [200.0, 160.0], "spacing": 12.0, "route": "grid"},
        body=[BOX | {"panel_size": 12.0, "attitude": str(home / "motions.csv")}],
        run={"duration": duration, "record_every": 400.0},
    )


@pytest.mark.parametrize("duration", DURATIONS)
def test_open_water_on_the_grid_comes_to_rest_and_stays_so(duration: float, tmp_path: Path) -> None:
    times, energy = energy_of(open_water(duration, tmp_path), tmp_path / "run")
    peak, spans = energy.max(), np.array_split(energy[times > MOVED], round(duration / 200.0))
    greatest = np.array([span.max() for span in spans]) / peak
    growth = float(np.diff(greatest).max())
    print(
        f"left after 1000 s {greatest[5]:.2g}, at the end {greatest[-1]:.2g}, growth {growth:.2g}"
    )
    assert growth < 1e-20  # of the peak: what is left falls, down to nothing
    assert greatest[5] < 1e-15
    assert energy.min() > -1e-15 * peak  # a growing mode would have less than none
