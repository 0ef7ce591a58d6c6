"""Added mass, damping and wave loads of bodies at rest in open water, by period and heading.

See `stepping.in_waves` for what they are, and are not.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import fft

from bemwave.bodies.modes import MODES
from bemwave.flow.sheet import Sheet
from bemwave.geometry.hull import Hull
from bemwave.stepping.in_waves import BodiesOnGrid, SteadyWaves
from bemwave.waves import wavelength

Array = npt.NDArray[np.float64]
Complex = npt.NDArray[np.complex128]

LAYER = 2.0  # width of the absorber in the longest waves: one of 1 leaves coefficients 1 % off


@dataclass(frozen=True, eq=False)
class Response:
    """Coefficients under the names, and with the dimensions, of response.nc.

    Attributes
    ----------
    period, heading : (p,) s, (h,) rad, directions of travel on earth.
    modes : labels such as "platform/heave" of the 6 n loads, and of the motions.
    added_mass, damping : (p, loads, motions).
    wave_load_amplitude : (p, h, loads) in waves of amplitude 1 m [N, N m].
    wave_load_phase : (p, h, loads), rad: the load goes with cos(phase - w t) where the incident
        elevation at its body's origin is cos(w t).
    returned : (p,) what comes back from the absorber, or passes it, of waves of amplitude 1.
    """

    period: Array
    heading: Array
    modes: tuple[str, ...]
    added_mass: Array
    damping: Array
    wave_load_amplitude: Array
    wave_load_phase: Array
    returned: Array


def response(
    hulls: Sequence[Hull],
    periods: Sequence[float],
    headings: Sequence[float],
    *,
    spacing: float,
    depth: float,
    density: float,
    gravity: float,
) -> Response:
    """Coefficients of bodies at rest.

    Parameters
    ----------
    hulls : the bodies in their places.
    periods, headings : s, rad.
    spacing : of the grid, m.
    depth : m, or math.inf.
    density, gravity : kg/m^3, m/s^2.

    Raises
    ------
    InputError
        If the spacing is too large for the shortest waves, or panels for a waterline.
    RunError
        If the iterations do not converge.
    """
    longest = float(np.max(wavelength(periods, depth, gravity)))
    sheet, useful = water_round(hulls, spacing, LAYER * longest, depth)
    bodies = BodiesOnGrid(hulls, sheet, useful, density, gravity)
    waves = [SteadyWaves(bodies, period) for period in periods]
    coefficients = [w.added_mass_and_damping() for w in waves]
    loads = np.array([[_load(w, heading) for heading in headings] for w in waves])
    loads = loads.reshape(len(periods), len(headings), len(MODES) * len(hulls))
    return Response(
        period=np.array(periods, dtype=float),
        heading=np.array(headings, dtype=float),
        modes=tuple(f"{hull.name}/{mode}" for hull in hulls for mode in MODES),
        added_mass=np.array([mass for mass, _ in coefficients]),
        damping=np.array([damping for _, damping in coefficients]),
        wave_load_amplitude=np.abs(loads),
        wave_load_phase=np.angle(loads),
        returned=np.array([max(w.layer.reflection, w.layer.passed) for w in waves]),
    )


def water_round(
    hulls: Sequence[Hull], spacing: float, absorber: float, depth: float
) -> tuple[Sheet, Array]:
    """A grid with hulls in its middle, half their size of useful water and an absorber round them.

    Returns
    -------
    sheet : its sides transform quickly; what they are rounded up by widens the absorber.
    useful : (2, 2) least and largest x, y of the useful water [m].
    """
    plan = np.concatenate([hull.mesh.points[:, :2] for hull in hulls])
    low, high = plan.min(axis=0), plan.max(axis=0)
    clear = 0.5 * float((high - low).max())
    useful = np.array([low - clear, high + clear])
    sides = (useful[1] - useful[0] + 2.0 * absorber) / spacing
    nx, ny = (8 * fft.next_fast_len(math.ceil(side / 8), real=True) for side in sides)
    west, south = 0.5 * (low + high) - 0.5 * spacing * np.array([nx, ny])
    return Sheet(float(west), float(south), spacing, (nx, ny), depth), useful


def _load(waves: SteadyWaves, heading: float) -> Complex:
    """(6 n,) turned to incident waves whose elevation is cos(w t) at each body's own origin."""
    sea = waves.sea(heading)
    x, y, _ = np.array([hull.place(np.zeros(3)) for hull in waves.bodies.hulls]).T
    there = waves.amplitude(lambda times: sea.elevation(x, y, times))
    return np.asarray(waves.scattered(heading).load() / np.repeat(there, len(MODES)))
