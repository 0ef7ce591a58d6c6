"""From a spectrum to the components of a sea.

Frequencies are cut into strata of equal width, placed in units of the peak frequency: stratum j
lies at .5 + j d .. .5 + (j+1) d with d = 3.5/components, so that the default band of .5 to 4 peak
frequencies holds exactly `components` of them, and j runs on to either side for a wider band.
A stratum belongs to a band if its centre does. Each gives one plane wave, all of whose numbers
depend on the seed and on j alone, never on the band:

frequency   uniform within the stratum (jitter, so that no short repeat time remains)
energy      the spectrum's integral over the stratum
heading     one a frequency: two at one frequency would make a standing pattern
phase       uniform

The headings run through the inverse distribution in golden-ratio steps from a random start
(a Kronecker sequence; Niederreiter 1992, Random Number Generation and Quasi-Monte Carlo Methods):
any few neighbouring strata then cover the spreading evenly, and mean heading and spread come out
as asked. Equal widths, not equal energies, keep time averages over a few hours close to the
target: components nearer than one over the averaging time would beat through it.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from bemwave.errors import InputError
from bemwave.waves.draws import fractions_by_index
from bemwave.waves.spectra import Density

Array = NDArray[np.float64]
Headings = Callable[[Array, Array], Array]  # (frequency, fraction of the energy) -> rad

DEFAULT_BAND = (0.5, 4.0)
GOLDEN = (math.sqrt(5) - 1) / 2
_START_INDEX = -(2**62)  # whose first draw is the start of the headings; no stratum comes near


@dataclass(frozen=True)
class Spectrum:
    """What the synthesis needs of a spectrum.

    Attributes
    ----------
    energy : function
        Edges (n+1,) in rad/s to the integrals of the density between them (n,), in m^2.
    peak : float
        Peak frequency, rad/s; the unit of strata and band.
    total : float
        Integral over all frequencies, m^2.
    """

    energy: Callable[[Array], Array]
    peak: float
    total: float


@dataclass(frozen=True)
class Components:
    """Plane waves drawn from a spectrum: rad/s, rad, m^2, rad, with the band's energy share."""

    frequency: Array
    heading: Array
    energy: Array
    phase: Array
    share: float


def smooth_spectrum(density: Density, period: float, height: float) -> Spectrum:
    """Spectrum of a density that integrates to height^2/16; strata by 16-point Gauss rules."""
    nodes, weights = np.polynomial.legendre.leggauss(16)

    def energy(edges: Array) -> Array:
        middle, half = (edges[1:] + edges[:-1]) / 2, np.diff(edges) / 2
        integrals: Array = density(middle[:, None] + half[:, None] * nodes) @ weights * half
        return integrals

    return Spectrum(energy, 2 * math.pi / period, height**2 / 16)


def draw_components(
    spectrum: Spectrum,
    headings: Headings,
    *,
    components: int = 1000,
    band: tuple[float, float] = DEFAULT_BAND,
    seed: int = 1,
    stream: int = 0,
    random_amplitudes: bool = False,
) -> Components:
    """Draw one plane wave for each stratum of the band, energies as the spectrum has them.

    Parameters
    ----------
    spectrum : Spectrum
    headings : function
        Frequencies and fractions in [0, 1) to headings in rad: the inverse distribution.
    components : int
        Number of strata in the default band; see the module's text.
    band : (float, float)
        In peak frequencies.
    seed, stream : int
        See `bemwave.waves.draws.fractions_by_index`.
    random_amplitudes : bool
        Amplitudes after Rayleigh's distribution about the spectrum's instead of the spectrum's.

    Raises
    ------
    InputError
        If the band holds no stratum or no energy.
    """
    first, edges = strata(spectrum.peak, components, band)
    energy = spectrum.energy(edges)
    share = float(energy.sum() / spectrum.total)
    if not share > 0:
        raise InputError(
            f"the band {band[0]:g} to {band[1]:g} peak frequencies holds no energy of the "
            "spectrum; expected one round its peak: widen `band`"
        )
    jitter, turn, rayleigh, _ = fractions_by_index(seed, first, len(energy), stream).T
    start = fractions_by_index(seed, _START_INDEX, 1, stream)[0, 0]
    frequency = edges[:-1] + jitter * np.diff(edges)
    along = np.mod(start + GOLDEN * (first + np.arange(len(energy))), 1.0)
    if random_amplitudes:
        energy = energy * -np.log1p(-rayleigh)
    some = energy > 0
    frequency, energy = frequency[some], energy[some]
    phase = 2 * math.pi * turn[some]
    return Components(frequency, headings(frequency, along[some]), energy, phase, share)


def strata(peak: float, components: int, band: tuple[float, float]) -> tuple[int, Array]:
    """Index of the first stratum whose centre lies in the band, and the edges of all of them."""
    low, high = DEFAULT_BAND
    width = (high - low) / components
    first = math.ceil((band[0] - low) / width - 0.5)
    first = max(first, math.ceil(-low / width))
    beyond = math.floor((band[1] - low) / width - 0.5) + 1
    if beyond <= first:
        raise InputError(
            f"the band {band[0]:g} to {band[1]:g} peak frequencies is narrower than one of the "
            f"{components} components' strata ({width:.3g}); widen `band` or raise `components`"
        )
    edges: Array = peak * (low + width * np.arange(first, beyond + 1, dtype=float))
    return first, edges
