"""Wave spectra: densities over angular frequency, in m^2 s.

Each density takes frequencies in rad/s (array), the significant height Hm0 = 4 sqrt(m0) in
metres and the peak period in seconds, and integrates to height^2/16 over all frequencies.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemwave.waves.dispersion import (
    STANDARD_GRAVITY,
    double_depth_ratio,
    wavenumber_of_frequency,
)

Array = NDArray[np.float64]
Density = Callable[[Array], Array]


def pierson_moskowitz(frequency: ArrayLike, height: float, period: float) -> Array:
    """Pierson-Moskowitz density by height and peak period (also Bretschneider's, ISSC's).

    S = 5/16 H^2 wp^4 w^-5 exp(-5/4 (w/wp)^-4). Pierson & Moskowitz (1964), J. Geophysical
    Research 69; in this form DNV-RP-C205, 3.5.5.
    """
    # below .05 wp the exponential is zero in double precision
    x = np.maximum(np.asarray(frequency, dtype=float) * period / (2 * np.pi), 0.05)
    scale = 5 / 16 * height**2 * period / (2 * np.pi)
    density: Array = scale * x**-5 * np.exp(-1.25 * x**-4)
    return density


def jonswap(frequency: ArrayLike, height: float, period: float, peakedness: float = 3.3) -> Array:
    """JONSWAP density by height, peak period and peakedness, exactly normalised.

    Hasselmann et al. (1973), Deutsche Hydrographische Zeitschrift A8(12): Pierson-Moskowitz
    times peakedness^exp(-(w/wp - 1)^2/(2 s^2)), s = .07 up to the peak and .09 above it, times
    `jonswap_normaliser`.
    """
    w = np.asarray(frequency, dtype=float)
    raised = pierson_moskowitz(w, height, period) * _peak(w * period / (2 * np.pi), peakedness)
    return jonswap_normaliser(peakedness) * raised


def _peak(x: Array, peakedness: float) -> Array:
    """Peak enhancement of JONSWAP at x = w/wp."""
    width = np.where(x <= 1, 0.07, 0.09)
    enhancement: Array = peakedness ** np.exp(-((x - 1) ** 2) / (2 * width**2))
    return enhancement


@lru_cache
def jonswap_normaliser(peakedness: float) -> float:
    """Factor that keeps the height of JONSWAP: the exact integral, not the fit 1 - .287 ln."""
    period = 2 * np.pi  # so that the peak is at 1 rad/s

    def raised(w: Array) -> Array:
        return pierson_moskowitz(w, 4.0, period) * _peak(w, peakedness)

    return 1.0 / spectral_moment(raised, 0, period)


def tma(
    frequency: ArrayLike,
    height: float,
    period: float,
    depth: float,
    peakedness: float = 3.3,
    gravity: float = STANDARD_GRAVITY,
) -> Array:
    """TMA density: JONSWAP times the depth factor, scaled to the height at this depth.

    Bouws et al. (1985), J. Geophysical Research 90, 975-986. `depth` in metres.
    """
    shape = _tma_shape(frequency, period, depth, peakedness, gravity)
    return height**2 * _tma_normaliser(period, depth, peakedness, gravity) * shape


def _tma_shape(
    frequency: ArrayLike, period: float, depth: float, peakedness: float, gravity: float
) -> Array:
    deep = jonswap(frequency, 4.0, period, peakedness)
    return deep * tma_depth_factor(frequency, depth, gravity)


@lru_cache
def _tma_normaliser(period: float, depth: float, peakedness: float, gravity: float) -> float:
    def shape(w: Array) -> Array:
        return _tma_shape(w, period, depth, peakedness, gravity)

    return 1 / (16 * spectral_moment(shape, 0, period))


def tma_depth_factor(
    frequency: ArrayLike, depth: float, gravity: float = STANDARD_GRAVITY
) -> Array:
    """Depth factor of TMA: tanh^2 kh/(1 + 2kh/sinh 2kh), 1 in deep water.

    Kitaigorodskii, Krasitskii & Zaslavskii (1975), J. Physical Oceanography 5, 410-420.
    """
    kh = wavenumber_of_frequency(frequency, depth, gravity) * depth
    factor: Array = np.tanh(kh) ** 2 / (1 + double_depth_ratio(kh))
    return factor


def spectral_moment(density: Density, order: float, period: float) -> float:
    """Moment int S w^order dw of a density with its peak at 2 pi/period, in m^2 (rad/s)^order.

    Adaptive quadrature in ln w on pieces that meet at the peak, where JONSWAP changes width, up
    to 1000 peak frequencies with the w^-5 tail beyond added in closed form. Orders up to 3.
    """
    from scipy.integrate import quad

    peak, last = 2 * np.pi / period, 1e3

    def integrand(log_x: float) -> float:
        w = peak * np.exp(log_x)
        return float(density(np.array(w)) * w ** (order + 1))

    marks = np.log([0.1, 0.7, 1.0, 1.4, 4.0, last])
    pieces = [
        quad(integrand, a, b, epsabs=0.0, epsrel=1e-11, limit=200)[0] for a, b in pairwise(marks)
    ]
    tail = integrand(np.log(last)) / (4 - order)
    return float(sum(pieces)) + tail
