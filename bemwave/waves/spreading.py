"""Directional spreading cos^2s(theta/2) about the mean heading.

Longuet-Higgins, Cartwright & Smith (1963), in Ocean Wave Spectra, Prentice-Hall, 111-136.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

Array = NDArray[np.float64]


def spreading_density(angle: ArrayLike, s: float) -> Array:
    """Density D = Gamma(s+1)/(2 sqrt(pi) Gamma(s+1/2)) cos^2s(angle/2), 1/rad.

    `angle` from the mean heading in rad, within +-pi; the integral over all headings is 1.
    """
    factor = math.exp(math.lgamma(s + 1) - math.lgamma(s + 0.5)) / (2 * math.sqrt(math.pi))
    density: Array = factor * np.abs(np.cos(np.asarray(angle, dtype=float) / 2)) ** (2 * s)
    return density


def spreading_quantile(probability: ArrayLike, s: float) -> Array:
    """Angle from the mean heading (rad) below which the given share of the energy travels.

    The inverse distribution of `spreading_density`: sin^2(angle/2) follows the beta distribution
    of parameters 1/2 and s + 1/2, with either sign equally likely.
    """
    from scipy.special import betaincinv

    side = 2 * np.asarray(probability, dtype=float) - 1
    angle: Array = np.sign(side) * 2 * np.arcsin(np.sqrt(betaincinv(0.5, s + 0.5, np.abs(side))))
    return angle
