"""The incident sea of a case: its wave entries added up, mirrored where walls are straight."""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

from bemwave.case import Case
from bemwave.errors import InputError
from bemwave.flow.images import Mirror
from bemwave.waves import Sea, make_sea, sea_above_band, wavenumber_of_frequency

# Fewer panels than this in its length, and a wave is not scattered but only incident.
PANELS_PER_WAVELENGTH = 6.0


SHORTEST_DRAWN = 2.5  # squares of the frames in the shortest wave added to them
SHORTEST_GRAVITY_WAVE = 0.1  # m; below, surface tension matters (common practice, no source)
LEAST_LOOP = 3.0  # energy periods: no frequency near that of the energy moves by over a sixth


def incident_sea(case: Case, mirrors: tuple[Mirror, ...]) -> Sea:
    """The sum of the case's waves and, in front of walls, of their reflections.

    With [frames] loop their frequencies are snapped, so that all of it repeats.

    Raises
    ------
    InputError : if a table cannot be read, the loop is too short for the sea, or waves cross a
        channel between two walls.
    """
    water = case.water
    sea = Sea.still(water.depth, water.density, water.gravity)
    for number, wave in enumerate(case.waves):
        values = wave.model_dump(exclude_unset=True)
        if wave.file is not None:
            values["file"] = case.folder / wave.file
        sea = sea + make_sea(
            **values,
            depth=water.depth,
            density=water.density,
            gravity=water.gravity,
            stream=number,
        )
    _refuse_short_loop(sea, case)
    return _reflected(_looped(sea, case), mirrors)


def added_sea(case: Case, mirrors: tuple[Mirror, ...]) -> Sea:
    """What frames finer than the panels get besides: more of each spectrum above its band.

    None without [frames] region, with detail = false, or with a spacing no finer than the solver's.
    """
    water, frames = case.water, case.frames
    added = Sea.still(water.depth, water.density, water.gravity)
    if frames is None or frames.region is None or not frames.detail:
        return added
    if frames.spacing >= case.surface.spacing:
        return added
    shortest = max(SHORTEST_DRAWN * frames.spacing, SHORTEST_GRAVITY_WAVE)
    up_to = 2.0 * math.pi / period_of_length(shortest, water.depth, water.gravity)
    left_out = {"kind", "phase", "random_amplitudes", "spectrum", "focus", "file"}
    for number, wave in enumerate(case.waves):
        if wave.kind in ("jonswap", "pierson-moskowitz", "tma"):
            added = added + sea_above_band(
                wave.kind,
                up_to,
                **wave.model_dump(exclude_unset=True, exclude=left_out),
                depth=water.depth,
                density=water.density,
                gravity=water.gravity,
                stream=number,
            )
    return _reflected(_looped(added, case), mirrors)


def _looped(sea: Sea, case: Case) -> Sea:
    loop = 0.0 if case.frames is None else case.frames.loop
    return sea.looped(loop) if loop > 0.0 and sea.count else sea


def _refuse_short_loop(sea: Sea, case: Case) -> None:
    """Frequencies are moved to multiples of 2 pi/loop: too few of these hold no sea."""
    loop = 0.0 if case.frames is None else case.frames.loop
    if loop == 0.0 or not sea.count:
        return
    period = 2.0 * math.pi * sea.moment(-1) / sea.moment(0)
    if loop < LEAST_LOOP * period:
        raise InputError(
            f"[frames] loop = {loop:g} s was given for waves of {period:.3g} s (energy period); "
            f"expected at least {LEAST_LOOP:g} of them, {LEAST_LOOP * period:.3g} s, or their "
            "frequencies would move too far and too few be left: write a longer loop, or take it "
            "out"
        )


def _reflected(sea: Sea, mirrors: tuple[Mirror, ...]) -> Sea:
    for axis in ("x", "y"):
        walls = [m.position for m in mirrors if m.axis == axis]
        if len(walls) == 1:
            sea = sea + sea.mirrored(axis, walls[0])
        elif len(walls) == 2 and sea.count:
            _refuse_crossing(sea, axis)
    return sea


def _refuse_crossing(sea: Sea, axis: str) -> None:
    across = np.cos(sea.heading) if axis == "x" else np.sin(sea.heading)
    if np.abs(across).max() > 1e-9:
        raise InputError(
            f"[[waves]] travel between walls at {axis}_min and {axis}_max with headings that are "
            "not along them; expected long-crested waves along the channel: change heading, take "
            "out spreading, or open a wall"
        )


def scattered_sea(sea: Sea, spacing: float) -> tuple[Sea, float]:
    """The components long enough for panels of a spacing [m], and the energy share of the rest."""
    if not sea.count:
        return sea, 0.0
    enough = _long_enough(sea, spacing)
    energy = sea.amplitude**2
    return sea.keep(enough), float(energy[~enough].sum() / energy.sum())


def unscattered_sea(sea: Sea, spacing: float) -> Sea:
    """The other components: too short for panels of a spacing [m]."""
    return sea.keep(~_long_enough(sea, spacing))


def _long_enough(sea: Sea, spacing: float) -> npt.NDArray[np.bool_]:
    return np.asarray(2.0 * math.pi / sea.wavenumber >= PANELS_PER_WAVELENGTH * spacing)


def period_of_length(length: float, depth: float, gravity: float) -> float:
    """Period of a wave of a length [s]; linear dispersion."""
    k = 2.0 * math.pi / length
    return 2.0 * math.pi / math.sqrt(gravity * k * math.tanh(min(k * depth, 50.0)))


def length_of_period(period: float, depth: float, gravity: float) -> float:
    """Length of a wave of a period [m]."""
    return 2.0 * math.pi / float(wavenumber_of_frequency(2.0 * math.pi / period, depth, gravity))
