"""Bodies moved by a file: six motions over time, joined smoothly."""

from __future__ import annotations

import csv
import math
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import numpy.typing as npt

from bemwave.errors import InputError
from bemwave.stepping.forcing import Ramp

Array = npt.NDArray[np.float64]

HEADER = ("t", "surge", "sway", "heave", "roll", "pitch", "yaw")
DEGREE = 5  # quintic: a tenth of a period between rows then leaves .1 % in the acceleration
STILL = 1e-9  # m/s; less is rounding
SAMPLES = 2**12, 2**20  # of the motions for their periods, at least and at most


class MotionFile:
    """Six motions about the centre of mass, from a csv file with the header
    t,surge,sway,heave,roll,pitch,yaw: s, m, degrees.

    Between rows runs the spline of degree five through them; velocity and acceleration are its
    derivatives.

    Parameters
    ----------
    path : Path
    duration : float
        Of the run, s, which the times must cover.

    Attributes
    ----------
    moved : tuple of int
        The numbers of the motions that are not zero throughout.

    Raises
    ------
    InputError
        If the file cannot be read, or its header, rows or times are not as expected.
    """

    def __init__(self, path: Path, duration: float) -> None:
        from scipy.interpolate import make_interp_spline

        rows = _read(path)
        times = rows[:, 0]
        _check_times(path, times, duration)
        units = np.array([1.0] * 3 + [math.pi / 180.0] * 3)
        self._duration = duration
        self._closest = float(np.diff(times).min())
        self._spline = make_interp_spline(times, rows[:, 1:] * units, k=DEGREE)
        self.moved = tuple(np.flatnonzero(rows[:, 1:].any(axis=0)).tolist())

    def derivative(self, times: Array, order: int = 0) -> Array:
        """The motions or their time derivatives, (times, 6) [m, rad, s]."""
        return np.asarray(self._spline(times, nu=order))

    def periods(self, arm: float) -> tuple[float, float] | None:
        """Longest and shortest period of what moves: 5 to 95 % of its velocity's variance [s].

        Parameters
        ----------
        arm : float
            Metres at which turning counts as moving along: half the body's length.

        Returns
        -------
        None where nothing moves.
        """
        # no coarser than the rows: quick motions of a long run would look slow
        count = int(np.clip(2.0 * self._duration / self._closest, *SAMPLES))
        times = np.linspace(0.0, self._duration, count, endpoint=False)
        velocity = self.derivative(times, 1) * ([1.0] * 3 + [arm] * 3)
        velocity -= velocity.mean(axis=0)
        if np.abs(velocity).max() < STILL:
            return None
        window = np.hanning(count)[:, None]  # else the ends, which do not meet, look like ripples
        power = (np.abs(np.fft.rfft(velocity * window, axis=0)) ** 2).sum(axis=1)[1:]
        share = np.cumsum(power) / power.sum()
        low, high = (int(np.searchsorted(share, part)) + 1 for part in (0.05, 0.95))
        return self._duration / low, self._duration / high


@dataclass(frozen=True)
class FileMotion:
    """One of a file's six motions times the start-up ramp, with two derivatives."""

    file: MotionFile
    mode: int
    ramp: Ramp

    def displacement(self, times: Array) -> Array:
        """(times,) [m or rad]."""
        return np.asarray(self.ramp.value(times) * self._of(times, 0))

    def velocity(self, times: Array) -> Array:
        """(times,) [m/s or rad/s]."""
        place, speed = self._of(times, 0), self._of(times, 1)
        return np.asarray(self.ramp.rate(times) * place + self.ramp.value(times) * speed)

    def acceleration(self, times: Array) -> Array:
        """(times,) [m/s^2 or rad/s^2]."""
        place, speed, gain = (self._of(times, order) for order in range(3))
        return np.asarray(
            self.ramp.curvature(times) * place
            + 2.0 * self.ramp.rate(times) * speed
            + self.ramp.value(times) * gain
        )

    def _of(self, times: Array, order: int) -> Array:
        return self.file.derivative(times, order)[:, self.mode]


def _read(path: Path) -> Array:
    """Rows (n, 7) of a file."""
    try:
        with path.open(newline="", encoding="utf-8-sig") as file:
            lines = [(number, row) for number, row in enumerate(csv.reader(file), 1) if row]
    except (OSError, UnicodeDecodeError) as fault:
        raise InputError(
            f"the motions {path} cannot be read ({fault}); expected a csv file"
        ) from fault
    header = [name.strip() for name in lines[0][1]] if lines else []
    if header != list(HEADER):
        raise InputError(
            f"the motions {path} have the header {','.join(header)!r}; expected "
            f"{','.join(HEADER)}: s, m and degrees about the centre of mass"
        )
    return np.array([_numbers(path, number, row) for number, row in lines[1:]]).reshape(-1, 7)


def _numbers(path: Path, line: int, row: list[str]) -> list[float]:
    try:
        numbers = [float(cell) for cell in row]
    except ValueError:
        numbers = []
    if len(numbers) != len(HEADER) or not all(map(math.isfinite, numbers)):
        raise InputError(
            f"line {line} of the motions {path} reads {','.join(row)!r}; expected "
            f"{len(HEADER)} numbers, {','.join(HEADER)}"
        )
    return numbers


def _check_times(path: Path, times: Array, duration: float) -> None:
    if len(times) <= DEGREE:
        raise InputError(
            f"the motions {path} have {len(times)} rows; expected at least {DEGREE + 1}, and ten "
            "or more in each period"
        )
    if np.any(np.diff(times) <= 0.0):
        at = times[1:][np.diff(times) <= 0.0][0]
        raise InputError(
            f"the motions {path} have the time t = {at:g} s after one that is not earlier; "
            "expected times that grow from row to row"
        )
    if times[0] > 1e-9 or times[-1] < duration * (1.0 - 1e-9):
        raise InputError(
            f"the motions {path} run from t = {times[0]:g} to {times[-1]:g} s; expected them to "
            f"cover the run, 0 to {duration:g} s: lengthen the file or shorten [run] duration"
        )
