"""The dispersion that the page measures, against waves whose dispersion is known."""

from __future__ import annotations

import math
from types import SimpleNamespace

import numpy as np
import pytest

from bemwave.report.dispersion import measure
from bemwave.report.film import Film, frame_times

GRAVITY = 9.80665


def film_of(waves: list[tuple[float, float, float, float]], hole: bool = False) -> Film:
    """Plane waves as (frequency, wavenumber, heading, amplitude) on still water."""
    x, y, times = np.linspace(-30, 30, 91), np.linspace(-25, 25, 76), np.linspace(0, 40, 160)
    at = np.meshgrid(x, y)
    total = np.zeros((len(times), *at[0].shape))
    for frequency, k, heading, amplitude in waves:
        along = k * (math.cos(heading) * at[0] + math.sin(heading) * at[1])
        total += amplitude * np.cos(along[None] - frequency * times[:, None, None])
    if hole:
        total[:, np.hypot(*at) < 3.0] = np.nan
    return Film(x, y, times, total, np.zeros_like(total), np.ones(at[0].shape, dtype=bool))


def run_of(depth: float) -> SimpleNamespace:
    return SimpleNamespace(sea=SimpleNamespace(depth=depth, gravity=GRAVITY), hulls=())


@pytest.mark.parametrize("depth", [math.inf, 3.0])
@pytest.mark.parametrize("hole", [False, True])
def test_free_waves_are_on_the_curve(depth: float, hole: bool) -> None:
    waves = []
    for k, heading in ((0.35, 0.3), (0.35, 2.0), (0.9, -1.0)):
        # dispersion relation of linear theory (Airy 1845)
        frequency = math.sqrt(GRAVITY * k * (1.0 if math.isinf(depth) else math.tanh(k * depth)))
        waves.append((frequency, k, heading, 0.1))
    bands = measure(run_of(depth), film_of(waves, hole))  # type: ignore[arg-type]
    assert {round(band.theory, 2) for band in bands} == {0.35, 0.9}
    assert max(abs(band.error) for band in bands) < 0.005


def test_a_wave_off_the_curve_is_found_out() -> None:
    waves = [(math.sqrt(GRAVITY * 0.5), 1.1 * 0.5, 0.4, 0.1)]
    bands = measure(run_of(math.inf), film_of(waves))  # type: ignore[arg-type]
    assert np.mean([band.error for band in bands]) == pytest.approx(0.1, abs=0.01)


def test_frames_follow_the_peak_and_are_the_latest() -> None:
    records = np.linspace(0.0, 100.0, 2001)
    times = frame_times(records, 8.0)
    assert np.diff(times) == pytest.approx(0.5)  # a sixteenth of the period
    assert (times[-1], len(times)) == (100.0, 201)
    assert len(frame_times(np.linspace(0.0, 900.0, 9001), 8.0)) == 240
    assert frame_times(np.linspace(0.0, 9.0, 5), 1.0) == pytest.approx(np.linspace(0.0, 9.0, 5))
    assert len(frame_times(records, math.inf)) <= 240
    filled = frame_times(np.linspace(0.0, 28.0, 29), 5.0)
    assert np.diff(filled) == pytest.approx(0.25)  # a quarter of the interval of the records
