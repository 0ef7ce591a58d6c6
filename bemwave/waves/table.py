"""Seas from a table: a csv file of densities over frequency (and heading), or of components.

The header says which of three tables it is; rows may stand in any order.

frequency_rad_s,density_m2s                         a spectrum
frequency_rad_s,heading_deg,density_m2s_per_rad     a directional spectrum: every heading at
                                                    every frequency
frequency_rad_s,heading_deg,amplitude_m,phase_deg   the plane waves themselves

Densities are linear between their rows and zero outside them. Headings go round the circle if
the gap between the last and the first is no wider than the widest between neighbours.
"""

from __future__ import annotations

import csv
import math
from itertools import pairwise
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from bemwave.errors import InputError
from bemwave.waves.synthesis import Headings, Spectrum

Array = NDArray[np.float64]

SPECTRUM = ("frequency_rad_s", "density_m2s")
DIRECTIONAL = ("frequency_rad_s", "heading_deg", "density_m2s_per_rad")
PLANE_WAVES = ("frequency_rad_s", "heading_deg", "amplitude_m", "phase_deg")


def read_table(path: Path) -> tuple[tuple[str, ...], Array]:
    """Read a table: its header, one of the three above, and its rows (n, columns).

    Raises
    ------
    InputError
        If the file is missing, its header is none of the three, or a row does not fit it.
    """
    try:
        with path.open(newline="", encoding="utf-8-sig") as file:
            lines = [(number, row) for number, row in enumerate(csv.reader(file), 1) if row]
    except (OSError, UnicodeDecodeError) as fault:
        raise InputError(
            f"the wave table {path} cannot be read ({fault}); expected a csv file"
        ) from fault
    header = tuple(name.strip() for name in lines[0][1]) if lines else ()
    if header not in (SPECTRUM, DIRECTIONAL, PLANE_WAVES):
        known = "; ".join(",".join(names) for names in (SPECTRUM, DIRECTIONAL, PLANE_WAVES))
        raise InputError(
            f"the wave table {path} has the header {','.join(header)!r}; expected one of: {known}"
        )
    rows = [_numbers(path, number, row, len(header)) for number, row in lines[1:]]
    if not rows:
        raise InputError(f"the wave table {path} has no rows under its header; add at least one")
    return header, np.array(rows)


def _numbers(path: Path, line: int, row: list[str], columns: int) -> list[float]:
    try:
        numbers = [float(cell) for cell in row]
    except ValueError:
        numbers = []
    if len(numbers) != columns or not all(map(math.isfinite, numbers)) or numbers[0] < 0:
        raise InputError(
            f"line {line} of the wave table {path} reads {','.join(row)!r}; expected {columns} "
            "numbers, the first a frequency not below zero"
        )
    return numbers


def tabled_spectrum(path: Path, frequency: Array, density: Array, period: float | None) -> Spectrum:
    """Spectrum that is linear between rows (rad/s, m^2 s); its energies are exact integrals.

    Without a peak period the peak is the row of the largest density.
    """
    order = np.argsort(frequency)
    w, s = frequency[order], density[order]
    if len(w) < 2 or np.any(np.diff(w) == 0) or np.any(s < 0) or not s.any():
        raise InputError(
            f"the wave table {path} is no spectrum; expected two or more different frequencies, "
            "each once, with densities not below zero and some above"
        )
    below = np.concatenate([[0.0], np.cumsum(np.diff(w) * (s[1:] + s[:-1]) / 2)])

    def energy(edges: Array) -> Array:
        at = np.clip(edges, w[0], w[-1])
        row = np.clip(np.searchsorted(w, at, side="right") - 1, 0, len(w) - 2)
        cumulative = below[row] + (at - w[row]) * (s[row] + np.interp(at, w, s)) / 2
        # above its true value only by rounding, where the density is zero
        return np.maximum(np.diff(cumulative), 0.0)

    peak = 2 * math.pi / period if period else float(w[np.argmax(s)])
    return Spectrum(energy, peak, float(below[-1]))


def tabled_headings(
    path: Path, frequency: Array, heading: Array, density: Array
) -> tuple[Array, Array, Headings]:
    """Frequencies, density over frequency alone, and the inverse distribution of the headings.

    The arguments are the columns of a directional table: rad/s, rad, m^2 s/rad.
    """
    w, row = np.unique(frequency, return_inverse=True)
    theta, column = np.unique(heading, return_inverse=True)
    grid = np.full((len(w), len(theta)), np.nan)
    grid[row, column] = density
    if len(frequency) != grid.size or np.isnan(grid).any() or len(theta) < 2:
        raise InputError(
            f"the wave table {path} has {len(frequency)} rows for {len(w)} frequencies and "
            f"{len(theta)} headings; expected every heading once at every frequency, two or more"
        )
    gap = theta[0] + 2 * math.pi - theta[-1]
    if 0 < gap <= 1.001 * np.diff(theta).max():
        theta = np.append(theta, theta[0] + 2 * math.pi)
        grid = np.column_stack([grid, grid[:, 0]])

    # linear between columns, on a finer grid for the inverse of the distribution
    fine = np.concatenate([np.linspace(a, b, 32, endpoint=False) for a, b in pairwise(theta)])
    fine = np.append(fine, theta[-1])
    rows = np.array([np.interp(fine, theta, values) for values in grid])
    # jitter may put a frequency just outside the energy of its stratum: it needs a heading too
    rows += 1e-9 * rows.mean(axis=0)

    def headings(at: Array, fraction: Array) -> Array:
        low = np.clip(np.searchsorted(w, at) - 1, 0, len(w) - 2)
        part = np.clip((at - w[low]) / (w[low + 1] - w[low]), 0.0, 1.0)
        found = np.empty(len(at))
        for i, (j, p) in enumerate(zip(low, part, strict=True)):
            values = (1 - p) * rows[j] + p * rows[j + 1]
            steps = np.diff(fine) * (values[1:] + values[:-1]) / 2
            below = np.concatenate([[0.0], np.cumsum(steps)])
            found[i] = np.interp(fraction[i] * below[-1], below, fine)
        return found

    return w, np.trapezoid(grid, theta, axis=1), headings
