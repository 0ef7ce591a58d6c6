"""More of a spectrum above the band of a sea, for pictures: waves too short to be solved with.

The strata are of equal width in the logarithm of frequency, so that most waves are where most of
the energy is, just above the band. Each gives one plane wave as `waves.synthesis` draws them.
"""

from __future__ import annotations

import math

import numpy as np

from bemwave.waves.dispersion import SEA_WATER_DENSITY, STANDARD_GRAVITY
from bemwave.waves.draws import fractions_by_index
from bemwave.waves.making import SPECTRA, headings_about, spectrum_of
from bemwave.waves.sea import Sea
from bemwave.waves.synthesis import DEFAULT_BAND, GOLDEN, strata

COUNT = 16000  # waves; few look striped
_STREAMS = 2**32  # a sea and what is added to it are drawn apart


def sea_above_band(
    kind: str,
    up_to: float,
    *,
    depth: float,
    density: float = SEA_WATER_DENSITY,
    gravity: float = STANDARD_GRAVITY,
    height: float,
    period: float,
    heading: float = 0.0,
    peakedness: float = 3.3,
    spreading: float | None = None,
    components: int = 1000,
    seed: int = 1,
    band: tuple[float, float] | None = None,
    stream: int = 0,
) -> Sea:
    """Waves of an entry's spectrum from where its band ends to a frequency.

    Energies are the spectrum's own, of the height asked for; those inside the band have been
    raised by the little that the band leaves out. Other kinds than spectra have nothing above.

    Parameters
    ----------
    kind : str
        Of the wave entry, whose keys the others are; see `make_sea`.
    up_to : float
        rad/s.
    """
    if kind not in SPECTRA:
        return Sea.still(depth, density, gravity)
    peak = 2.0 * math.pi / period
    low = float(strata(peak, components, band or DEFAULT_BAND)[1][-1])
    if up_to <= low:
        return Sea.still(depth, density, gravity)
    edges = np.geomspace(low, up_to, COUNT + 1)
    energy = spectrum_of(kind, height, period, peakedness, depth, gravity).energy(edges)
    jitter, turn, start, _ = fractions_by_index(seed, 0, COUNT, stream + _STREAMS).T
    frequency = edges[:-1] + jitter * np.diff(edges)
    fraction = np.mod(start[0] + GOLDEN * np.arange(COUNT), 1.0)
    angle = headings_about(math.radians(heading), spreading)(frequency, fraction)
    amplitude, phase = np.sqrt(2.0 * energy), 2.0 * math.pi * turn
    return Sea.of(frequency, angle, amplitude, phase, depth, density, gravity)
