"""make_sea: a wave entry of a case, as plain values, to a Sea."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace
from functools import partial
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from bemwave.errors import InputError
from bemwave.waves import spectra
from bemwave.waves.dispersion import SEA_WATER_DENSITY, STANDARD_GRAVITY
from bemwave.waves.sea import Sea
from bemwave.waves.spreading import spreading_quantile
from bemwave.waves.synthesis import (
    DEFAULT_BAND,
    Components,
    Headings,
    Spectrum,
    draw_components,
    smooth_spectrum,
)
from bemwave.waves.table import (
    DIRECTIONAL,
    PLANE_WAVES,
    read_table,
    tabled_headings,
    tabled_spectrum,
)

Array = NDArray[np.float64]
Water = tuple[float, float, float]  # depth, density, gravity

SPECTRA = ("jonswap", "pierson-moskowitz", "tma")
KINDS = ("regular", *SPECTRA, "group", "table")


def make_sea(
    kind: str,
    *,
    depth: float,
    density: float = SEA_WATER_DENSITY,
    gravity: float = STANDARD_GRAVITY,
    height: float | None = None,
    period: float | None = None,
    heading: float = 0.0,
    phase: float = 0.0,
    peakedness: float = 3.3,
    spreading: float | None = None,
    components: int = 1000,
    seed: int = 1,
    band: tuple[float, float] | None = None,
    random_amplitudes: bool = False,
    spectrum: str = "jonswap",
    focus: tuple[float, float, float] = (0.0, 0.0, 0.0),
    file: str | Path | None = None,
    stream: int = 0,
) -> Sea:
    """Make the sea of one wave entry; the arguments are the keys of the case file.

    Parameters
    ----------
    kind : str
        "regular", "jonswap", "pierson-moskowitz", "tma", "group" or "table".
    depth, density, gravity : float
        Water depth in m (`math.inf`: deep), kg/m^3, m/s^2.
    height : float
        m. Regular: crest to trough. Spectra: significant height, met exactly by one common
        factor on all amplitudes. Group: elevation of the crest at the focus. Table: optional,
        the significant height to rescale to.
    period : float
        s. Regular: the period; spectra: peak period. Table: optional, the peak period in whose
        frequency the band counts, else that of the largest density.
    heading, phase : float
        Degrees; direction of travel counter-clockwise from +x, the mean one for a spectrum.
    peakedness : float
        Of jonswap and tma.
    spreading : float, optional
        s of cos^2s(theta/2); without it long-crested.
    components : int
        Plane waves in the default band; a wider band has more, of the same spacing.
    seed : int
        0 .. 2^64 - 1; the same seed gives the same sea everywhere.
    band : (float, float), optional
        Kept, in peak frequencies; default (.5, 4), for a table all of it.
    random_amplitudes : bool
        Amplitudes after Rayleigh's distribution instead of the spectrum's own.
    spectrum : str
        Group: the spectrum it is made of. Amplitudes are as the energies: the mean shape of a
        great crest in that sea (Tromans, Anaturk & Hagemeijer 1991, ISOPE).
    focus : (float, float, float)
        Group: x, y in m and t in s at which all crests meet.
    file : path
        Table: the csv file, see `bemwave.waves.table`.
    stream : int
        Number of the entry in its case, so that two entries of one seed are not one sea twice.

    Returns
    -------
    Sea

    Raises
    ------
    InputError
        If a value is missing or out of range, or a table is faulty.

    Examples
    --------
    >>> sea = make_sea("jonswap", depth=40.0, height=2.0, period=8.0, heading=30.0)
    >>> sea.count, round(sea.significant_height, 12)
    (1000, 2.0)
    """
    if kind not in KINDS:
        raise InputError(f"the wave kind {kind!r} is not known; expected one of {', '.join(KINDS)}")
    if components < 1:
        raise InputError(f"a wave's `components` was given as {components}; expected 1 or more")
    if spreading is not None and not spreading >= 0:
        raise InputError(f"a wave's `spreading` was given as {spreading:g}; expected 0 or more")
    if band is not None and not 0 <= band[0] < band[1]:
        raise InputError(
            f"a wave's `band` was given as {list(band)}; expected [low, high], 0 <= low < high"
        )
    water = (depth, density, gravity)
    headings = headings_about(math.radians(heading), spreading)
    draw = partial(
        draw_components,
        components=components,
        seed=seed,
        stream=stream,
        random_amplitudes=random_amplitudes,
    )
    if kind == "table":
        sea = _sea_of_table(file, period, band, headings, draw, water)
        return sea if height is None else _rescaled(sea, _positive("height", height))
    height, period = _positive("height", height), _positive("period", period)
    if kind == "regular":
        turn = math.radians(phase)
        return Sea.of([2 * math.pi / period], math.radians(heading), height / 2, turn, *water)
    shape = spectrum if kind == "group" else kind
    source = spectrum_of(shape, height, period, peakedness, depth, gravity)
    sea = _sea_of_draw(draw(source, headings, band=band or DEFAULT_BAND), water)
    return _focused(sea, height, focus) if kind == "group" else _rescaled(sea, height)


def _positive(name: str, value: float | None) -> float:
    if value is None or not 0 < value < math.inf:
        given = "not given" if value is None else f"given as {value:g}"
        raise InputError(f"a wave's `{name}` was {given}; expected a number above zero")
    return value


def headings_about(mean: float, spreading: float | None) -> Headings:
    """Inverse distribution of the headings (rad), the same at every frequency."""

    def headings(frequency: Array, fraction: Array) -> Array:
        if spreading is None:
            return np.full(frequency.shape, mean)
        return mean + spreading_quantile(fraction, spreading)

    return headings


def spectrum_of(
    shape: str, height: float, period: float, peakedness: float, depth: float, gravity: float
) -> Spectrum:
    """Spectrum of a shape, one of `SPECTRA`: m, s, m, m/s^2."""
    if shape not in SPECTRA:
        raise InputError(
            f"the spectrum of a wave group was given as {shape!r}; expected one of "
            f"{', '.join(SPECTRA)}"
        )

    def density(w: Array) -> Array:
        if shape == "pierson-moskowitz":
            return spectra.pierson_moskowitz(w, height, period)
        if shape == "jonswap":
            return spectra.jonswap(w, height, period, peakedness)
        return spectra.tma(w, height, period, depth, peakedness, gravity)

    return smooth_spectrum(density, period, height)


def _sea_of_draw(drawn: Components, water: Water) -> Sea:
    amplitude = np.sqrt(2 * drawn.energy)
    return Sea.of(drawn.frequency, drawn.heading, amplitude, drawn.phase, *water, drawn.share)


def _rescaled(sea: Sea, height: float) -> Sea:
    """Multiply all amplitudes by the one factor that gives the significant height."""
    return replace(sea, amplitude=sea.amplitude * (height / sea.significant_height))


def _focused(sea: Sea, crest: float, focus: tuple[float, float, float]) -> Sea:
    """Group with the sea's components, amplitudes as its energies, all crests at x, y, t."""
    x, y, t = focus
    k_along = sea.wavenumber * (x * np.cos(sea.heading) + y * np.sin(sea.heading))
    energy = sea.amplitude**2
    amplitude = crest * energy / energy.sum()
    return replace(sea, amplitude=amplitude, phase=sea.frequency * t - k_along)


def _sea_of_table(
    file: str | Path | None,
    period: float | None,
    band: tuple[float, float] | None,
    headings: Headings,
    draw: Callable[..., Components],
    water: Water,
) -> Sea:
    """Sea of a table's own height; see `bemwave.waves.table` for its three forms."""
    if file is None:
        raise InputError("a wave of kind 'table' has no `file`; expected the path of a csv file")
    path = Path(file)
    header, rows = read_table(path)
    if header == PLANE_WAVES:
        return _sea_of_plane_waves(path, rows, period, band, water)
    frequency, density = rows[:, 0], rows[:, -1]
    if header == DIRECTIONAL:
        columns = (frequency, np.radians(rows[:, 1]), density)
        frequency, density, headings = tabled_headings(path, *columns)
    source = tabled_spectrum(path, frequency, density, period)
    whole = (0.0, float(frequency.max()) / source.peak + 3.5)  # a stratum more, however wide
    return _sea_of_draw(draw(source, headings, band=band or whole), water)


def _sea_of_plane_waves(
    path: Path,
    rows: Array,
    period: float | None,
    band: tuple[float, float] | None,
    water: Water,
) -> Sea:
    w, heading, amplitude, phase = rows.T
    if not (np.all(w > 0) and np.all(amplitude >= 0) and amplitude.any()):
        raise InputError(
            f"the wave table {path} has a frequency of zero or a negative amplitude, or no "
            "amplitude above zero; expected frequencies above zero and amplitudes not below it"
        )
    peak = 2 * math.pi / period if period else w[np.argmax(amplitude)]
    sea = Sea.of(w, np.radians(heading), amplitude, np.radians(phase), *water)
    if band is None:
        return sea
    kept = sea.keep((w >= band[0] * peak) & (w <= band[1] * peak))
    if not kept.amplitude.any():
        raise InputError(
            f"the band {band[0]:g} to {band[1]:g} peak frequencies holds no wave of the table "
            f"{path}; expected one that does: widen `band`"
        )
    return replace(kept, share=kept.moment(0) / sea.moment(0))
