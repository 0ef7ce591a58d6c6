"""The solved waves' frequencies and wavelengths, measured in the run, beside linear theory.

In each band of frequencies the solved elevation is a(x) of free waves, for which
laplacian a = -k^2 a whatever their directions. So k follows from the record itself, in open water
half a wavelength clear of bodies, and w likewise from its second difference in time. Both have the
same weights, so that waves between two bands count at their own frequency.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
from scipy.spatial import KDTree

from bemwave.records import Run
from bemwave.report.colours import light
from bemwave.report.figures import Figure, drawn
from bemwave.report.film import Film
from bemwave.waves import wavenumber_of_frequency

Array = npt.NDArray[np.float64]
Complexes = npt.NDArray[np.complex128]

LEAST_SHARE = 0.03  # of the strongest band's energy
LEAST_PLACES = 50
LONGEST_STEP = 0.8  # k times the grid's spacing, beyond which its differences err by 0.5 %
LEAST_FRAMES = 24


@dataclass(frozen=True)
class Measured:
    """One band: frequency, rad/s; wavenumber, 1/m; the theory's; energy over the strongest's."""

    frequency: float
    wavenumber: float
    theory: float
    share: float

    @property
    def error(self) -> float:
        """Of the wavenumber, over the theory's."""
        return self.wavenumber / self.theory - 1.0


def measure(run: Run, film: Film) -> list[Measured]:
    """Measure every band that has energy, and room clear of bodies; none where there is none."""
    if len(film.times) < LEAST_FRAMES:
        return []
    solved = np.nan_to_num(film.scattered)
    interval = float(film.times[-1] - film.times[0]) / (len(film.times) - 1)
    bent = solved[2:] - 2.0 * solved[1:-1] + solved[:-2]
    window = np.hanning(len(bent) + 2)[1:-1, None, None]
    amplitude = np.fft.rfft(window * solved[1:-1], axis=0)
    in_time = np.fft.rfft(window * bent, axis=0) / interval**2
    from_body = _distance_from_bodies(run, film)
    energy = (np.abs(amplitude) ** 2).sum(axis=(1, 2))
    strongest = float(energy[1:].max(initial=0.0))
    found = []
    for band in range(1, len(energy)):
        if energy[band] <= LEAST_SHARE * strongest:
            continue
        rough = 2.0 * math.pi * band / (len(bent) * interval)
        k = float(wavenumber_of_frequency(rough, run.sea.depth, run.sea.gravity))
        clear = _inner(film) & (from_body > math.pi / k)
        if clear.sum() < LEAST_PLACES or k * max(film.spacing) > LONGEST_STEP:
            continue
        one = _band(run, film, amplitude[band], in_time[band], clear, interval)
        if one is not None:
            found.append(Measured(*one, share=float(energy[band]) / strongest))
    return found


def _band(
    run: Run, film: Film, a: Complexes, in_time: Complexes, clear: npt.NDArray[np.bool_], dt: float
) -> tuple[float, float, float] | None:
    """Frequency, wavenumber and the theory's wavenumber of one band."""
    in_space = _laplacian(a, *film.spacing)
    size = float((np.abs(a[clear]) ** 2).sum())
    squares = [-float(np.vdot(a[clear], b[clear]).real) / size for b in (in_time, in_space)]
    turn = 0.5 * dt * math.sqrt(max(squares[0], 0.0))
    if not 0.0 < turn < 1.0 or squares[1] <= 0.0:
        return None
    frequency = 2.0 / dt * math.asin(turn)  # undoes the second difference, wave by wave
    theory = float(wavenumber_of_frequency(frequency, run.sea.depth, run.sea.gravity))
    return frequency, math.sqrt(squares[1]), theory


def _laplacian(a: Complexes, dx: float, dy: float) -> Complexes:
    """Fourth-order differences; meaningless in the two outer rows."""
    weights = ((-2, -1.0), (-1, 16.0), (0, -30.0), (1, 16.0), (2, -1.0))
    across = sum(w * np.roll(a, shift, axis=0) for shift, w in weights) / (12.0 * dy**2)
    along = sum(w * np.roll(a, shift, axis=1) for shift, w in weights) / (12.0 * dx**2)
    return np.asarray(across + along)


def _inner(film: Film) -> npt.NDArray[np.bool_]:
    """Places whose differences need water alone, two grid cells each way."""
    wet = np.pad(film.wet, 2, constant_values=False)
    shifts = [(2 + k, 2) for k in range(-2, 3)] + [(2, 2 + k) for k in range(-2, 3)]
    ny, nx = film.wet.shape
    inner = [wet[j : j + ny, i : i + nx] for j, i in shifts]
    return np.asarray(np.all(inner, axis=0))


def _distance_from_bodies(run: Run, film: Film) -> Array:
    """Distance of every place from the nearest body's plan (ny, nx), m."""
    plan = np.stack(np.meshgrid(film.x, film.y), axis=-1)
    distance = np.full(film.wet.shape, math.inf)
    for hull in run.hulls:
        distance = np.minimum(distance, KDTree(hull.mesh.points[:, :2]).query(plan)[0])
    return distance


def dispersion_figure(run: Run, bands: Sequence[Measured], folder: Path) -> Figure:
    """Measured frequencies and wavenumbers over the curve of linear theory."""
    worst = max(abs(band.error) for band in bands)
    count = "one band" if len(bands) == 1 else f"{len(bands)} bands"
    low = 0.7 * min(b.frequency for b in bands)
    high = 1.3 * max(b.frequency for b in bands)
    curve = np.linspace(low, high, 80)
    k = wavenumber_of_frequency(curve, run.sea.depth, run.sea.gravity)

    def draw(sheet: Any) -> None:
        axes = sheet.add_subplot()
        axes.plot(k, curve, color=light("line1"), label="linear theory")
        size = [18.0 + 60.0 * band.share for band in bands]
        points = np.array([(band.wavenumber, band.frequency) for band in bands]).T
        axes.scatter(*points, s=size, facecolor="none", edgecolor=light("line2"), label="measured")
        axes.set(xlabel="wavenumber k, 1/m", ylabel="frequency, rad/s")
        sheet.legend(loc="outside upper left", ncols=2)

    return drawn(
        "dispersion",
        "Frequency and wavenumber of the solved waves, measured in open water half a wavelength "
        "clear of bodies, on the curve of linear theory. Larger rings hold more energy.",
        f"Of {count} the measured wavenumber is off by {100 * worst:.1f} % at most.",
        draw,
        folder,
        2.9,
    )
