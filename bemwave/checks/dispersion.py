"""Dispersion of the solved waves, measured in the surface record against linear theory.

At the record's strongest frequency w the elevation is Re(a(x) exp(-i w t)); a free wave's a obeys
Helmholtz's equation, laplacian a = -k^2 a, whatever the directions it is made of. So k follows
from the record itself, over open water half a wavelength clear of bodies.
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt
from scipy.spatial import KDTree

from bemwave.flow.samplers import PanelSamplers
from bemwave.records import Run, Verdict
from bemwave.waves import wavenumber_of_frequency

Array = npt.NDArray[np.float64]

PERIODS = 4.0  # of the strongest wave, from the end of the record
LIMIT = 0.02
SOURCE = "linear dispersion relation (Airy 1845); limit common practice, no source"


def dispersion_verdict(run: Run) -> list[Verdict]:
    """The measured error of the wavenumber where a train of one frequency is there, or a forecast.

    Where no single frequency stands out, or there is no room clear of the bodies, the verdict is
    the forecast that the plan made, as "info"; so it is on the grid, which has no error of its own.
    """
    if run.sheet is not None:
        exact = "waves of the grid are exact in space and time"
        return [] if run.history is None else [Verdict("dispersion", 0.0, None, "info", exact)]
    measured = _measured(run)
    if measured is not None:
        return [
            Verdict("dispersion", measured, LIMIT, "pass" if measured <= LIMIT else "fail", SOURCE)
        ]
    forecast = run.manifest.notes.get("dispersion_forecast")
    if forecast is None:
        return []
    return [Verdict("dispersion", float(forecast), None, "info", "forecast of the scheme's error")]


def _measured(run: Run) -> float | None:
    frequency = _steady_frequency(run)
    history = run.history
    if frequency is None or history is None or not isinstance(run.flow, PanelSamplers):
        return None
    k = float(wavenumber_of_frequency(frequency, run.sea.depth, run.sea.gravity))
    places = _clear_places(run, math.pi / k)
    begin = history.times[-1] - PERIODS * 2 * math.pi / frequency
    if begin < run.manifest.notes.get("trustworthy_from", 0.0):
        return None  # the start-up is still in the record
    window = np.flatnonzero(history.times >= begin - 1e-9)
    interval = history.times[-1] - history.times[-2] if len(history.times) > 1 else math.inf
    if len(places) < 50 or frequency * interval > 1.5 or len(window) < 12:
        return None
    amplitude = _amplitude(run, window, frequency)
    recovery = run.flow.recovery(places)
    value, bend = recovery.value @ amplitude, recovery.laplacian @ amplitude
    energy = float(np.vdot(value, value).real)
    if energy == 0.0:
        return None
    squared = -float(np.vdot(value, bend).real) / energy
    return abs(math.sqrt(max(squared, 0.0)) / k - 1.0)


def _steady_frequency(run: Run) -> float | None:
    """The one frequency of all that makes waves in the case, or None."""
    case = run.case
    if case.hump or case.pressure or any(body.motions_file for body in case.body):
        return None
    periods = {m.period for m in case.wavemaker}
    periods |= {body.forced.period for body in case.body if body.forced is not None}
    if case.solved_bodies:
        if any(wave.kind != "regular" for wave in case.waves):
            return None
        periods |= {wave.period for wave in case.waves if wave.period is not None}
    return 2.0 * math.pi / periods.pop() if len(periods) == 1 else None


def _clear_places(run: Run, clearance: float) -> Array:
    """Places (n, 2) of the useful water at least `clearance` from bodies and from its edges."""
    surface = run.case.surface
    (x, y), (lx, ly) = surface.centre, surface.extent
    side = np.linspace(-0.5, 0.5, 41)
    plan = np.stack([g.ravel() for g in np.meshgrid(x + lx * side, y + ly * side)], axis=1)
    clear = np.array([surface.contains(*place) for place in plan])
    for hull in run.hulls:
        distance, _ = KDTree(hull.mesh.points[:, :2]).query(plan)
        clear &= distance > clearance
    return plan[clear & ~run.scene.solid(np.column_stack([plan, np.zeros(len(plan))]))]


def _amplitude(
    run: Run, window: npt.NDArray[np.int64], frequency: float
) -> npt.NDArray[np.complex128]:
    """Complex amplitude (nodes,) of the solved elevation at a frequency, by least squares."""
    assert run.history is not None
    times = run.history.times[window]
    record = np.array([run.history.record(int(i)).elevation for i in window])
    basis = np.column_stack(
        [np.cos(frequency * times), np.sin(frequency * times), np.ones(len(times))]
    )
    parts, *_ = np.linalg.lstsq(basis, record, rcond=None)
    return np.asarray(parts[0] + 1j * parts[1])
