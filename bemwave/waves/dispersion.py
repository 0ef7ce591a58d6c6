"""Linear dispersion over a flat bed: wavenumber, speeds and power of plane waves.

All functions take numbers or arrays (they broadcast) and return a float or an array alike.
`depth` may be `math.inf` for deep water. Source of the theory: Dean & Dalrymple, Water Wave
Mechanics for Engineers and Scientists (1991), chapters 3 and 4.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from bemwave.errors import InputError

Array = NDArray[np.float64]

STANDARD_GRAVITY = 9.80665
LARGEST_RESIDUAL = 1e-12  # of w^2, in the dispersion relation
SEA_WATER_DENSITY = 1025.0


def wavenumber(period: ArrayLike, depth: ArrayLike, gravity: float = STANDARD_GRAVITY) -> Array:
    """Wavenumber of a wave of given period: w^2 = g k tanh(k h).

    Parameters
    ----------
    period : float or array
        Wave period in seconds, positive.
    depth : float or array
        Water depth in metres, positive; `math.inf` for deep water.
    gravity : float
        In m/s^2.

    Returns
    -------
    float or array
        Wavenumber in 1/m; the residual of the relation is below 1e-14 of w^2.

    Raises
    ------
    InputError
        If a period or a depth is not positive.

    Examples
    --------
    >>> round(float(wavenumber(8.0, 20.0)), 8)
    0.07078053
    """
    return wavenumber_of_frequency(2 * np.pi / _positive("period", period), depth, gravity)


def wavenumber_of_frequency(
    frequency: ArrayLike, depth: ArrayLike, gravity: float = STANDARD_GRAVITY
) -> Array:
    """Wavenumber (1/m) of an angular frequency (rad/s); otherwise as `wavenumber`.

    Newton's method on x tanh x = w^2 h/g from the explicit value of Guo (2002), Coastal
    Engineering 45, 71-74, which errs by at most .75 %: three steps reach rounding, a fourth
    makes sure.
    """
    w, h = np.broadcast_arrays(_positive("frequency", frequency), _positive("depth", depth))
    deep_wavenumber = w**2 / gravity
    finite = np.isfinite(h)
    alpha = np.where(finite, deep_wavenumber * np.where(finite, h, 1.0), 1.0)
    x = alpha / (-np.expm1(-(alpha ** (2.4908 / 2)))) ** (1 / 2.4908)
    for _ in range(4):
        tanh = np.tanh(x)
        x = x - (x * tanh - alpha) / (tanh + x * (1 - tanh**2))
    _refuse_unsolved(np.abs(x * np.tanh(x) / alpha - 1), w, h)
    k: Array = np.where(finite, x / np.where(finite, h, 1.0), deep_wavenumber)[()]
    return k


def _refuse_unsolved(missed: Array, frequency: Array, depth: Array) -> None:
    if not (missed < LARGEST_RESIDUAL).all():
        worst = np.unravel_index(np.argmax(np.nan_to_num(missed, nan=np.inf)), missed.shape)
        raise InputError(
            f"no wavenumber was found for {frequency[worst]:.3g} rad/s in {depth[worst]:.3g} m of "
            f"water: the dispersion relation is missed by {missed[worst]:.2g}, expected below "
            f"{LARGEST_RESIDUAL:g}; give a period and a depth of real water"
        )


def wavelength(period: ArrayLike, depth: ArrayLike, gravity: float = STANDARD_GRAVITY) -> Array:
    """Wavelength in metres, 2 pi/k."""
    length: Array = 2 * np.pi / wavenumber(period, depth, gravity)
    return length


def phase_speed(period: ArrayLike, depth: ArrayLike, gravity: float = STANDARD_GRAVITY) -> Array:
    """Speed of the crests in m/s, w/k."""
    speed: Array = wavelength(period, depth, gravity) / np.asarray(period, dtype=float)
    return speed


def group_speed(period: ArrayLike, depth: ArrayLike, gravity: float = STANDARD_GRAVITY) -> Array:
    """Speed of the energy in m/s, dw/dk = C/2 (1 + 2kh/sinh 2kh)."""
    k = wavenumber(period, depth, gravity)
    speed = 2 * np.pi / (np.asarray(period, dtype=float) * k)
    return speed / 2 * (1 + double_depth_ratio(k * np.asarray(depth, dtype=float)))


def double_depth_ratio(kh: ArrayLike) -> Array:
    """2kh/sinh 2kh without overflow: 1 in shallow water, 0 in deep water (kh may be infinite)."""
    x = np.minimum(2 * np.asarray(kh, dtype=float), 700.0)
    ratio: Array = x / np.sinh(x)
    return ratio


def wave_power(
    height: ArrayLike,
    period: ArrayLike,
    depth: ArrayLike,
    density: float = SEA_WATER_DENSITY,
    gravity: float = STANDARD_GRAVITY,
) -> Array:
    """Power of a regular wave in W per metre of crest, rho g H^2/8 Cg."""
    energy = density * gravity * np.asarray(height, dtype=float) ** 2 / 8
    return energy * group_speed(period, depth, gravity)


def irregular_wave_power(
    significant_height: ArrayLike,
    energy_period: ArrayLike,
    density: float = SEA_WATER_DENSITY,
    gravity: float = STANDARD_GRAVITY,
) -> Array:
    """Power of an irregular sea in deep water, W per metre: rho g^2 Hs^2 Te/(64 pi).

    It is the integral of rho g S Cg with Cg = g/(2w); Te = 2 pi m_-1/m_0 in seconds.
    """
    square = np.asarray(significant_height, dtype=float) ** 2
    factor = density * gravity**2 / (64 * np.pi)
    power: Array = factor * square * np.asarray(energy_period, dtype=float)
    return power


def _positive(name: str, value: ArrayLike) -> Array:
    """Return the value as a float array, refused unless every element is above zero."""
    array = np.asarray(value, dtype=float)
    if not np.all(array > 0):
        first = array[~(array > 0)].flat[0]
        raise InputError(
            f"the {name} of a wave was given as {first:g}; expected a number above zero"
            f"{' (math.inf for deep water)' if name == 'depth' else ''}"
        )
    return array
